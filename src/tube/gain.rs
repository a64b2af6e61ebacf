//! The Doppler-broadened gain line of the red transition and the range over which it lases.
//! Must not know the comb.
//! Main functions: [`doppler_width`], [`half_lasing_range`], [`gain_ratio`].

use crate::constants::{ATOMIC_MASS, BOLTZMANN, NEON_20, RED_LINE, SPEED_OF_LIGHT};
use crate::quantity::{FrequencyDifference, Temperature};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

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

/// Gas temperature in the bore of a running tube, K (common practice), and the relative standard uncertainty of the
/// Doppler parameter that goes with it (common practice: about 5 % of the width).
const GAS: f64 = 400.0;
const U_DOPPLER: f64 = 0.05;

/// Ratio of peak gain to loss from a measured lasing span, Hz, with its budget: the span's own, and the Doppler
/// parameter's.
///
/// Sensitivities of η = exp((S/2Ku)²): ∂η/∂S = 2η ln η/S, and −2η ln η for Ku relative to itself. `None` for a span that
/// is not above zero.
pub fn measured_gain_ratio(lasing_span: &Measured) -> Option<Measured> {
    let span = lasing_span.value;
    if !(span.is_finite() && span > 0.0) {
        return None;
    }
    let ku = doppler_parameter(Temperature::from_si(GAS));
    let ratio = gain_ratio(FrequencyDifference::from_hertz(span), ku);
    let slope = 2.0 * ratio * ratio.ln();
    let mut measured = lasing_span.scaled(slope / span);
    measured.value = ratio;
    let words = "Doppler width, from the gas temperature";
    let mut line = BudgetLine::direct("gas temperature", words, Evaluation::TypeB, U_DOPPLER, f64::INFINITY);
    line.sensitivity = -slope;
    measured.budget.push(line);
    Some(measured)
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
    fn gain_ratio_carries_the_span_and_the_gas() {
        let ku = doppler_parameter(Temperature::from_si(400.0)).hertz();
        let line = BudgetLine::direct("scatter", "scatter", Evaluation::TypeA, 10e6, 20.0);
        let span = 2.0 * ku * 2f64.ln().sqrt();
        let found = measured_gain_ratio(&Measured::with_line(span, line)).unwrap_or_default();
        // η = 2: u/η = 2 ln 2 · (10 MHz/span ⊕ 5 %).
        let expected = 2.0 * 2.0 * 2f64.ln() * (10e6 / span).hypot(0.05);
        assert!((found.value - 2.0).abs() < 1e-12 && (found.u() / expected - 1.0).abs() < 1e-9, "{found:?}");
        assert_eq!(measured_gain_ratio(&Measured::default()), None);
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
