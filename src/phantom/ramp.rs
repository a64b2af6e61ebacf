//! The ramp and what the piezo makes of it: not linear, not a polynomial, and different up and down.
//! Must not know the tube.
//! Main type: [`Ramp`].

use super::bench::BenchTruth;

/// Begin of a capture before the lower turn of the ramp, as a share of the period: the trigger comes a little early.
const PRETRIGGER: f64 = 0.01;
/// Bias of the piezo below the ramp's lowest voltage, over the ramp's height.
const BIAS: f64 = 0.6;
/// Height and reach of the creep after a turn, over curvature and ramp height; sizes from memory.
const CREEP: f64 = 0.006;
const CREEP_REACH: f64 = 0.13;

/// The ramp of one bench.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ramp {
    rising_share: f64,
    low: f64,
    high: f64,
    exponent: f64,
    creep: f64,
    opening: f64,
}

impl Ramp {
    /// The ramp of a bench.
    pub fn new(bench: &BenchTruth) -> Self {
        let exponent = 1.0 + bench.ramp_curvature.max(-0.9).ln_1p() / ((1.0 + BIAS) / BIAS).ln();
        Self {
            rising_share: bench.rising_share,
            low: bench.ramp_low,
            high: bench.ramp_high,
            exponent,
            creep: CREEP * bench.ramp_curvature,
            opening: bench.ramp_loop,
        }
    }

    /// Ramp voltage, and displacement of the mirror over its full travel, at a time since the capture began.
    ///
    /// * `periods`: time over the ramp's period.
    ///
    /// Returns (V, 0–1).
    pub fn at(&self, periods: f64) -> (f64, f64) {
        let phase = (periods - PRETRIGGER).rem_euclid(1.0);
        let rising = phase < self.rising_share;
        let u = if rising { phase / self.rising_share } else { (1.0 - phase) / (1.0 - self.rising_share) };
        let displacement = if rising {
            self.shape(u)
        } else {
            // On the way back the mirror lags: the mirrored curve, in part.
            0.5 * self.opening * (1.0 - self.shape(1.0 - u)) + (1.0 - 0.5 * self.opening) * self.shape(u)
        };
        (self.low + (self.high - self.low) * u, displacement)
    }

    /// Displacement on the way up: a power law above the bias, less a creep that dies away after the turn.
    fn shape(&self, u: f64) -> f64 {
        let power = |u: f64| (u + BIAS).powf(self.exponent);
        let creep = |u: f64| self.creep * (-u / CREEP_REACH).exp_m1();
        let (start, end) = (power(0.0), power(1.0));
        ((power(u) - start) / (end - start) + creep(u)) / (1.0 + creep(1.0))
    }
}
