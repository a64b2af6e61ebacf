//! The gain line: Doppler width, lasing range, output of one mode against detuning with its central dip.
//! Must not know where the modes are.
//! Main type: [`GainLine`]; [`output_ratio`].

use crate::constants::{ATOMIC_MASS, BOLTZMANN, NEON_20, RED_LINE};

/// The gain line of one tube.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GainLine {
    /// Ku: 1/e half width of the Doppler line, Hz.
    pub doppler: f64,
    /// Peak gain over loss, η.
    pub gain_ratio: f64,
    /// Homogeneous half width γ, Hz.
    pub homogeneous: f64,
}

impl GainLine {
    /// The line of neon 20 at a gas temperature.
    ///
    /// Ku = ν₀ √(2kT/(m c²)), the 1/e half width of a Doppler line (Demtröder, *Laser Spectroscopy*).
    pub fn new(temperature: f64, gain_ratio: f64, homogeneous: f64) -> Self {
        let mass = ATOMIC_MASS.value * NEON_20.value;
        let doppler = (2.0 * BOLTZMANN.value * temperature / mass).sqrt() / RED_LINE.value;
        Self { doppler, gain_ratio, homogeneous }
    }

    /// Half of the range of detunings in which a mode lases, Hz: Ku √(ln η); 0 below threshold.
    pub fn half_range(&self) -> f64 {
        self.doppler * self.gain_ratio.ln().max(0.0).sqrt()
    }

    /// Output of a mode alone at a detuning from line centre, in units of its own; 0 where it does not lase.
    ///
    /// I ∝ [1 − η⁻¹ exp(δ²/Ku²)] / [1 + γ²/(γ² + δ²)] (W. E. Lamb, Phys. Rev. 134, A1429, 1964, third order).
    pub fn output(&self, detuning: f64) -> f64 {
        let excess = 1.0 - (detuning / self.doppler).powi(2).exp() / self.gain_ratio;
        let width = self.homogeneous * self.homogeneous;
        excess.max(0.0) / (1.0 + width / (width + detuning * detuning))
    }
}

/// Output after gain over loss has changed, over output before; 0 below threshold.
///
/// Modes share nearly all gain (see the comb), so the line saturates as one: P ∝ η − 1 (Rigrod, J. Appl. Phys. 36, 2487,
/// 1965, for small gain and loss).
pub fn output_ratio(before: f64, after: f64) -> f64 {
    if before > 1.0 && after > 1.0 { (after - 1.0) / (before - 1.0) } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn doppler_width_fits_the_published_values() {
        // 1.42, 1.52, 1.61 GHz at 350, 400, 450 K; given to three digits.
        for (kelvin, gigahertz) in [(350.0, 1.42), (400.0, 1.52), (450.0, 1.61)] {
            let fwhm = GainLine::new(kelvin, 2.0, 1e8).doppler * 2.0 * 2_f64.ln().sqrt();
            assert!((fwhm / 1e9 - gigahertz).abs() < 0.006, "{kelvin} K: {fwhm}");
        }
    }

    #[test]
    fn output_ends_at_the_half_range_and_dips_in_the_middle() {
        let line = GainLine::new(400.0, 2.0, 120e6);
        assert!(line.output(line.half_range() * 0.999) > 0.0);
        assert_eq!(line.output(line.half_range() * 1.001), 0.0);
        assert!(line.output(0.0) < line.output(250e6), "the central dip");
        assert_eq!(GainLine::new(400.0, 0.9, 1e8).half_range(), 0.0);
    }
}
