//! The Doppler-broadened gain line of the red transition and the range over which it lases.
//! Must not know the comb.
//! Main functions: [`doppler_width`], [`half_lasing_range`], [`gain_ratio`].

use crate::constants::{ATOMIC_MASS, BOLTZMANN, NEON_20, RED_LINE, SPEED_OF_LIGHT};
use crate::quantity::{FrequencyDifference, Temperature};

/// Full width at half maximum of the ²⁰Ne gain line: Δν_D = ν₀ √(8 ln 2 · kT / (m c²)).
///
/// Source: Demtröder, *Laser Spectroscopy*, Doppler width. About 5 % uncertain, from the gas temperature.
pub fn doppler_width(gas: Temperature) -> FrequencyDifference {
    let mass = NEON_20.value * ATOMIC_MASS.value;
    let frequency = SPEED_OF_LIGHT.value / RED_LINE.value;
    let thermal = BOLTZMANN.value * gas.si() / (mass * SPEED_OF_LIGHT.value.powi(2));
    FrequencyDifference::from_hertz(frequency * (8.0 * std::f64::consts::LN_2 * thermal).sqrt())
}

/// Doppler parameter of the line, Ku = Δν_D / (2 √ln 2): half width where the gain is down to 1/e.
///
/// Source: Lamb, Phys. Rev. 134, A1429 (1964), its Ku over 2π.
pub fn doppler_parameter(gas: Temperature) -> FrequencyDifference {
    FrequencyDifference::from_hertz(doppler_width(gas).hertz() / (2.0 * std::f64::consts::LN_2.sqrt()))
}

/// Distance from the middle of the line at which gain falls to loss: Ku √(ln η), η the ratio of peak gain to loss.
///
/// 0 for η of 1 or less: nothing lases. Source: Lamb 1964.
pub fn half_lasing_range(doppler_parameter: FrequencyDifference, gain_ratio: f64) -> FrequencyDifference {
    FrequencyDifference::from_hertz(doppler_parameter.hertz() * gain_ratio.ln().max(0.0).sqrt())
}

/// Ratio of peak gain to loss from the whole lasing span: η = exp((S / 2Ku)²).
///
/// Its relative uncertainty from that of Ku is u(η)/η = 2 ln η · u(Ku)/Ku.
pub fn gain_ratio(lasing_span: FrequencyDifference, doppler_parameter: FrequencyDifference) -> f64 {
    (lasing_span.hertz() / (2.0 * doppler_parameter.hertz())).powi(2).exp()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn widths_of_neon_20() {
        // Values given to 0.01 GHz.
        for (kelvin, gigahertz) in [(350.0, 1.42), (400.0, 1.52), (450.0, 1.61)] {
            let width = doppler_width(Temperature::from_si(kelvin)).hertz() / 1e9;
            assert!((width - gigahertz).abs() < 0.006, "{kelvin} K: {width}");
        }
        let ku = doppler_parameter(Temperature::from_si(400.0)).hertz() / 1e9;
        assert!((ku - 0.911).abs() < 0.0006, "{ku}");
    }

    #[test]
    fn range_and_ratio_are_each_others_inverse() {
        let ku = doppler_parameter(Temperature::from_si(400.0));
        for ratio in [1.05, 1.5, 2.0, 5.0] {
            let span = FrequencyDifference::from_hertz(2.0 * half_lasing_range(ku, ratio).hertz());
            assert!((gain_ratio(span, ku) - ratio).abs() < 1e-12);
        }
        assert_eq!(half_lasing_range(ku, 0.5).hertz(), 0.0);
    }
}
