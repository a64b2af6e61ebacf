//! Beam diameter and divergence from knife-edge readings.
//! Must not ask for them.
//! Main types: [`KnifeEdge`]; main functions: [`beam_diameter`], [`beam_divergence`].

use std::f64::consts::PI;

use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Half of the 10–90 % clip width of a Gaussian beam over its 1/e² radius: erf(√2·x/w) = 0.8 (tables of the error
/// function; 0.640776).
const CLIP: f64 = 0.640_775_782_772_3;
/// Standard uncertainty of one position of the knife, m: steps of 0.01 mm, rectangular.
const U_POSITION: f64 = 0.005e-3 / 1.732_050_8;
/// Standard uncertainty of the set level over full power: 1 % of it (from memory).
const U_LEVEL: f64 = 0.01;
/// Change of level for a shift of one 1/e² radius, at 10 and 90 %: √(2/π)·exp(−2·0.6408²).
const SLOPE: f64 = 0.350_96;
/// Standard uncertainty of a distance measured by tape, m (from memory).
const U_DISTANCE: f64 = 2e-3;
/// Rayleigh lengths beyond which two distances give a divergence.
const FAR: f64 = 3.0;

/// Readings at one distance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct KnifeEdge {
    /// From the output mirror to the knife, m.
    pub distance: f64,
    /// Position at which 10 % of the power passes, m.
    pub at_10: f64,
    /// Position at which 90 % passes, m.
    pub at_90: f64,
}

/// 1/e² diameter at one distance, m: |x₉₀ − x₁₀|/0.6408.
///
/// Errors: the positions are equal or no numbers.
pub fn beam_diameter(reading: &KnifeEdge) -> Result<Measured, String> {
    let clip = (reading.at_90 - reading.at_10).abs();
    if !(clip > 0.0 && clip.is_finite()) {
        return Err("both positions of the knife edge are the same".to_owned());
    }
    let diameter = clip / CLIP;
    let mut position = line("knife edge", "two positions of the knife", U_POSITION * 2f64.sqrt());
    position.sensitivity = 1.0 / CLIP;
    // Each edge moves by the level over the slope, in radii; both edges, each half of the clip's share.
    let mut level = line("knife edge level", "levels of 10 and 90 %", U_LEVEL * 2f64.sqrt());
    level.sensitivity = 0.5 * diameter / SLOPE / CLIP;
    Ok(Measured { value: diameter, budget: vec![position, level] })
}

/// Full-angle divergence, rad, from readings at two distances.
///
/// Formula: θ = (d₂ − d₁)/(z₂ − z₁). The Rayleigh length of a beam of half angle θ/2 is z_R = λ/(π(θ/2)²); nearer than that
/// the slope is less than the divergence, which makes the z_R found too long: a test by it errs on the safe side.
///
/// * `wavelength`: m.
///
/// Errors: a distance is not beyond three Rayleigh lengths, or the beam does not widen.
pub fn beam_divergence(one: &KnifeEdge, other: &KnifeEdge, wavelength: f64) -> Result<Measured, String> {
    let (near, far) = if one.distance <= other.distance { (one, other) } else { (other, one) };
    let (narrow, wide) = (beam_diameter(near)?, beam_diameter(far)?);
    let apart = far.distance - near.distance;
    let angle = (wide.value - narrow.value) / apart;
    if !(apart > 0.0 && angle > 0.0 && angle.is_finite()) {
        return Err("the beam does not widen from the nearer distance to the farther".to_owned());
    }
    let rayleigh = wavelength / (PI * (angle / 2.0).powi(2));
    if near.distance < FAR * rayleigh {
        return Err(format!(
            "the nearer distance, {:.2} m, is not beyond three Rayleigh lengths, {:.2} m: measure farther away",
            near.distance,
            FAR * rayleigh
        ));
    }
    let mut budget: Vec<BudgetLine> = Vec::new();
    for (diameter, sign, words) in [(&narrow, -1.0, "nearer"), (&wide, 1.0, "farther")] {
        for own in &diameter.budget {
            let mut own = own.clone();
            own.source_id = format!("{}, {words}", own.source_id);
            own.line = format!("{}, {words}", own.line);
            own.sensitivity *= sign / apart;
            budget.push(own);
        }
    }
    let mut tape = line("distances", "two distances", U_DISTANCE * 2f64.sqrt());
    tape.sensitivity = angle / apart;
    budget.push(tape);
    // What is still missing to the asymptote, √(z_R² + z²) against z.
    let radius = |z: f64| rayleigh.hypot(z);
    let missing = 1.0 - (radius(far.distance) - radius(near.distance)) / apart;
    let mut field = line("far field", "not yet the far field", missing.max(0.0) / 3f64.sqrt());
    field.sensitivity = angle;
    budget.push(field);
    Ok(Measured { value: angle, budget })
}

fn line(source: &str, words: &str, u: f64) -> BudgetLine {
    BudgetLine::direct(source, words, Evaluation::TypeB, u, f64::INFINITY)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    const WAVELENGTH: f64 = 632.991e-9;

    /// Readings of a Gaussian beam with its waist at the mirror: w² = w₀²(1 + (z/z_R)²) (any optics text).
    fn reading(waist: f64, distance: f64) -> KnifeEdge {
        let rayleigh = PI * waist * waist / WAVELENGTH;
        let radius = waist * (1.0 + (distance / rayleigh).powi(2)).sqrt();
        KnifeEdge { distance, at_10: 3e-3 - CLIP * radius, at_90: 3e-3 + CLIP * radius }
    }

    #[test]
    fn clip_and_slope_are_those_of_the_error_function() {
        // Power passed to x of a Gaussian beam, summed by hand over fine strips of exp(−2x²/w²).
        let strips = 200_000;
        let passed = |x: f64| {
            let step = (x + 4.0) / f64::from(strips);
            let at = |i: i32| -4.0 + (f64::from(i) + 0.5) * step;
            (0..strips).map(|i| (-2.0 * at(i).powi(2)).exp()).sum::<f64>() * step * (2.0 / PI).sqrt()
        };
        assert!((passed(CLIP) - 0.9).abs() < 1e-8, "{}", passed(CLIP));
        assert!(((passed(CLIP + 1e-3) - passed(CLIP - 1e-3)) / 2e-3 - SLOPE).abs() < 1e-4);
    }

    #[test]
    fn a_gaussian_beam_has_its_diameter_and_divergence() {
        // 0.5 mm across at the mirror: λ/(π w₀) twice is 1.612 mrad, z_R 0.31 m.
        let found = beam_diameter(&reading(0.25e-3, 0.0)).unwrap();
        assert!((found.value - 0.5e-3).abs() < 1e-12);
        // 1 % of level on both edges: 0.01·√2/(2·0.351·0.6408) = 3.1 %.
        assert!((found.u() / 0.5e-3 - 0.0338).abs() < 0.002, "{}", found.u() / 0.5e-3);
        let truth = 2.0 * WAVELENGTH / (PI * 0.25e-3);
        let found = beam_divergence(&reading(0.25e-3, 4.0), &reading(0.25e-3, 2.0), WAVELENGTH).unwrap();
        assert!((found.value - truth).abs() < found.u(), "{found:?} {truth}");
        assert!((found.value / truth - 1.0).abs() < 0.01);
    }

    #[test]
    fn the_near_field_gives_no_divergence() {
        let refused = beam_divergence(&reading(0.25e-3, 0.3), &reading(0.25e-3, 0.9), WAVELENGTH).unwrap_err();
        assert!(refused.contains("Rayleigh"), "{refused}");
        let same = reading(0.25e-3, 2.0);
        assert!(beam_divergence(&same, &same, WAVELENGTH).unwrap_err().contains("widen"));
        assert!(beam_diameter(&KnifeEdge { distance: 1.0, at_10: 1e-3, at_90: 1e-3 }).is_err());
        assert!(beam_diameter(&KnifeEdge { distance: 1.0, at_10: f64::NAN, at_90: 1e-3 }).is_err());
    }
}
