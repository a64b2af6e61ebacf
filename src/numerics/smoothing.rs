//! Smoothing of equally spaced samples, and the noise that is left in them.
//! Must not choose a window by itself.
//! Main entries: [`moving_mean`], [`moving_median`], [`SavitzkyGolay`], [`noise_from_differences`].

use super::linear;
use super::summary::{NORMAL_SD_PER_MAD, median_absolute_deviation};

/// Mean of the samples within `half_width` of each sample; windows are cut off at the ends, so the length stays.
///
/// Values that are not finite are left out; a window without any finite value gives NaN. Time grows as n.
pub fn moving_mean(signal: &[f64], half_width: usize) -> Vec<f64> {
    // Running totals about the mean, so that a large offset does not eat the digits.
    let finite = || signal.iter().filter(|x| x.is_finite());
    let count = finite().count().max(1) as f64;
    let center = finite().map(|x| x / count).sum::<f64>();
    let mut totals = vec![(0.0, 0usize)];
    let (mut sum, mut n) = (0.0, 0);
    for x in signal {
        if x.is_finite() {
            (sum, n) = (sum + (x - center), n + 1);
        }
        totals.push((sum, n));
    }
    windows(signal.len(), half_width)
        .map(|(from, to)| center + (totals[to].0 - totals[from].0) / (totals[to].1 - totals[from].1) as f64)
        .collect()
}

/// Median of the samples within `half_width` of each sample; windows are cut off at the ends, so the length stays.
///
/// Values that are not finite are left out; a window without any finite value gives NaN. Of an even number the mean
/// of the middle two. Method: a sorted window, updated by binary search; time grows as n·(log w + moves within w).
pub fn moving_median(signal: &[f64], half_width: usize) -> Vec<f64> {
    let mut sorted: Vec<f64> = Vec::new();
    let (mut begin, mut end) = (0, 0);
    let mut result = Vec::with_capacity(signal.len());
    for (from, to) in windows(signal.len(), half_width) {
        for x in signal[end..to].iter().filter(|x| x.is_finite()) {
            sorted.insert(sorted.partition_point(|s| s < x), *x);
        }
        for x in signal[begin..from].iter().filter(|x| x.is_finite()) {
            // Present, because it was inserted when the window reached it.
            sorted.remove(sorted.partition_point(|s| s < x));
        }
        (begin, end) = (from, to);
        let middle = sorted.len() / 2;
        result.push(match sorted.len() {
            0 => f64::NAN,
            n if n % 2 == 1 => sorted[middle],
            _ => 0.5 * sorted[middle - 1] + 0.5 * sorted[middle],
        });
    }
    result
}

fn windows(n: usize, half_width: usize) -> impl Iterator<Item = (usize, usize)> {
    (0..n).map(move |i| (i.saturating_sub(half_width), i.saturating_add(half_width).saturating_add(1).min(n)))
}

/// Wider windows than this are a mistake, and would only eat memory.
const LARGEST_HALF_WIDTH: usize = 1_000_000;
/// Powers beyond this cannot be told apart in double precision.
const LARGEST_ORDER: usize = 15;

/// Savitzky–Golay filter: a polynomial fitted to each window, evaluated at its middle.
#[derive(Debug, Clone, PartialEq)]
pub struct SavitzkyGolay {
    half_width: usize,
    derivative: usize,
    /// One row per power, one column per sample of the window: coefficients of the polynomial in t = offset /
    /// half_width.
    rows: Vec<Vec<f64>>,
}

impl SavitzkyGolay {
    /// Filter over 2·`half_width` + 1 samples with a polynomial of degree `order`; `derivative` 0 smooths, 1 gives
    /// the slope per sample, and so on.
    ///
    /// `None` if `half_width` is 0 or above a million, `order` does not fit below the window's length or is above 15,
    /// or `derivative` exceeds `order`.
    ///
    /// # Method
    /// Least squares of powers of t on the window; the filter is linear in the samples, coefficients are rows of
    /// (AᵀA)⁻¹Aᵀ. Source: Savitzky & Golay 1964 (from memory).
    pub fn new(half_width: usize, order: usize, derivative: usize) -> Option<Self> {
        let length = half_width.checked_mul(2)?.checked_add(1)?;
        if half_width == 0
            || half_width > LARGEST_HALF_WIDTH
            || order >= length
            || order > LARGEST_ORDER
            || derivative > order
        {
            return None;
        }
        let powers = order + 1;
        let offsets = (0..length).map(|i| (i as f64 - half_width as f64) / half_width as f64);
        let design: Vec<f64> = offsets.flat_map(|t| (0..powers).map(move |k| t.powi(k as i32))).collect();
        let normal = linear::weighted(&design, &vec![0.0; length], &vec![1.0; length]).ok()?.covariance;
        let row = |k: usize| {
            let sample = |a: &[f64]| (0..powers).map(|j| normal[k * powers + j] * a[j]).sum();
            design.chunks_exact(powers).map(sample).collect()
        };
        Some(Self { half_width, derivative, rows: (0..powers).map(row).collect() })
    }

    /// Coefficients of the window's samples for the value at its middle, first sample first.
    pub fn coefficients(&self) -> Vec<f64> {
        self.coefficients_at(0.0)
    }

    fn coefficients_at(&self, offset: f64) -> Vec<f64> {
        let (t, scale) = (offset / self.half_width as f64, (self.half_width as f64).powi(-(self.derivative as i32)));
        let mut result = vec![0.0; 2 * self.half_width + 1];
        for (k, row) in self.rows.iter().enumerate().skip(self.derivative) {
            let falling: f64 = (k - self.derivative + 1..=k).map(|x| x as f64).product();
            let factor = scale * falling * t.powi((k - self.derivative) as i32);
            for (r, c) in result.iter_mut().zip(row) {
                *r += factor * c;
            }
        }
        result
    }

    /// Filters `signal`; the length stays. The first and last `half_width` samples come from the polynomials of the
    /// outermost windows. A value that is not finite spoils the windows it is in. `None` if the signal is shorter
    /// than the window.
    pub fn apply(&self, signal: &[f64]) -> Option<Vec<f64>> {
        let (h, length) = (self.half_width, 2 * self.half_width + 1);
        if signal.len() < length {
            return None;
        }
        let dot = |c: &[f64], window: &[f64]| c.iter().zip(window).map(|(c, x)| c * x).sum::<f64>();
        let (first, last) = (&signal[..length], &signal[signal.len() - length..]);
        let middle = self.coefficients();
        let mut result: Vec<f64> = (0..h).map(|i| dot(&self.coefficients_at(i as f64 - h as f64), first)).collect();
        result.extend(signal.windows(length).map(|window| dot(&middle, window)));
        result.extend((1..=h).map(|i| dot(&self.coefficients_at(i as f64), last)));
        Some(result)
    }
}

/// Standard deviation of white noise on a slowly varying signal, from the differences of neighbours; peaks and steps
/// hardly disturb it.
///
/// Differences that are not finite are left out; `None` with fewer than two differences. Quantized signals whose
/// neighbours are mostly equal give 0. Formula: 1.4826 · median(|d − median(d)|) / √2 with d the differences (common
/// practice).
pub fn noise_from_differences(signal: &[f64]) -> Option<f64> {
    let differences: Vec<f64> = signal.windows(2).map(|w| w[1] - w[0]).filter(|d| d.is_finite()).collect();
    if differences.len() < 2 {
        return None;
    }
    Some(NORMAL_SD_PER_MAD * median_absolute_deviation(&differences)? / std::f64::consts::SQRT_2)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn near(a: &[f64], b: &[f64]) -> bool {
        // Values of order one to ten, a few roundings each.
        a.len() == b.len() && a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-12)
    }

    #[test]
    fn means_and_medians_by_hand() {
        let signal = [1.0, 2.0, 6.0, 4.0, 5.0];
        assert!(near(&moving_mean(&signal, 1), &[1.5, 3.0, 4.0, 5.0, 4.5]));
        assert!(near(&moving_median(&signal, 1), &[1.5, 2.0, 4.0, 5.0, 4.5]));
        assert!(near(&moving_median(&signal, 0), &signal) && near(&moving_mean(&signal, 0), &signal));
        assert!(near(&moving_mean(&signal, usize::MAX), &[3.6; 5]));
        assert!(near(&moving_median(&signal, usize::MAX), &[4.0; 5]));
        assert!(moving_mean(&[], 3).is_empty() && moving_median(&[], 3).is_empty());
    }

    #[test]
    fn values_that_are_not_finite_are_left_out() {
        let signal = [1.0, f64::NAN, 3.0, f64::INFINITY];
        assert!(near(&moving_mean(&signal, 1), &[1.0, 2.0, 3.0, 3.0]));
        assert!(near(&moving_median(&signal, 1), &[1.0, 2.0, 3.0, 3.0]));
        assert!(moving_mean(&signal, 0)[1].is_nan() && moving_median(&signal, 0)[1].is_nan());
    }

    /// Published table: five points, quadratic: (−3, 12, 17, 12, −3)/35; slope (−2, −1, 0, 1, 2)/10 (Savitzky & Golay
    /// 1964).
    #[test]
    fn published_coefficients() {
        let smooth = SavitzkyGolay::new(2, 2, 0).unwrap().coefficients();
        assert!(near(&smooth, &[-3.0, 12.0, 17.0, 12.0, -3.0].map(|x| x / 35.0)));
        assert!(near(&SavitzkyGolay::new(2, 2, 1).unwrap().coefficients(), &[-0.2, -0.1, 0.0, 0.1, 0.2]));
    }

    #[test]
    fn a_cubic_passes_unchanged_up_to_the_ends() {
        let cubic: Vec<f64> = (0..20).map(|i| 1.0 + (f64::from(i) - 9.0).powi(3) * 0.001).collect();
        assert!(near(&SavitzkyGolay::new(3, 3, 0).unwrap().apply(&cubic).unwrap(), &cubic));
        let slope: Vec<f64> = (0..20).map(|i| 0.003 * (f64::from(i) - 9.0).powi(2)).collect();
        assert!(near(&SavitzkyGolay::new(3, 3, 1).unwrap().apply(&cubic).unwrap(), &slope));
    }

    #[test]
    fn impossible_filters_are_none() {
        for (half, order, derivative) in
            [(0, 0, 0), (2, 5, 0), (2, 2, 3), (usize::MAX, 2, 0), (usize::MAX / 4, 2, 0), (40, 16, 0)]
        {
            assert_eq!(SavitzkyGolay::new(half, order, derivative), None);
        }
        assert_eq!(SavitzkyGolay::new(2, 2, 0).unwrap().apply(&[1.0; 4]), None);
    }

    #[test]
    fn noise_of_a_known_pattern() {
        // Differences ±2 in turn: median 0 or ±2 by count; 5 of them: 2 −2 2 −2 2 → median 2, deviations 0 4 0 4 0 → 0.
        assert_eq!(noise_from_differences(&[0.0, 2.0, 0.0, 2.0, 0.0, 2.0]), Some(0.0));
        // Differences 1, −1, 3, −3: median 0, deviations 1 1 3 3 → 2.
        let noise = noise_from_differences(&[0.0, 1.0, 0.0, 3.0, 0.0]).unwrap();
        assert!((noise - 1.482602218505602 * 2.0 / 2f64.sqrt()).abs() < 1e-12);
        assert_eq!(noise_from_differences(&[1.0, 2.0]), None);
        assert_eq!(noise_from_differences(&[f64::NAN; 5]), None);
    }
}
