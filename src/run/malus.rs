//! Malus's law: what a signal does as a polarizer turns.
//! Must not know where the signal comes from.
//! Main functions: [`fit`], [`null`].

use crate::numerics::linear;

/// Result of [`fit`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Malus {
    /// Mean over all angles.
    pub mean: f64,
    /// Half of the greatest less the least: P(θ) = mean + swing·cos 2(θ − axis).
    pub swing: f64,
    /// Strong axis, rad, in [0, π).
    pub axis: f64,
    /// Its standard uncertainty from the residuals, rad.
    pub u_axis: f64,
    /// Standard deviation of a residual.
    pub scatter: f64,
    /// Points less three.
    pub dof: usize,
}

/// Fits P(θ) = a + b·cos 2θ + c·sin 2θ to four points or more.
///
/// axis = ½ atan2(c, b); u(axis) = ½ u_⊥/√(b² + c²), u_⊥ the standard error across (b, c). Malus 1809; any optics text.
pub(crate) fn fit(points: &[(f64, f64)]) -> Option<Malus> {
    let design: Vec<f64> =
        points.iter().flat_map(|(angle, _)| [1.0, (2.0 * angle).cos(), (2.0 * angle).sin()]).collect();
    let rhs: Vec<f64> = points.iter().map(|(_, signal)| *signal).collect();
    let fit = linear::weighted(&design, &rhs, &vec![1.0; rhs.len()]).ok()?;
    let [mean, b, c] = fit.coefficients[..] else { return None };
    let scatter = fit.reduced_chi_square()?.sqrt();
    let swing = b.hypot(c);
    if !swing.is_finite() || swing <= 0.0 {
        return None;
    }
    let covariance = |i: usize, j: usize| fit.covariance.get(3 * i + j).copied().unwrap_or(f64::NAN);
    // Variance across the direction (b, c): of −sin·b + cos·c.
    let (cos, sin) = (b / swing, c / swing);
    let across = sin * sin * covariance(1, 1) - 2.0 * sin * cos * covariance(1, 2) + cos * cos * covariance(2, 2);
    let u_axis = 0.5 * scatter * across.max(0.0).sqrt() / swing;
    let axis = turned(0.5 * c.atan2(b));
    u_axis.is_finite().then_some(Malus { mean, swing, axis, u_axis, scatter, dof: fit.degrees_of_freedom })
}

/// An axis modulo 180°, into [0, π).
pub(crate) fn turned(angle: f64) -> f64 {
    // A tiny negative angle comes out as π itself.
    let angle = angle.rem_euclid(std::f64::consts::PI);
    if angle >= std::f64::consts::PI { 0.0 } else { angle }
}

/// Least signal of a fine scan through the null, by a parabola: (least, its standard uncertainty, angle of it).
///
/// * `points`: (angle less the expected null, rad; signal). sin² is a parabola within 0.04 % at 2°.
pub(crate) fn null(points: &[(f64, f64)]) -> Option<(f64, f64, f64)> {
    let design: Vec<f64> = points.iter().flat_map(|(x, _)| [1.0, *x, x * x]).collect();
    let rhs: Vec<f64> = points.iter().map(|(_, signal)| *signal).collect();
    let fit = linear::weighted(&design, &rhs, &vec![1.0; rhs.len()]).ok()?;
    let [a, b, c] = fit.coefficients[..] else { return None };
    if !c.is_finite() || c <= 0.0 {
        return None;
    }
    let at = -b / (2.0 * c);
    // Gradient of a − b²/4c.
    let gradient = [1.0, at, at * at];
    let scatter = fit.reduced_chi_square()?;
    let mut variance = 0.0;
    for i in 0..3 {
        for j in 0..3 {
            variance +=
                gradient[i] * gradient[j] * fit.covariance.get(3 * i + j).copied().unwrap_or(f64::NAN) * scatter;
        }
    }
    let least = a - b * b / (4.0 * c);
    let u = variance.max(0.0).sqrt();
    (least.is_finite() && u.is_finite() && at.is_finite()).then_some((least, u, at))
}

/// Signed difference of two axes modulo 180°, into (−90°, 90°].
pub(crate) fn difference(one: f64, other: f64) -> f64 {
    let turned = turned(one - other);
    if turned > std::f64::consts::FRAC_PI_2 { turned - std::f64::consts::PI } else { turned }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn finds_an_axis_and_its_uncertainty() {
        let axis = 170f64.to_radians();
        let points: Vec<_> = (0..12)
            .map(|i| (f64::from(i) * 15f64.to_radians(), if i % 2 == 0 { 0.01 } else { -0.01 }))
            .map(|(angle, error)| (angle, 1.0 + (2.0 * (angle - axis)).cos() + error))
            .collect();
        let found = fit(&points).unwrap();
        assert!((found.axis - axis).abs() < 3.0 * found.u_axis + 1e-12);
        // u_⊥ = s·√(2/12) for even angles.
        let expected = 0.5 * found.scatter * (2.0_f64 / 12.0).sqrt() / found.swing;
        assert!((found.u_axis / expected - 1.0).abs() < 1e-9);
    }

    #[test]
    fn parabola_through_the_null() {
        let points: Vec<_> = (-4..=4)
            .map(|i| f64::from(i) * 0.5f64.to_radians())
            .map(|x| (x, 0.002 + (x - 0.003).sin().powi(2)))
            .collect();
        let (least, _, at) = null(&points).unwrap();
        // sin² departs from the parabola by x⁴/3: 5e-7 at 2°.
        assert!((least - 0.002).abs() < 5e-7 && (at - 0.003).abs() < 1e-5, "{least} {at}");
    }

    #[test]
    fn axes_are_modulo_a_half_turn() {
        assert!((difference(1f64.to_radians(), 179f64.to_radians()).to_degrees() - 2.0).abs() < 1e-9);
        assert_eq!(turned(-1e-18), 0.0);
    }
}
