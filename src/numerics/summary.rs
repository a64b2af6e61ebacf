//! Numbers that sum up a list: location, scatter, quantiles, weighted mean, straight line.
//! Must not drop outliers or choose between estimators.
//! Main entries: [`mean`], [`standard_deviation`], [`median`], [`quantile`], [`weighted_mean`], [`straight_line`].
//!
//! All give `None` for an empty list or a value that is not finite, so that a missing value never turns into a number.

use super::linear::{self, LinearError};

/// Standard deviation of a normal distribution over its median absolute deviation, 1/Φ⁻¹(3/4).
pub const NORMAL_SD_PER_MAD: f64 = 1.482602218505602;

/// Arithmetic mean.
pub fn mean(values: &[f64]) -> Option<f64> {
    if values.is_empty() || !all_finite(values) {
        return None;
    }
    let n = values.len() as f64;
    let rough = values.iter().map(|x| x / n).sum::<f64>();
    // A second pass removes the rounding of the first.
    let mean = rough + values.iter().map(|x| (x - rough) / n).sum::<f64>();
    mean.is_finite().then_some(mean)
}

/// Standard deviation with n − 1; `None` for fewer than two values.
pub fn standard_deviation(values: &[f64]) -> Option<f64> {
    if values.len() < 2 {
        return None;
    }
    let mean = mean(values)?;
    let sum: f64 = values.iter().map(|x| (x - mean).powi(2)).sum();
    Some((sum / (values.len() - 1) as f64).sqrt())
}

/// Median; the mean of the middle two of an even number.
pub fn median(values: &[f64]) -> Option<f64> {
    quantile(values, 0.5)
}

/// Median of the distances from the median, not scaled; times [`NORMAL_SD_PER_MAD`] it estimates the standard
/// deviation of normal data.
pub fn median_absolute_deviation(values: &[f64]) -> Option<f64> {
    let middle = median(values)?;
    median(&values.iter().map(|x| (x - middle).abs()).collect::<Vec<f64>>())
}

/// Value below which the `fraction` (0 to 1, ends included) of the values lies.
///
/// # Method
/// Linear interpolation between the sorted values at position fraction·(n − 1) from 0; type 7 of Hyndman & Fan 1996
/// (from memory).
pub fn quantile(values: &[f64], fraction: f64) -> Option<f64> {
    if values.is_empty() || !all_finite(values) || !(0.0..=1.0).contains(&fraction) {
        return None;
    }
    let position = fraction * (values.len() - 1) as f64;
    let (below, part) = (position.floor() as usize, position.fract());
    let mut values = values.to_vec();
    let (_, low, above) = values.select_nth_unstable_by(below, f64::total_cmp);
    let low = *low;
    let high = above.iter().copied().min_by(f64::total_cmp).unwrap_or(low);
    // Both ends weighted: no overflow of the difference.
    Some(if part == 0.0 { low } else { low * (1.0 - part) + high * part })
}

/// Result of [`weighted_mean`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WeightedMean {
    /// Σ x/u² over Σ 1/u².
    pub mean: f64,
    /// Uncertainty that follows from the single ones: 1/√(Σ 1/u²).
    pub u_internal: f64,
    /// Uncertainty that follows from the scatter found: `u_internal` · Birge ratio; `None` for one value.
    pub u_external: Option<f64>,
    /// √(Σ ((x − mean)/u)² / (n − 1)): near 1 if the uncertainties explain the scatter, above if they are too small.
    /// `None` for one value.
    pub birge_ratio: Option<f64>,
}

/// Mean of `values` weighted by 1/u². `None` for an empty list, unequal lengths, a value that is not finite, or an
/// uncertainty not above 0. Source: Birge 1932 (from memory).
pub fn weighted_mean(values: &[f64], uncertainties: &[f64]) -> Option<WeightedMean> {
    let n = values.len();
    let positive = uncertainties.iter().all(|u| u.is_finite() && *u > 0.0);
    if n == 0 || uncertainties.len() != n || !all_finite(values) || !positive {
        return None;
    }
    // Weights relative to the best value, so that tiny uncertainties do not overflow.
    let best = uncertainties.iter().copied().fold(f64::INFINITY, f64::min);
    let weights: Vec<f64> = uncertainties.iter().map(|u| (best / u).powi(2)).collect();
    let total: f64 = weights.iter().sum();
    let mean = values.iter().zip(&weights).map(|(x, w)| x * (w / total)).sum::<f64>();
    let u_internal = best / total.sqrt();
    let chi_square: f64 = values.iter().zip(uncertainties).map(|(x, u)| ((x - mean) / u).powi(2)).sum();
    let birge_ratio = (n > 1).then(|| (chi_square / (n - 1) as f64).sqrt());
    mean.is_finite().then_some(WeightedMean {
        mean,
        u_internal,
        u_external: birge_ratio.map(|b| b * u_internal),
        birge_ratio,
    })
}

/// A straight line y = intercept + slope·x; see [`straight_line`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StraightLine {
    /// Value at x = 0.
    pub intercept: f64,
    /// Change of y per unit of x.
    pub slope: f64,
    /// Standard uncertainty of the intercept from the scatter; `None` for two points.
    pub u_intercept: Option<f64>,
    /// Standard uncertainty of the slope from the scatter; `None` for two points.
    pub u_slope: Option<f64>,
    /// Covariance of intercept and slope from the scatter; `None` for two points.
    pub covariance: Option<f64>,
    /// Standard deviation of the points about the line (n − 2); `None` for two points.
    pub residual_sd: Option<f64>,
    /// Points minus 2.
    pub degrees_of_freedom: usize,
}

impl StraightLine {
    /// Value of the line at `x`, and its standard uncertainty from the scatter of the points.
    pub fn at(&self, x: f64) -> (f64, Option<f64>) {
        let variance = || Some(self.u_intercept?.powi(2) + 2.0 * x * self.covariance? + (x * self.u_slope?).powi(2));
        // Rounding may bring a tiny variance below 0.
        (self.intercept + self.slope * x, variance().map(|v| v.max(0.0).sqrt()))
    }
}

/// Unweighted straight line through points (`x`, `y`).
///
/// # Errors
/// [`LinearError`] for unequal lengths, fewer than two points, values that are not finite, or all x equal.
///
/// # Method
/// Least squares about the mean of x, which keeps the digits where x has a large offset; then moved to x = 0.
pub fn straight_line(x: &[f64], y: &[f64]) -> Result<StraightLine, LinearError> {
    if x.len() != y.len() || x.is_empty() {
        return Err(LinearError::Lengths { design: 2 * x.len(), rows: y.len(), weights: y.len() });
    }
    let center = mean(x).ok_or(LinearError::NotFinite)?;
    let largest = x.iter().map(|x| (x - center).abs()).fold(0.0, f64::max);
    if largest == 0.0 && x.len() > 1 {
        return Err(LinearError::Singular);
    }
    let design: Vec<f64> = x.iter().flat_map(|x| [1.0, x - center]).collect();
    let fit = linear::weighted(&design, y, &vec![1.0; y.len()])?;
    let (at_center, slope) = (fit.coefficients[0], fit.coefficients[1]);
    let variance = fit.reduced_chi_square();
    let [v00, v01, v11] = [fit.covariance[0], fit.covariance[1], fit.covariance[3]];
    let at_zero = v00 - 2.0 * center * v01 + center * center * v11;
    Ok(StraightLine {
        intercept: at_center - slope * center,
        slope,
        u_intercept: variance.map(|s| (s * at_zero).sqrt()),
        u_slope: variance.map(|s| (s * v11).sqrt()),
        covariance: variance.map(|s| s * (v01 - center * v11)),
        residual_sd: variance.map(f64::sqrt),
        degrees_of_freedom: fit.degrees_of_freedom,
    })
}

fn all_finite(values: &[f64]) -> bool {
    values.iter().all(|x| x.is_finite())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn near(found: Option<f64>, expected: f64) -> bool {
        found.is_some_and(|x| (x - expected).abs() <= 1e-13 * expected.abs().max(1.0))
    }

    #[test]
    fn a_list_by_hand() {
        let list = [2.0, 4.0, 4.0, 4.0, 5.0, 5.0, 7.0, 9.0];
        assert!(near(mean(&list), 5.0) && near(median(&list), 4.5));
        assert!(near(standard_deviation(&list), (32.0f64 / 7.0).sqrt()));
        // Distances from 4.5: 2.5 .5 .5 .5 .5 .5 2.5 4.5.
        assert!(near(median_absolute_deviation(&list), 0.5));
        assert!(near(quantile(&list, 0.0), 2.0) && near(quantile(&list, 1.0), 9.0));
        // Position 0.9·7 = 6.3 between 7 and 9.
        assert!(near(quantile(&list, 0.9), 7.6));
    }

    #[test]
    fn a_large_offset_keeps_the_scatter() {
        // As in the NIST set NumAcc4: 10000000.2 with ±0.1; sd 0.1 to the digits that doubles near 1e7 hold (2e-9 /
        // 0.1).
        let list: Vec<f64> = (0..1001).map(|i| 1e7 + [0.2, 0.1, 0.3][if i == 0 { 0 } else { 1 + i % 2 }]).collect();
        assert!((standard_deviation(&list).unwrap() - 0.1).abs() < 1e-8);
    }

    #[test]
    fn weighted_mean_by_hand() {
        // Weights 1 and 1/4: (10 + 12/4)/(1.25) = 10.4; chi² = 0.16 + 0.64.
        let found = weighted_mean(&[10.0, 12.0], &[1.0, 2.0]).unwrap();
        assert!(near(Some(found.mean), 10.4) && near(Some(found.u_internal), 0.8f64.sqrt()));
        assert!(near(found.birge_ratio, 0.8f64.sqrt()) && near(found.u_external, 0.8));
        let single = weighted_mean(&[3.0], &[1e-200]).unwrap();
        assert_eq!((single.mean, single.birge_ratio, single.u_external), (3.0, None, None));
    }

    #[test]
    fn line_by_hand() {
        // Same data as in `linear`, x moved by 1000: slope 1.2, value 0.7 at x = 1000, residual variance 0.9.
        let line = straight_line(&[1000.0, 1001.0, 1002.0, 1003.0], &[1.0, 2.0, 2.0, 5.0]).unwrap();
        assert!((line.slope - 1.2).abs() < 1e-12 && near(line.u_slope, 0.18f64.sqrt()));
        let (value, u) = line.at(1000.0);
        // The move to x = 0 and back costs six digits of the variance.
        assert!((value - 0.7).abs() < 1e-9 && (u.unwrap() - 0.63f64.sqrt()).abs() < 1e-7);
        assert!(near(line.residual_sd, 0.9f64.sqrt()));
        let two = straight_line(&[0.0, 1.0], &[1.0, 3.0]).unwrap();
        assert_eq!((two.u_slope, two.degrees_of_freedom, two.at(2.0).1), (None, 0, None));
    }

    #[test]
    fn bad_input() {
        for list in [&[][..], &[f64::NAN], &[1.0, f64::INFINITY]] {
            assert_eq!((mean(list), median(list), standard_deviation(list)), (None, None, None));
            assert_eq!((quantile(list, 0.5), median_absolute_deviation(list)), (None, None));
        }
        assert_eq!((standard_deviation(&[1.0]), quantile(&[1.0], 1.5), quantile(&[1.0], f64::NAN)), (None, None, None));
        assert_eq!(weighted_mean(&[], &[]), None);
        assert_eq!(weighted_mean(&[1.0], &[]), None);
        assert_eq!(weighted_mean(&[1.0], &[0.0]), None);
        assert!(matches!(straight_line(&[], &[]), Err(LinearError::Lengths { .. })));
        assert!(matches!(straight_line(&[1.0], &[1.0]), Err(LinearError::TooFewRows { .. })));
        assert_eq!(straight_line(&[1.0, 1.0], &[1.0, 2.0]), Err(LinearError::Singular));
        assert_eq!(straight_line(&[1.0, f64::NAN], &[1.0, 2.0]), Err(LinearError::NotFinite));
    }
}
