//! Whether a tube that burns already is at rest: how far its comb may still walk, from a short look at it.
//! Must not assume that its warm-up was seen.
//! Main function: [`rest`].

use crate::numerics::{distributions::student_t_quantile, linear::weighted};

/// What a short look says on the walk to come.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Rest {
    /// Rate at the last point, mode spacings a second.
    pub rate: f64,
    /// Its standard uncertainty.
    pub u_rate: f64,
    /// Upper 95 % bound on the size of the rate.
    pub rate_upper: f64,
    /// Upper 95 % bound on the walk over the horizon, mode spacings.
    pub upper: f64,
}

/// Predicts the walk of a tube whose warm-up was not seen.
///
/// * `points`: (s, mode spacings walked), all that were seen, in the order of time.
/// * `look`: the last stretch of them that is extrapolated, s.
/// * `horizon`: s from the last point on.
///
/// None before `look` is over, and for fewer than five points or points at fewer than three times in it.
///
/// # Method
/// 1. Fit a parabola to the look, time counted from the last point: walked = a + b·t + c·t².
/// 2. The walk over the horizon h is taken as the larger of |b|·h and |b·h + c·h²|. A rate that falls, as in every
///    warm-up, is thus not trusted to go on falling; one that grows, or is only just turning (a draught), shows in c.
/// 3. Add the one-sided 95 % point of Student's t times the standard uncertainty of b·h + c·h², by the scatter found.
/// 4. Add the greatest less the least departure from the parabola, and what the walk turned back over the last horizon:
///    a tube that warms up grows, and only a draught turns it back; what wandered may wander again.
///
/// A draught twice as slow as the horizon is still seen for what it is; one of four horizons looks like a tube at rest that
/// walks a little (tests below).
pub fn rest(points: &[(f64, f64)], look: f64, horizon: f64) -> Option<Rest> {
    let (last, _) = *points.last()?;
    let since = |time: f64| points.get(points.partition_point(|point| point.0 < time)..).unwrap_or(&[]);
    let back = turned_back(since(last - horizon));
    // The whole look must have been seen, else its length proves nothing.
    let is_over = points.first().is_some_and(|first| first.0 <= last - look);
    let points = since(last - look);
    if points.len() < 5 || !is_over {
        return None;
    }
    let design: Vec<f64> = points.iter().flat_map(|(at, _)| [1.0, at - last, (at - last).powi(2)]).collect();
    let walked: Vec<f64> = points.iter().map(|point| point.1).collect();
    let fit = weighted(&design, &walked, &vec![1.0; points.len()]).ok()?;
    let [a, b, c] = *fit.coefficients.as_slice() else { return None };
    let scatter = fit.reduced_chi_square()?;
    let covariance = |i: usize, j: usize| fit.covariance.get(3 * i + j).copied().unwrap_or(f64::NAN) * scatter;
    let h = horizon;
    let variance = h.powi(2) * covariance(1, 1) + 2.0 * h.powi(3) * covariance(1, 2) + h.powi(4) * covariance(2, 2);
    let departures = points.iter().map(|(at, walked)| walked - (a + b * (at - last) + c * (at - last).powi(2)));
    let (least, greatest) =
        departures.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), d| (low.min(d), high.max(d)));
    let t95 = student_t_quantile(0.95, fit.degrees_of_freedom as f64).unwrap_or(1.645);
    let expected = (b * h).abs().max((b * h + c * h * h).abs());
    let upper = expected + t95 * variance.max(0.0).sqrt() + (greatest - least) + back;
    let u_rate = covariance(1, 1).max(0.0).sqrt();
    let rest = Rest { rate: b, u_rate, rate_upper: b.abs() + t95 * u_rate, upper };
    [rest.rate, rest.u_rate, rest.upper].iter().all(|x| x.is_finite()).then_some(rest)
}

/// How far a walk turned back on its way, mode spacings: the lesser of its greatest fall and its greatest rise.
fn turned_back(points: &[(f64, f64)]) -> f64 {
    let against = |sign: f64| {
        let step = |(most, back): (f64, f64), walked: f64| (most.max(walked), back.max(most - walked));
        points.iter().map(|point| sign * point.1).fold((f64::NEG_INFINITY, 0.0), step).1
    };
    against(1.0).min(against(-1.0))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// A look of `seconds`, twice a second, at a walk, with 3 thousandths of a spacing of ripple (3 MHz of 1 GHz).
    fn look(from: f64, seconds: f64, walk: impl Fn(f64) -> f64) -> Vec<(f64, f64)> {
        let n = (2.0 * seconds) as usize;
        let at = |k: usize| from + 0.5 * k as f64;
        (0..=n).map(|k| (at(k), walk(at(k)) + 0.003 * (k as f64 * 2.4).sin())).collect()
    }

    /// A warm-up: 58 spacings, 6.3 min.
    fn warmup(t: f64) -> f64 {
        -58.0 * (-t / 378.0_f64).exp_m1()
    }

    #[test]
    fn a_warm_tube_is_at_rest_and_the_bound_holds_what_comes() {
        for minutes in [20.0, 25.0, 40.0, 300.0] {
            let from = minutes * 60.0;
            let found = rest(&look(from, 120.0, warmup), 120.0, 600.0).unwrap();
            let comes = warmup(from + 720.0) - warmup(from + 120.0);
            assert!(found.upper > comes, "{minutes} min: {found:?}, comes {comes}");
            // Two spacings in ten minutes are reached at about 24 minutes: 58/378·e^(−t/τ)·600 = 2.
            assert_eq!(found.upper < 2.0, minutes > 22.0, "{minutes} min: {found:?}");
        }
    }

    /// The wandering of the model's draught: two sines, the periods of which are no whole multiples.
    fn draught(amplitude: f64, turn: f64) -> f64 {
        amplitude * (0.7 * turn.sin() + 0.3 * (turn * 2.618).sin())
    }

    #[test]
    fn a_draught_is_no_rest_however_often_one_looks_within_an_hour() {
        for (amplitude, period) in [(6.0, 540.0), (3.0, 540.0), (6.0, 60.0), (3.0, 1200.0)] {
            for phase in 0..12 {
                let phase = f64::from(phase) * 0.6;
                let walk = |t: f64| draught(amplitude, std::f64::consts::TAU * t / period + phase);
                // As thinly as a dwell of an hour is kept: 240 points.
                let seen: Vec<(f64, f64)> = look(0.0, 3600.0, walk).into_iter().step_by(30).collect();
                let at_rest =
                    (5..=seen.len()).find(|n| rest(&seen[..*n], 120.0, 600.0).is_some_and(|found| found.upper < 2.0));
                assert_eq!(at_rest, None, "{amplitude} in {period} s from phase {phase}");
            }
        }
    }

    #[test]
    fn what_turned_back_is_the_lesser_way() {
        let walk = |walked: &[f64]| turned_back(&walked.iter().map(|w| (0.0, *w)).collect::<Vec<_>>());
        assert_eq!(walk(&[0.0, 1.0, 3.0]), 0.0);
        assert_eq!(walk(&[0.0, 3.0, 1.0, 4.0]), 2.0);
        assert_eq!(walk(&[0.0, -3.0, -1.0, -4.0]), 2.0);
        assert_eq!(walk(&[]), 0.0);
    }

    #[test]
    fn too_little_says_nothing() {
        assert_eq!(rest(&[], 120.0, 600.0), None);
        assert_eq!(rest(&[(1.0, 0.0); 4], 0.0, 600.0), None);
        assert_eq!(rest(&[(1.0, 0.0); 9], 0.0, 600.0), None, "all at one time");
        assert_eq!(rest(&look(0.0, 60.0, |_| f64::NAN), 60.0, 600.0), None);
        assert_eq!(rest(&look(0.0, 60.0, warmup), 61.0, 600.0), None, "the look is not over");
    }
}
