//! The comb of axial modes between two mirrors.
//! Must not know the gain line's shape.
//! Main functions: [`mode_spacing`], [`mirror_spacing`].

use crate::constants::{MODE_PULLING, SPEED_OF_LIGHT};
use crate::quantity::{FrequencyDifference, Length};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Spacing of axial modes of a sealed low-pressure tube, without mode pulling: Δν = c / 2L, index of refraction 1.
///
/// Source: any laser text, for instance Siegman, *Lasers*.
pub fn mode_spacing(mirror_spacing: Length) -> FrequencyDifference {
    FrequencyDifference::from_hertz(SPEED_OF_LIGHT.value / (2.0 * mirror_spacing.metres()))
}

/// Mirror spacing in m from a measured mode spacing in Hz: L = c / (2 Δν (1 + p)), p the share by which gain dispersion
/// shrinks the comb ([`MODE_PULLING`]).
///
/// The budget of the spacing is carried over, with the pulling's own line added. `None` for a spacing that is not
/// positive.
pub fn mirror_spacing(mode_spacing: &Measured) -> Option<Measured> {
    let spacing = mode_spacing.value;
    if !(spacing.is_finite() && spacing > 0.0) {
        return None;
    }
    let length = SPEED_OF_LIGHT.value / (2.0 * spacing * (1.0 + MODE_PULLING.value));
    // ∂L/∂Δν = −L/Δν, ∂L/∂p = −L/(1 + p).
    let mut measured = mode_spacing.scaled(-length / spacing);
    measured.value = length;
    let mut pulling = BudgetLine::direct(
        "mode-pulling",
        "correction for mode pulling",
        Evaluation::TypeB,
        MODE_PULLING.u_value,
        f64::INFINITY,
    );
    pulling.sensitivity = -length / (1.0 + MODE_PULLING.value);
    measured.budget.push(pulling);
    Some(measured)
}

/// Number of half waves between the mirrors, 2L/λ.
pub fn mode_number(mirror_spacing: Length, wavelength: Length) -> f64 {
    2.0 * mirror_spacing.metres() / wavelength.metres()
}

/// Least and greatest number of modes that a lasing span holds as the comb walks through it: ⌊S/Δν⌋ and the next
/// integer.
///
/// Source: common practice. Zero and one for a span or spacing that is not positive.
pub fn mode_count_bounds(lasing_span: FrequencyDifference, mode_spacing: FrequencyDifference) -> (u32, u32) {
    let ratio = lasing_span.ratio_to(mode_spacing);
    // A cast saturates and takes NaN to 0.
    let least = if ratio.is_finite() { ratio.floor().max(0.0) as u32 } else { 0 };
    (least, least.saturating_add(1))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::constants::RED_LINE;
    use crate::quantity::Temperature;
    use crate::tube::{doppler_parameter, half_lasing_range};

    #[test]
    fn comb_of_400_megahertz() {
        // Common practice, exact from c/2L: 0.3747 m (four digits given) and 1.18 million half waves (three).
        let length = Length::from_metres(SPEED_OF_LIGHT.value / 0.8e9);
        assert!((length.metres() - 0.3747).abs() < 0.5e-4);
        assert!((mode_spacing(length).megahertz() - 400.0).abs() < 1e-9);
        let n = mode_number(length, Length::from_metres(RED_LINE.value));
        assert!((n / 1e6 - 1.18).abs() < 0.005);
    }

    #[test]
    fn typical_types() {
        // Mirrors 150, 250, 375 mm apart; values given to 0.1 MHz.
        for (millimetres, megahertz) in [(150.0, 999.3), (250.0, 599.6), (375.0, 399.7)] {
            let spacing = mode_spacing(Length::from_metres(millimetres / 1e3)).megahertz();
            assert!((spacing - megahertz).abs() < 0.05, "{spacing}");
        }
    }

    #[test]
    fn pulling_is_taken_out_of_the_mirror_spacing() {
        // A 375 mm tube whose comb is 1 ‰ narrower than c/2L.
        let c2l = mode_spacing(Length::from_metres(0.375)).hertz();
        let line = BudgetLine::direct("scatter", "scatter", Evaluation::TypeA, 0.1e6, 10.0);
        let length = mirror_spacing(&Measured::with_line(c2l / 1.001, line)).unwrap();
        assert!((length.value - 0.375).abs() < 1e-12);
        // Relative: spacing 0.1/399.3 and pulling 0.5e-3/1.001, in quadrature.
        let expected = 0.375 * (0.1e6 / (c2l / 1.001)).hypot(0.5e-3 / 1.001);
        assert!((length.u() / expected - 1.0).abs() < 1e-9);
        assert_eq!(mirror_spacing(&Measured::default()), None);
    }

    #[test]
    fn three_or_four_modes_at_gain_twice_loss() {
        // Common practice: a 0.375 m tube at η = 2 shows three or four modes as it walks.
        let half = half_lasing_range(doppler_parameter(Temperature::from_si(400.0)), 2.0);
        let span = FrequencyDifference::from_hertz(2.0 * half.hertz());
        assert_eq!(mode_count_bounds(span, mode_spacing(Length::from_metres(0.375))), (3, 4));
        let none = FrequencyDifference::from_hertz(0.0);
        assert_eq!(mode_count_bounds(none, none), (0, 1));
    }
}
