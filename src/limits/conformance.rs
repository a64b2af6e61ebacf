//! Zone and conformance probability of a value between bounds.
//! Must not decide: it knows neither rules nor grades.
//! Main functions: [`zone`], [`conformance_probability`].

use statrs::distribution::{ContinuousCDF, Normal, StudentsT};

use crate::{measurand::Shape, record::sheet::Zone};

/// Where a value lies against its bounds, by the expanded uncertainty; `None` without a bound.
///
/// All in the same unit; a missing bound is infinitely far away. On the edge of a zone the better one counts.
pub fn zone(value: f64, expanded: f64, lower: Option<f64>, upper: Option<f64>) -> Option<Zone> {
    if lower.is_none() && upper.is_none() {
        return None;
    }
    let inside = (value - lower.unwrap_or(f64::NEG_INFINITY)).min(upper.unwrap_or(f64::INFINITY) - value);
    Some(match inside {
        d if d >= expanded && d >= 0.0 => Zone::InsideByU,
        d if d >= 0.0 => Zone::Inside,
        d if d >= -expanded => Zone::Outside,
        _ => Zone::OutsideByU,
    })
}

/// Which distribution stands for what is known of the measurand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Family {
    /// Any sign.
    Symmetric,
    /// Cut at zero.
    Truncated,
    /// Logarithm is symmetric.
    Logarithmic,
}

/// Probability that the measurand lies between its bounds, given its value y and standard uncertainty u and nothing else.
///
/// * `key`, `shape`: say which distribution stands for it.
/// * `value`, `u`, `lower`, `upper`: in the same unit; `dof`: effective degrees of freedom.
///
/// With F the standard normal distribution, or Student's t with ⌊dof⌋ degrees of freedom where dof < 30:
/// 1. any sign: p = F((T_U − y)/u) − F((T_L − y)/u) (JCGM 106:2012, 7.4);
/// 2. never below zero (`Shape::Positive`): the same cut at zero, p = [F((T_U − y)/u) − F((max(T_L, 0) − y)/u)] / [1 − F(−y/u)];
/// 3. extinction, a ratio with a small denominator: its logarithm is symmetric about ln y with u/y,
///    p = F(ln(T_U/y)·y/u) − F(ln(T_L/y)·y/u).
///
/// Returns `None` without a bound or where value or uncertainty is not finite.
pub fn conformance_probability(
    (key, shape): (&str, Shape),
    (value, u, dof): (f64, f64, f64),
    lower: Option<f64>,
    upper: Option<f64>,
) -> Option<f64> {
    if (lower.is_none() && upper.is_none()) || !value.is_finite() || !u.is_finite() || u < 0.0 {
        return None;
    }
    let (low, high) = (lower.unwrap_or(f64::NEG_INFINITY), upper.unwrap_or(f64::INFINITY));
    if u == 0.0 {
        return Some(if (low..=high).contains(&value) { 1.0 } else { 0.0 });
    }
    let family = match shape {
        _ if key == "extinction" && value > 0.0 => Family::Logarithmic,
        Shape::Positive => Family::Truncated,
        Shape::Normal | Shape::Count => Family::Symmetric,
    };
    let p = match family {
        Family::Symmetric => between((low - value) / u, (high - value) / u, dof),
        Family::Truncated => {
            let possible = between(-value / u, f64::INFINITY, dof);
            if possible < f64::MIN_POSITIVE {
                // So far below zero that all that is left sits at zero itself.
                return Some(if low <= 0.0 && high >= 0.0 { 1.0 } else { 0.0 });
            }
            if high < 0.0 {
                return Some(0.0);
            }
            between((low.max(0.0) - value) / u, (high - value) / u, dof) / possible
        }
        Family::Logarithmic => {
            let z = |bound: f64| if bound <= 0.0 { f64::NEG_INFINITY } else { (bound / value).ln() * value / u };
            between(z(low), z(high), dof)
        }
    };
    Some(p.clamp(0.0, 1.0))
}

/// F(b) − F(a) for a ≤ b, taken on the side where it does not cancel.
fn between(a: f64, b: f64, dof: f64) -> f64 {
    let (a, b) = if a > 0.0 { (-b, -a) } else { (a, b) };
    (cdf(b, dof) - cdf(a, dof)).max(0.0)
}

fn cdf(z: f64, dof: f64) -> f64 {
    if z == f64::NEG_INFINITY {
        return 0.0;
    }
    if z == f64::INFINITY {
        return 1.0;
    }
    if dof < 30.0 {
        // Truncated to a whole number as the coverage factor is, so that a value inside by U has p ≥ 97.7 %.
        return StudentsT::new(0.0, 1.0, dof.floor().max(1.0)).map_or(f64::NAN, |t| t.cdf(z));
    }
    Normal::standard().cdf(z)
}
