//! One digitizer record: Airy transmission, detector pole, noise, digitizer steps.
//! Must not know time before or after its own ramp period.
//! Main types: [`RawTrace`], [`Scene`].

use std::f64::consts::{PI, TAU};

use super::{bench::BenchTruth, noise::Noise, ramp::Ramp};

/// Height that the highest peak of a sound alignment is set to, V.
pub(super) const FULL_HEIGHT: f64 = 0.8;
/// Input range of the digitizer for the photodiodes, V.
const PHOTODIODE_RANGE: (f64, f64) = (-0.1, 1.4);
/// Input range for the ramp beyond its own ends, V.
const RAMP_MARGIN: f64 = 0.5;

/// What a digitizer recorded.
#[derive(Debug, Clone, PartialEq)]
pub struct RawTrace {
    /// Time between samples, s.
    pub time_step: f64,
    /// Ramp, V.
    pub ramp: Vec<f64>,
    /// Photodiode behind the splitting polarizer (or the only one), V.
    pub photodiode: Vec<f64>,
    /// Photodiode behind the other polarization, V.
    pub crossed: Option<Vec<f64>>,
}

/// One peak that light would make: where, and how high in each photodiode.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Line {
    /// Optical frequency against the interferometer's zero, Hz.
    pub frequency: f64,
    /// Height in the main photodiode, V.
    pub main: f64,
    /// Height in the crossed one, V.
    pub crossed: f64,
}

/// What stands before the interferometer during one ramp.
pub(super) struct Scene<'a> {
    /// The bench.
    pub bench: &'a BenchTruth,
    /// Peaks at the begin of the capture.
    pub lines: Vec<Line>,
    /// How fast all of them move, Hz/s.
    pub rate: f64,
    /// Ripple of the light: rms over mean, and phase at the begin, rad.
    pub ripple: (f64, f64),
}

impl Scene<'_> {
    /// Records one ramp period.
    ///
    /// 1. At each sample the mirror's displacement gives the interferometer's frequency ν_s (a share of `orders`·FSR).
    /// 2. Signal: Σ height_j / (1 + (2F/π)² sin²(π(ν_j − ν_s)/FSR)) (Airy; Hercher, Appl. Opt. 7, 951, 1968), times
    ///    the ripple of the light.
    /// 3. A single-pole low-pass, exact for a signal that is straight between samples.
    /// 4. Dark level and white noise are added; the digitizer rounds to its steps and clips at its range.
    pub fn record(&self, samples: usize, mut main_noise: Noise, mut crossed_noise: Noise) -> RawTrace {
        let bench = self.bench;
        let n = samples.max(2);
        let ramp = Ramp::new(bench);
        let time_step = bench.ramp_period / n as f64;
        let fsr = bench.free_spectral_range;
        let sign = if bench.ramp_reversed { -1.0 } else { 1.0 };
        let coefficient = (2.0 * bench.finesse / PI).powi(2);
        // cos 2π(a − b) from the parts: one sine and cosine a sample, not one for each line.
        let parts: Vec<(f64, f64)> = self.lines.iter().map(|l| (TAU * (l.frequency / fsr).fract()).sin_cos()).collect();
        let volts = Steps::new(PHOTODIODE_RANGE, bench.bits);
        let ramp_steps = Steps::new((bench.ramp_low - RAMP_MARGIN, bench.ramp_high + RAMP_MARGIN), bench.bits);
        let sigma = bench.noise * FULL_HEIGHT;
        let has_crossed = bench.analyser.is_some();
        let mut poles = [Pole::new(time_step, bench.detector_time), Pole::new(time_step, bench.detector_time)];
        let mut trace = RawTrace {
            time_step,
            ramp: Vec::with_capacity(n),
            photodiode: Vec::with_capacity(n),
            crossed: has_crossed.then(|| Vec::with_capacity(n)),
        };
        for k in 0..n {
            let t = k as f64 * time_step;
            let (ramp_volts, displacement) = ramp.at(k as f64 / n as f64);
            // A walk of all lines is the same as the interferometer moving the other way.
            let scan = sign * displacement * bench.orders - self.rate * t / fsr;
            let (sin, cos) = (TAU * scan).sin_cos();
            let (mut main, mut crossed) = (0.0, 0.0);
            for (line, part) in self.lines.iter().zip(&parts) {
                let square = 0.5 * (1.0 - (part.1 * cos + part.0 * sin));
                let transmission = 1.0 / (1.0 + coefficient * square);
                main += line.main * transmission;
                crossed += line.crossed * transmission;
            }
            let light =
                1.0 + self.ripple.0 * std::f64::consts::SQRT_2 * (2.0 * TAU * bench.mains * t + self.ripple.1).sin();
            let main = poles[0].pass(main * light) + bench.dark_level + sigma * main_noise.normal();
            trace.ramp.push(ramp_steps.round(ramp_volts));
            trace.photodiode.push(volts.round(main));
            if let Some(channel) = &mut trace.crossed {
                let crossed = poles[1].pass(crossed * light) + bench.dark_level + sigma * crossed_noise.normal();
                channel.push(volts.round(crossed));
            }
        }
        trace
    }
}

/// A single-pole low-pass.
struct Pole {
    decay: f64,
    mean_decay: f64,
    state: Option<(f64, f64)>,
}

impl Pole {
    /// A pole of a time constant, for samples a time apart. No time constant passes all.
    fn new(time_step: f64, time: f64) -> Self {
        let ratio = if time > 0.0 { time_step / time } else { f64::INFINITY };
        let decay = (-ratio).exp();
        // Weight of the older sample in a straight piece of input: (1 − e^(−r))/r − e^(−r).
        Self { decay, mean_decay: (1.0 - decay) / ratio, state: None }
    }

    /// Next output: y ← e^(−r) y + [(1−e^(−r))/r − e^(−r)] x₀ + [1 − (1−e^(−r))/r] x₁.
    fn pass(&mut self, input: f64) -> f64 {
        let output = match self.state {
            None => input,
            Some((before, output)) => {
                self.decay * output + (self.mean_decay - self.decay) * before + (1.0 - self.mean_decay) * input
            }
        };
        self.state = Some((input, output));
        output
    }
}

/// Steps of a digitizer.
pub(super) struct Steps {
    low: f64,
    step: f64,
    highest: f64,
}

impl Steps {
    /// Steps over a range, V.
    pub fn new((low, high): (f64, f64), bits: u32) -> Self {
        let n = 2_f64.powi(bits.clamp(1, 32) as i32);
        Self { low, step: (high - low) / n, highest: n - 1.0 }
    }

    /// The nearest step, within the range.
    pub fn round(&self, volts: f64) -> f64 {
        self.low + self.step * ((volts - self.low) / self.step).round().clamp(0.0, self.highest)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_pole_answers_a_step_and_a_slope_as_the_equation_says() {
        let mut pole = Pole::new(1e-6, 4e-6);
        pole.pass(0.0);
        let slope: Vec<f64> = (1..=40).map(|k| pole.pass(f64::from(k))).collect();
        // Response to x = t: y = t − τ(1 − e^(−t/τ)), exact for straight input.
        let expected = 40.0 - 4.0 * (1.0 - (-10_f64).exp());
        assert!((slope[39] - expected).abs() < 1e-9, "{}", slope[39]);
        let mut none = Pole::new(1e-6, 0.0);
        none.pass(0.0);
        assert_eq!(none.pass(1.0), 1.0);
    }

    #[test]
    fn the_digitizer_rounds_and_clips() {
        let steps = Steps::new((-0.1, 1.4), 12);
        assert!((steps.round(0.5) - 0.5).abs() <= 0.5 * 1.5 / 4096.0 + 1e-12);
        assert!(steps.round(99.0) < 1.4);
        assert!((steps.round(-9.0) + 0.1).abs() < 1e-12);
    }
}
