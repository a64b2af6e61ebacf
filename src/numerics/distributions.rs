//! Normal and Student distributions, thin over a library.
//! Must not decide a coverage probability.
//! Main entries: [`coverage_factor`], [`normal_cdf`], [`student_t_quantile`].

use statrs::distribution::{ChiSquared, ContinuousCDF, Normal, StudentsT};

/// Beyond this many degrees of freedom the normal distribution is used: the relative difference of quantiles, (z² +
/// 1)/(4ν), is below 1e-6 for |z| up to 5 or so.
const NORMAL_FROM: f64 = 1e7;

/// Probability that a standard normal value is at most `z`. NaN for NaN.
pub fn normal_cdf(z: f64) -> f64 {
    if z.is_nan() { f64::NAN } else { Normal::standard().cdf(z) }
}

/// z with [`normal_cdf`]`(z) = probability`; `None` unless the probability is above 0 and below 1.
pub fn normal_quantile(probability: f64) -> Option<f64> {
    inside(probability).then(|| Normal::standard().inverse_cdf(probability))
}

/// Probability that a Student t value with `degrees_of_freedom` (above 0, may be fractional or infinite) is at most
/// `t`. `None` for NaN or degrees of freedom that are not above 0.
pub fn student_t_cdf(t: f64, degrees_of_freedom: f64) -> Option<f64> {
    if t.is_nan() || degrees_of_freedom.is_nan() || degrees_of_freedom <= 0.0 {
        return None;
    }
    if degrees_of_freedom >= NORMAL_FROM || t.is_infinite() {
        return Some(normal_cdf(t));
    }
    Some(StudentsT::new(0.0, 1.0, degrees_of_freedom).ok()?.cdf(t))
}

/// t with [`student_t_cdf`]`(t, ν) = probability`. `None` unless 0 < probability < 1 and ν > 0, or if t exceeds 1e300.
///
/// # Method
/// Bisection of the cumulative probability in the upper tail, to the last bits; the lower tail by symmetry.
pub fn student_t_quantile(probability: f64, degrees_of_freedom: f64) -> Option<f64> {
    if !inside(probability) || degrees_of_freedom.is_nan() || degrees_of_freedom <= 0.0 {
        return None;
    }
    if degrees_of_freedom >= NORMAL_FROM {
        return normal_quantile(probability);
    }
    if probability == 0.5 {
        return Some(0.0);
    }
    let distribution = StudentsT::new(0.0, 1.0, degrees_of_freedom).ok()?;
    // The lower tail keeps its digits where the upper one rounds to 1.
    let tail = probability.min(1.0 - probability);
    let mut far = 1.0;
    while distribution.cdf(-far) > tail {
        far *= 2.0;
        if far > 1e300 {
            return None;
        }
    }
    let mut near = 0.0;
    loop {
        let middle = 0.5 * (near + far);
        if middle <= near || middle >= far {
            break;
        }
        if distribution.cdf(-middle) > tail { near = middle } else { far = middle }
    }
    Some(if probability < 0.5 { -far } else { far })
}

/// Factor k with which ±k standard uncertainties cover `probability`, two-sided.
///
/// * `probability`: above 0, below 1, for instance 0.95.
/// * `degrees_of_freedom`: above 0, may be fractional; infinite for the normal distribution.
///
/// `None` outside these. Formula: k = t₍₁₊ₚ₎⸝₂(ν). Source: JCGM 100:2008, G.3.
///
/// ```
/// use tubewright::numerics::distributions::coverage_factor;
/// // Published table: 95 %, 10 degrees of freedom.
/// assert!(coverage_factor(0.95, 10.0).is_some_and(|k| (k - 2.228).abs() < 0.0005));
/// ```
pub fn coverage_factor(probability: f64, degrees_of_freedom: f64) -> Option<f64> {
    inside(probability).then_some(())?;
    // From the lower tail: (1 − p)/2 keeps its digits for p near 1.
    student_t_quantile(0.5 * (1.0 - probability), degrees_of_freedom).map(|t| -t)
}

/// Ratio by which stated uncertainties are too small, √(χ²/ν) (Birge 1932), where χ² is larger than chance allows; else 1.
///
/// * `chi_square`: Σ of squared residuals over their variances. * `degrees_of_freedom`: ν, above 0.
///
/// Chance allows χ² up to the 95 % point of its distribution: below it the residuals do not contradict what is stated.
///
/// ```
/// use tubewright::numerics::distributions::excess_ratio;
/// // The 95 % point for 4 degrees of freedom is 9.488 (published tables).
/// assert_eq!(excess_ratio(9.4, 4.0), 1.0);
/// assert!((excess_ratio(9.6, 4.0) - 2.4f64.sqrt()).abs() < 1e-12);
/// ```
pub fn excess_ratio(chi_square: f64, degrees_of_freedom: f64) -> f64 {
    let Ok(distribution) = ChiSquared::new(degrees_of_freedom) else { return 1.0 };
    let excessive = chi_square > 0.0 && distribution.cdf(chi_square) > 0.95;
    if excessive { (chi_square / degrees_of_freedom).sqrt().max(1.0) } else { 1.0 }
}

fn inside(probability: f64) -> bool {
    probability > 0.0 && probability < 1.0
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// Published tables of t (JCGM 100:2008, table G.2, three digits as printed there) and exact values:
    /// ν = 1: tan(π·p/2); ν = 2: p·√(2/(1 − p²)).
    #[test]
    fn coverage_factors_of_published_tables() {
        for (probability, dof, expected) in [
            (0.95, 4.0, 2.78),
            (0.95, 9.0, 2.26),
            (0.95, 20.0, 2.09),
            (0.99, 10.0, 3.17),
            (0.9545, 10.0, 2.28),
            (0.95, f64::INFINITY, 1.960),
        ] {
            let k = coverage_factor(probability, dof).unwrap();
            // Printed to two decimals.
            assert!((k - expected).abs() < 0.005 + 1e-9, "{probability} {dof}: {k}");
        }
        for p in [0.1, 0.5, 0.95, 0.9973] {
            let one = coverage_factor(p, 1.0).unwrap();
            assert!((one / (0.5 * std::f64::consts::PI * p).tan() - 1.0).abs() < 1e-9, "{p}: {one}");
            let two = coverage_factor(p, 2.0).unwrap();
            assert!((two / (p * (2.0 / (1.0 - p * p)).sqrt()) - 1.0).abs() < 1e-9, "{p}: {two}");
        }
    }

    #[test]
    fn normal_values() {
        // Φ(1.959963984540054) = 0.975 to the last digit (published tables); the library keeps ten digits.
        assert!((normal_cdf(1.959963984540054) - 0.975).abs() < 1e-10);
        assert!((normal_quantile(0.975).unwrap() - 1.959963984540054).abs() < 1e-9);
        assert!((coverage_factor(0.95, 1e9).unwrap() - 1.959963984540054).abs() < 1e-8);
        assert!((coverage_factor(0.95, 0.9e7).unwrap() - 1.959963984540054).abs() < 1e-6);
    }

    #[test]
    fn quantile_and_cdf_are_inverse() {
        for dof in [0.7, 1.0, 3.5, 30.0, 1e5] {
            for probability in [1e-6, 0.01, 0.3, 0.5, 0.9, 0.999] {
                let t = student_t_quantile(probability, dof).unwrap();
                assert!((student_t_cdf(t, dof).unwrap() / probability - 1.0).abs() < 1e-9, "{dof} {probability} {t}");
            }
        }
    }

    #[test]
    fn outside_the_range_is_none() {
        for (probability, dof) in [(0.0, 5.0), (1.0, 5.0), (f64::NAN, 5.0), (0.5, 0.0), (0.5, -1.0), (0.5, f64::NAN)] {
            assert_eq!(coverage_factor(probability, dof), None);
            assert_eq!(student_t_quantile(probability, dof), None);
        }
        assert_eq!(student_t_cdf(f64::NAN, 1.0), None);
        assert_eq!(student_t_cdf(f64::INFINITY, 1.0), Some(1.0));
        assert!(normal_cdf(f64::NAN).is_nan());
        assert_eq!((normal_cdf(f64::INFINITY), normal_cdf(f64::NEG_INFINITY)), (1.0, 0.0));
        // Tiny degrees of freedom overflow rather than loop.
        student_t_quantile(1e-300, 1e-3);
        student_t_quantile(0.3, 1e-300);
        student_t_cdf(1e300, 1e-300);
    }
}
