//! Trials of the model N(t) = C − A·exp(−t/τ) − A_f·exp(−t/τ_f) against binned walk, and the search for the best.
//! Must not say what a fit means: that is [`super::decay`]'s.
//! Main types: [`Bin`], [`Trial`].

use crate::numerics::linear::{self, LinearFit};

/// Bins that the points are gathered in: what a fit costs does not grow with the length of the warm-up.
const BINS: usize = 96;

/// Ratios τ_f/τ tried at first.
const FAST_RATIOS: [f64; 7] = [0.02, 0.035, 0.06, 0.1, 0.17, 0.28, 0.42];

/// Trials that are polished.
const STARTS: usize = 3;

/// One observation of the walk.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct WalkPoint {
    /// Seconds since first light.
    pub at: f64,
    /// Spacings walked.
    pub walked: f64,
    /// Its standard uncertainty.
    pub u: f64,
}

/// A bin of neighbouring observations.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Bin {
    /// Mean time, s.
    pub at: f64,
    /// Variance of the times in it: the mean of exp(−t/τ) is exp(−t̄/τ)·(1 + var/2τ²) to second order.
    spread: f64,
    walked: f64,
    weight: f64,
}

impl Bin {
    fn exponential(&self, tau: f64) -> f64 {
        (-self.at / tau).exp() * (1.0 + 0.5 * self.spread / (tau * tau))
    }
}

/// Time constants of a trial and the best linear coefficients that go with them.
#[derive(Debug, Clone)]
pub(crate) struct Trial {
    /// Time constant, s.
    pub tau: f64,
    /// That of the fast part.
    pub fast_tau: Option<f64>,
    /// C, A, A_f.
    pub fit: LinearFit,
}

impl Trial {
    /// Both amplitudes are positive.
    pub fn grows(&self) -> bool {
        self.amplitude() > 0.0 && (self.fast_tau.is_none() || self.fast_amplitude() > 0.0)
    }

    /// A, spacings.
    pub fn amplitude(&self) -> f64 {
        self.fit.coefficients[1]
    }

    /// A_f, spacings; 0 without a fast part.
    pub fn fast_amplitude(&self) -> f64 {
        self.fit.coefficients.get(2).copied().unwrap_or(0.0)
    }

    /// Walk expected between `at` and `at + horizon`, and its sensitivity to A.
    pub fn residual(&self, at: f64, horizon: f64) -> (f64, f64) {
        let left = |tau: f64| (-at / tau).exp() * -(-horizon / tau).exp_m1();
        let slope = left(self.tau);
        let fast = self.fast_tau.map_or(0.0, |tau| self.fast_amplitude() * left(tau));
        (self.amplitude() * slope + fast, slope)
    }
}

/// Bins of equal numbers of observations, weighted by 1/u².
pub(crate) fn gather(points: &[WalkPoint]) -> Vec<Bin> {
    let usable: Vec<&WalkPoint> =
        points.iter().filter(|p| p.at.is_finite() && p.walked.is_finite() && p.u.is_finite() && p.u > 0.0).collect();
    let size = usable.len().div_ceil(BINS).max(1);
    usable
        .chunks(size)
        .map(|chunk| {
            let weight: f64 = chunk.iter().map(|p| p.u.powi(-2)).sum();
            let mean = |f: &dyn Fn(&WalkPoint) -> f64| chunk.iter().map(|p| f(p) * p.u.powi(-2)).sum::<f64>() / weight;
            let at = mean(&|p| p.at);
            Bin { at, spread: mean(&|p| (p.at - at).powi(2)), walked: mean(&|p| p.walked), weight: weight.sqrt() }
        })
        .collect()
}

fn solve(bins: &[Bin], rows: impl Fn(&Bin) -> Vec<f64>) -> Option<LinearFit> {
    let design: Vec<f64> = bins.iter().flat_map(rows).collect();
    let values: Vec<f64> = bins.iter().map(|b| b.walked).collect();
    let weights: Vec<f64> = bins.iter().map(|b| b.weight).collect();
    linear::weighted(&design, &values, &weights).ok()
}

/// Best offset and amplitudes for given time constants.
pub(crate) fn trial(bins: &[Bin], tau: f64, fast_tau: Option<f64>) -> Option<Trial> {
    let fit = solve(bins, |b| match fast_tau {
        Some(fast) => vec![1.0, -b.exponential(tau), -b.exponential(fast)],
        None => vec![1.0, -b.exponential(tau)],
    })?;
    Some(Trial { tau, fast_tau, fit })
}

/// Best trial over a grid of positive numbers, refined by golden section on the logarithm.
pub(crate) fn minimize(grid: &[f64], rounds: usize, at: impl Fn(f64) -> Option<Trial>) -> Option<Trial> {
    const GOLDEN: f64 = 0.618_033_988_749_894_9;
    let cost = |t: &Option<Trial>| t.as_ref().map_or(f64::INFINITY, |t| t.fit.sum_of_squares);
    let trials: Vec<Option<Trial>> = grid.iter().map(|x| at(*x)).collect();
    let (place, _) = trials.iter().enumerate().min_by(|a, b| cost(a.1).total_cmp(&cost(b.1)))?;
    let mut best = trials[place].clone()?;
    let mut low = grid[place.saturating_sub(1)].ln();
    let mut high = grid[(place + 1).min(grid.len() - 1)].ln();
    let (mut left, mut right) = (high - GOLDEN * (high - low), low + GOLDEN * (high - low));
    let (mut at_left, mut at_right) = (at(left.exp()), at(right.exp()));
    for _ in 0..rounds {
        if cost(&at_left) < cost(&at_right) {
            high = right;
            (right, at_right) = (left, at_left);
            left = high - GOLDEN * (high - low);
            at_left = at(left.exp());
        } else {
            low = left;
            (left, at_left) = (right, at_right);
            right = low + GOLDEN * (high - low);
            at_right = at(right.exp());
        }
    }
    for candidate in [at_left, at_right].into_iter().flatten() {
        if candidate.fit.sum_of_squares < best.fit.sum_of_squares {
            best = candidate;
        }
    }
    Some(best)
}

/// Best trial with a fast part: a grid of both time constants, the best few of it polished. Both amplitudes must be
/// positive, as a warming tube grows.
///
/// * `slow`: time constants tried. The one of the best fit without a fast part belongs among them: it is near enough.
///
/// One start is not enough: two slow parts of like time constants imitate a slow and a fast one, and on a coarse grid
/// they may be the better at first.
pub(crate) fn with_fast_part(bins: &[Bin], slow: &[f64]) -> Option<Trial> {
    let by_cost = |a: &Trial, b: &Trial| a.fit.sum_of_squares.total_cmp(&b.fit.sum_of_squares);
    let starts = slow.iter().flat_map(|tau| FAST_RATIOS.map(|ratio| trial(bins, *tau, Some(ratio * tau))));
    let mut starts: Vec<Trial> = starts.flatten().filter(Trial::grows).collect();
    starts.sort_by(by_cost);
    starts.truncate(STARTS);
    starts.into_iter().map(|start| polished(bins, start, true, 12)).filter(Trial::grows).min_by(by_cost)
}

/// Gauss-Newton steps on the time constants from a trial near the best: τ and τ_f, or τ_f alone with τ held.
pub(crate) fn polished(bins: &[Bin], start: Trial, free_tau: bool, rounds: usize) -> Trial {
    let mut best = start;
    for _ in 0..rounds {
        let Some(step) = tangent(&best, bins, free_tau) else { return best };
        let by_tau = if free_tau { step.coefficients[2] } else { 0.0 };
        let by_fast = if best.fast_tau.is_some() { step.coefficients.last().copied().unwrap_or(0.0) } else { 0.0 };
        let better = [1.0, 0.4, 0.1].into_iter().find_map(|share| {
            // At most half as much again or a third less: the tangent is no guide farther away.
            let moved = |tau: f64, by: f64| tau * (1.0 + share * by / tau).clamp(0.67, 1.5);
            let fast = best.fast_tau.map(|fast| moved(fast, by_fast));
            trial(bins, moved(best.tau, by_tau), fast).filter(|t| {
                t.fit.sum_of_squares < best.fit.sum_of_squares && t.fast_tau.is_none_or(|f| f < 0.7 * t.tau)
            })
        });
        let Some(better) = better else { return best };
        let done = best.fit.sum_of_squares - better.fit.sum_of_squares < 1e-6 * better.fit.sum_of_squares;
        best = better;
        if done {
            return best;
        }
    }
    best
}

/// Linear fit by the tangent at a trial, columns (C, A[, δτ][, A_f, δτ_f]): its covariance, and the next step of a
/// search.
pub(crate) fn tangent(at: &Trial, bins: &[Bin], free_tau: bool) -> Option<LinearFit> {
    let by_tau = |b: &Bin, amplitude: f64, tau: f64| -amplitude * b.exponential(tau) * b.at / (tau * tau);
    solve(bins, |b| {
        let mut row = vec![1.0, -b.exponential(at.tau)];
        if free_tau {
            row.push(by_tau(b, at.amplitude(), at.tau));
        }
        if let Some(fast) = at.fast_tau {
            row.extend([-b.exponential(fast), by_tau(b, at.fast_amplitude(), fast)]);
        }
        row
    })
}

/// (1 + ρ)/(1 − ρ) with ρ the correlation of neighbouring weighted residuals, within [0, 0.95].
pub(crate) fn correlation_factor(best: &Trial, bins: &[Bin]) -> f64 {
    let residuals: Vec<f64> = bins
        .iter()
        .map(|b| {
            let fast = best.fast_tau.map_or(0.0, |tau| best.fast_amplitude() * b.exponential(tau));
            let model = best.fit.coefficients[0] - best.amplitude() * b.exponential(best.tau) - fast;
            (b.walked - model) * b.weight
        })
        .collect();
    let square: f64 = residuals.iter().map(|r| r * r).sum();
    if square <= 0.0 {
        return 1.0;
    }
    let lagged: f64 = residuals.windows(2).map(|w| w[0] * w[1]).sum();
    let rho = (lagged / square).clamp(0.0, 0.95);
    (1.0 + rho) / (1.0 - rho)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::super::decay::Decay;
    use super::*;

    /// Walk of a tube with a fast part, seen from 8 s on, every 100 ms for three minutes, then every 500 ms; a smooth
    /// waver of 0.01 spacings stands for the interferometer.
    fn walk(tau: f64, fast_tau: f64, end: f64) -> Vec<WalkPoint> {
        let time = |k: u32| if k < 1800 { 0.1 * f64::from(k) } else { 180.0 + 0.5 * f64::from(k - 1800) };
        let walked = |t: f64| 150.0 * -(-t / tau).exp_m1() + 4.0 * -(-t / fast_tau).exp_m1() + 0.01 * (t / 90.0).sin();
        let times = (80..).map(time).take_while(|t| *t <= end);
        times.map(|at| WalkPoint { at, walked: walked(at), u: 1e-3 }).collect()
    }

    #[test]
    fn both_parts_are_found_wherever_the_walk_is_cut() {
        // A search that depends on where the grid of trials falls misses at some ends and not at others.
        for (tau, fast_tau) in [(600.0, 60.0), (500.0, 40.0), (380.0, 30.0)] {
            for step in 0..60 {
                let end = tau * (2.0 + 0.04 * f64::from(step));
                let found = Decay::fit(&walk(tau, fast_tau, end)).unwrap();
                // The waver moves τ by under 1 % at these lengths.
                assert!((found.tau() / tau - 1.0).abs() < 0.02, "τ {tau} s, cut at {end} s: {} s", found.tau());
                assert!(found.fast_part().is_some_and(|(fast, _)| (fast / fast_tau - 1.0).abs() < 0.5));
            }
        }
    }
}
