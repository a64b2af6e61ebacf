//! Power over walk cycles: mean, ripple, drift.
//! Must not correct a meter's reading: that is done before.
//! Main type: [`CyclePower`]; main functions: [`cycle_power`], [`power_drift`].

use super::glimpse::Glimpse;
use crate::numerics::smoothing::SavitzkyGolay;
use crate::numerics::summary::{NORMAL_SD_PER_MAD, median, straight_line};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Time over which readings are averaged, s (definition of power).
const AVERAGE: f64 = 1.0;

/// Fewest averages in a window.
const LEAST_AVERAGES: usize = 5;

/// Averages over those that the ripple's smoothing spans: a twentieth of the window keeps the kinks of a ripple within
/// 1 % of it (found by trial on the ripple of one, two and four modes).
const SMOOTHED_PART: usize = 20;
/// Fewest averages that a parabola smooths.
const LEAST_SMOOTHED: usize = 5;

/// Fewest cycles for a drift: two more than a straight line needs.
const LEAST_CYCLES: usize = 4;

/// Power over a window of whole walk cycles.
#[derive(Debug, Clone, PartialEq)]
pub struct CyclePower {
    /// Mean of 1 s averages, W.
    pub mean: Measured,
    /// (max − min)/mean of 1 s averages, with what the noise alone would make taken off; never under 0.
    pub ripple: Measured,
    /// The ripple that noise alone would make.
    pub ripple_floor: f64,
    /// 1 s averages used.
    pub n_averages: usize,
}

/// Mean power and ripple between two times.
///
/// * `glimpses`: in order of time; those without a power are passed over.
/// * `window`: (from, to), s, of whole walk cycles.
///
/// `None` with fewer than five 1 s averages, or no light.
///
/// # Method
/// 1. Average readings within each second. 2. Noise of an average: robust scatter about the line through its
///    neighbours.
/// 3. Mean: each second counts by the time it stands for, as captures need not be even; its u is noise over √n.
/// 4. Ripple: averages are smoothed by running parabolas over a twentieth of the window, whose noise is σ·√(2.25/w), w
///    their length (Savitzky & Golay 1964). Extremes of m independent values of pure noise lie about f = 2√(2 ln m)·σ
///    apart (extreme value theory, leading term); much ripple is found too large by f/2, as only the values near an
///    extreme compete, and one with sharp peaks less. R from found² = R² + R·f + f²; half of f is left in doubt.
pub fn cycle_power(glimpses: &[Glimpse], window: (f64, f64)) -> Option<CyclePower> {
    let averages = averages(glimpses, window);
    let n = averages.len();
    if n < LEAST_AVERAGES {
        return None;
    }
    let noise = noise(&averages);
    let mean = time_mean(&averages, window);
    if !(mean.is_finite() && mean > 0.0) {
        return None;
    }
    let (found, left, independent) = extremes(&averages, noise);
    let found = found / mean;
    let ripple_floor = 2.0 * (2.0 * independent.ln()).sqrt() * left / mean;
    let dof = n as f64 - 1.0;
    let scatter = |value: f64, u: f64| {
        let line = BudgetLine::direct("scatter", "scatter of 1 s averages", Evaluation::TypeA, u, dof);
        Measured::with_line(value, line)
    };
    let free = (4.0 * found.powi(2) - 3.0 * ripple_floor.powi(2)).max(0.0).sqrt();
    let mut ripple = scatter(0.5 * (free - ripple_floor).max(0.0), std::f64::consts::SQRT_2 * left / mean);
    let u = 0.5 * ripple_floor / 3f64.sqrt();
    let words = "meter noise taken off the extremes";
    ripple.budget.push(BudgetLine::direct("meter noise", words, Evaluation::TypeB, u, f64::INFINITY));
    Some(CyclePower { mean: scatter(mean, noise / (n as f64).sqrt()), ripple, ripple_floor, n_averages: n })
}

/// Slope of cycle-averaged power against time over its mean, 1/s.
///
/// * `cycles`: (from, to), s, of each whole walk cycle, in order.
///
/// `None` with fewer than four cycles that have power.
pub fn power_drift(glimpses: &[Glimpse], cycles: &[(f64, f64)]) -> Option<Measured> {
    let means: Vec<(f64, f64)> = cycles
        .iter()
        .filter_map(|window| Some((0.5 * (window.0 + window.1), cycle_power(glimpses, *window)?.mean.value)))
        .collect();
    if means.len() < LEAST_CYCLES {
        return None;
    }
    let mean = means.iter().map(|m| m.1).sum::<f64>() / means.len() as f64;
    let (times, values): (Vec<f64>, Vec<f64>) = means.iter().map(|m| (m.0, m.1 / mean)).unzip();
    let fit = straight_line(&times, &values).ok()?;
    let line = BudgetLine::direct(
        "scatter",
        "scatter of cycle means about their line",
        Evaluation::TypeA,
        fit.u_slope?,
        fit.degrees_of_freedom as f64,
    );
    Some(Measured::with_line(fit.slope, line))
}

/// Greatest less least smoothed average, W, the noise left in one, and how many of them are independent.
fn extremes(averages: &[(f64, f64)], noise: f64) -> (f64, f64, f64) {
    let mut values: Vec<f64> = averages.iter().map(|average| average.1).collect();
    let (mut left, mut independent) = (noise, values.len() as f64);
    let half = (values.len() / SMOOTHED_PART).max(LEAST_SMOOTHED) / 2;
    let length = 2 * half + 1;
    // Short windows are left as they are: a parabola over a good part of them would take ripple for noise.
    if values.len() >= 2 * SMOOTHED_PART
        && let Some(smooth) = SavitzkyGolay::new(half, 2, 0).and_then(|filter| filter.apply(&values))
    {
        // The ends hang on one side alone and are twice as noisy: a fortieth of the window at either.
        values = smooth.get(half..smooth.len().saturating_sub(half)).unwrap_or(&smooth).to_vec();
        left = noise * (2.25 / length as f64).sqrt();
        independent = (2.0 * independent / length as f64).max(2.0);
    }
    let highest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let lowest = values.iter().copied().fold(f64::INFINITY, f64::min);
    (highest - lowest, left, independent)
}

/// (mean time, mean power) of each second of the window that has readings.
fn averages(glimpses: &[Glimpse], (from, to): (f64, f64)) -> Vec<(f64, f64)> {
    let readings: Vec<(f64, f64)> = glimpses
        .iter()
        .filter(|g| g.at >= from && g.at <= to)
        .filter_map(|g| Some((g.at, g.power.filter(|p| p.is_finite())?)))
        .collect();
    readings
        .chunk_by(|a, b| ((a.0 - from) / AVERAGE).floor() == ((b.0 - from) / AVERAGE).floor())
        .map(|second| {
            let n = second.len() as f64;
            (second.iter().map(|r| r.0).sum::<f64>() / n, second.iter().map(|r| r.1).sum::<f64>() / n)
        })
        .collect()
}

/// Mean over time: each average stands for half the way to its neighbours, and to the ends of the window.
fn time_mean(averages: &[(f64, f64)], (from, to): (f64, f64)) -> f64 {
    let last = averages.len() - 1;
    let (mut sum, mut time) = (0.0, 0.0);
    for (i, (at, power)) in averages.iter().enumerate() {
        let left = if i == 0 { from } else { 0.5 * (averages[i - 1].0 + at) };
        let right = if i == last { to } else { 0.5 * (at + averages[i + 1].0) };
        sum += power * (right - left);
        time += right - left;
    }
    sum / time
}

fn noise(averages: &[(f64, f64)]) -> f64 {
    // √1.5: a value less the mean of its two neighbours.
    let off: Vec<f64> = averages.windows(3).map(|w| (w[1].1 - 0.5 * (w[0].1 + w[2].1)).abs() / 1.5f64.sqrt()).collect();
    NORMAL_SD_PER_MAD * median(&off).unwrap_or(0.0)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::behaviour::synthetic::Noise;

    fn glimpses(seed: u64, u: f64, power: impl Fn(f64) -> f64) -> Vec<Glimpse> {
        let mut noise = Noise(seed);
        (0..600)
            .map(|i| f64::from(i) * 0.5)
            .map(|at| Glimpse { at, power: Some(power(at) + u * noise.normal()), ..Glimpse::default() })
            .collect()
    }

    #[test]
    fn mean_and_ripple_of_a_known_wave() {
        // One cycle a minute, 5 % from least to greatest, 0.2 % noise.
        let wave = |at: f64| 1e-3 * (1.0 + 0.025 * (at / 60.0 * std::f64::consts::TAU).sin());
        let power = cycle_power(&glimpses(1, 2e-6, wave), (60.0, 240.0)).unwrap();
        // Three whole cycles: the mean of the wave is 1 mW; 4 u.
        assert!((power.mean.value - 1e-3).abs() < 4.0 * power.mean.u(), "{power:?}");
        // Two captures a second: averages have 0.14 % noise, a third of it once smoothed; what extremes add is taken off.
        assert!((power.ripple.value - 0.05).abs() < 3.0 * power.ripple.u() && power.ripple.u() < 1.5e-3, "{power:?}");
    }

    #[test]
    fn noise_alone_is_hardly_ripple() {
        // 1 % noise makes 0.7 % an average and, smoothed, 2 % of apparent ripple over 180; what stays is within three of
        // its own u.
        for seed in 1..=20 {
            let power = cycle_power(&glimpses(seed, 1e-5, |_| 1e-3), (60.0, 240.0)).unwrap();
            assert!(power.ripple.value < 3.0 * power.ripple.u() && power.ripple_floor > 0.015, "{power:?}");
        }
    }

    #[test]
    fn a_small_ripple_is_free_of_the_meters_noise_within_its_uncertainty() {
        // 0.8 % from least to greatest in a triangle of 200 s, as four modes show it; 0.16 % noise a reading.
        let triangle = |at: f64| 1e-3 * (1.0 + 0.016 * ((at / 200.0).rem_euclid(1.0) - 0.5).abs());
        let pulls: Vec<f64> = (1..=40)
            .map(|seed| cycle_power(&glimpses(seed, 1.6e-6, triangle), (0.0, 299.0)).unwrap().ripple)
            .map(|ripple| (ripple.value - 0.008 / 1.004) / ripple.u())
            .collect();
        // Of 40, 4.6 % beyond two: five or more has a chance of 4 %, so six are allowed. A triangle is the worst: its peaks
        // are rounded, and few values compete for them; that bias must stay within the doubt that is stated.
        assert!(pulls.iter().filter(|pull| pull.abs() > 2.0).count() <= 6, "{pulls:?}");
        let mean = pulls.iter().sum::<f64>() / 40.0;
        assert!(mean.abs() < 1.2, "{mean}");
    }

    #[test]
    fn drift_of_a_known_slope() {
        let cycles: Vec<(f64, f64)> = (0..4).map(|i| (f64::from(i) * 60.0, f64::from(i + 1) * 60.0)).collect();
        // 3 % an hour.
        let slope = 0.03 / 3600.0;
        let drift = power_drift(&glimpses(3, 1e-6, |at| 1e-3 * (1.0 + slope * at)), &cycles).unwrap();
        assert!((drift.value - slope).abs() < 4.0 * drift.u(), "{drift:?}");
        assert_eq!(power_drift(&[], &cycles), None);
    }

    #[test]
    fn too_little_or_no_light_gives_nothing() {
        assert_eq!(cycle_power(&[], (0.0, 10.0)), None);
        assert_eq!(cycle_power(&glimpses(1, 0.0, |_| 0.0), (0.0, 100.0)), None);
        assert_eq!(cycle_power(&glimpses(1, 0.0, |_| 1.0), (0.0, 3.0)), None);
        assert_eq!(cycle_power(&glimpses(1, 0.0, |_| 1.0), (f64::NAN, 3.0)), None);
    }
}
