//! Cumulative sums of a series against its target: a small lasting shift shows long before a single value is out.
//! Must not decide what an alarm means.
//! Main functions: [`cusum`], [`sd_of_moving_range`].

/// Two-sided tabular CUSUM of standardized deviations.
///
/// * `z`: (value − target) / standard deviation, in the order of time.
/// * `k`: slack, in standard deviations: half the shift to be found.
///
/// Returns (S⁺, S⁻) after each value: S⁺ᵢ = max(0, S⁺ᵢ₋₁ + zᵢ − k), S⁻ᵢ = max(0, S⁻ᵢ₋₁ − zᵢ − k), both from 0.
/// A value that is not finite leaves the sums as they were.
///
/// Source: Page, Biometrika 41, 100 (1954); tabular form as in the NIST/SEMATECH e-Handbook of Statistical Methods, 6.3.2.3.
pub fn cusum(z: &[f64], k: f64) -> Vec<(f64, f64)> {
    let mut sums = (0.0_f64, 0.0_f64);
    z.iter()
        .map(|z| {
            if z.is_finite() {
                sums = ((sums.0 + z - k).max(0.0), (sums.1 - z - k).max(0.0));
            }
            sums
        })
        .collect()
}

/// Standard deviation from the mean moving range of neighbours: mean |xᵢ − xᵢ₋₁| / 1.128, which a slow drift hardly moves.
///
/// None for fewer than two values. Source of 1.128, d₂ for two: NIST/SEMATECH e-Handbook, 6.3.2.2.
pub fn sd_of_moving_range(values: &[f64]) -> Option<f64> {
    let n = values.len().checked_sub(1).filter(|n| *n > 0)?;
    Some(values.windows(2).map(|pair| (pair[1] - pair[0]).abs()).sum::<f64>() / n as f64 / 1.128)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use rand_chacha::ChaCha8Rng;
    use rand_core::{RngCore as _, SeedableRng as _};
    use statrs::distribution::{ContinuousCDF as _, Normal};

    use super::*;

    #[test]
    fn sums_by_hand() {
        let sums = cusum(&[1.0, -0.5, f64::NAN, 2.0, -3.0], 0.25);
        assert_eq!(sums, [(0.75, 0.0), (0.0, 0.25), (0.0, 0.25), (1.75, 0.0), (0.0, 2.75)]);
    }

    #[test]
    fn moving_range_by_hand() {
        assert!((sd_of_moving_range(&[1.0, 2.0, 0.0]).unwrap() - 1.5 / 1.128).abs() < 1e-12);
        assert_eq!(sd_of_moving_range(&[1.0]), None);
    }

    /// Mean number of values until either sum passes `h`; `drift` in standard deviations a value.
    fn run_length(drift: f64, k: f64, h: f64, runs: u64) -> f64 {
        let normal = Normal::standard();
        let length = |seed: u64| {
            let mut random = ChaCha8Rng::seed_from_u64(seed);
            let mut sums = (0.0_f64, 0.0_f64);
            let mut n = 0.0;
            while sums.0 <= h && sums.1 <= h {
                n += 1.0;
                let uniform = (random.next_u64() as f64 + 0.5) / 2f64.powi(64);
                let z = normal.inverse_cdf(uniform) + drift * n;
                sums = ((sums.0 + z - k).max(0.0), (sums.1 - z - k).max(0.0));
            }
            n
        };
        (0..runs).map(length).sum::<f64>() / runs as f64
    }

    #[test]
    fn false_alarms_and_drift_as_the_design_says() {
        // ARL₀ 367 at k = 0.25, h = 8 (design, by simulation; tables give 370 for h = 8.01). Lengths scatter by about
        // their mean: 1,500 runs leave 2.5 %, and four of those are the tolerance.
        let none = run_length(0.0, 0.25, 8.0, 1500);
        assert!((none / 367.0 - 1.0).abs() < 0.10, "{none}");
        // A drift of 0.06 SD a day is caught in 20 days by one check a day. Lengths scatter by a fifth: 400 runs leave 1 %.
        let drifting = run_length(0.06, 0.25, 8.0, 400);
        assert!((18.0..20.0).contains(&drifting), "{drifting}");
    }
}
