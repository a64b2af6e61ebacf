//! Fits the walk of a warming tube, N(t) = C − A·exp(−t/τ) − A_f·exp(−t/τ_f), and says how much walk is left.
//! Must not unwrap phases or decide when a dwell ends.
//! Main type: [`Decay`].

use statrs::distribution::{ContinuousCDF, FisherSnedecor};

use crate::numerics::distributions::student_t_quantile;
use crate::numerics::linear::{self, LinearFit};

/// Bins that the points are gathered in: what a fit costs does not grow with the length of the warm-up.
const BINS: usize = 96;

/// Fewest bins to fit.
const LEAST_BINS: usize = 8;

/// A fast part is kept only where an F-test calls it significant at this level.
const FAST_LEVEL: f64 = 1e-3;

/// Time constants tried, per fit: from 1/20 of the time seen to 60 times.
const SLOW_STEPS: usize = 28;

/// Ratios τ_f/τ tried at first.
const FAST_RATIOS: [f64; 7] = [0.02, 0.035, 0.06, 0.1, 0.17, 0.28, 0.42];

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
struct Bin {
    at: f64,
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
struct Trial {
    tau: f64,
    fast_tau: Option<f64>,
    /// C, A, A_f.
    fit: LinearFit,
}

impl Trial {
    fn amplitude(&self) -> f64 {
        self.fit.coefficients[1]
    }

    fn fast_amplitude(&self) -> f64 {
        self.fit.coefficients.get(2).copied().unwrap_or(0.0)
    }

    /// Walk expected between `at` and `at + horizon`, and its sensitivity to A.
    fn residual(&self, at: f64, horizon: f64) -> (f64, f64) {
        let left = |tau: f64| (-at / tau).exp() * -(-horizon / tau).exp_m1();
        let slope = left(self.tau);
        let fast = self.fast_tau.map_or(0.0, |tau| self.fast_amplitude() * left(tau));
        (self.amplitude() * slope + fast, slope)
    }
}

/// The fitted walk.
#[derive(Debug, Clone)]
pub(crate) struct Decay {
    best: Trial,
    /// Trials around the best one, for bounds that do not trust the tangent.
    around: Vec<Trial>,
    /// Covariance of (C, A, τ[, A_f, τ_f]) as stated by the weights, by row.
    covariance: Vec<f64>,
    columns: usize,
    /// Standard uncertainty of τ from the form of the model, s: how far τ moves without the first fifth of the points.
    pub u_form: f64,
    /// Factor on every variance: reduced chi-square above 1, times the correlation between neighbouring residuals.
    pub inflation: f64,
    /// Degrees of freedom.
    pub dof: f64,
    /// One-sided 95 % point of Student's t for them.
    t95: f64,
}

impl Decay {
    /// Fits the walk, or `None` where the points do not allow it.
    ///
    /// # Method
    /// 1. Gather the points in bins. 2. Variable projection: for each trial τ the offset and amplitudes are a weighted linear
    ///    fit; the sum of squares is then searched over τ, by grid and golden section (Golub & Pereyra 1973).
    /// 3. The same with a fast part, kept where it passes an F-test at 0.1 %.
    /// 4. Variances times max(1, reduced χ²) times (1 + ρ)/(1 − ρ), ρ the correlation of neighbouring residuals.
    pub fn fit(points: &[WalkPoint]) -> Option<Self> {
        let bins = gather(points);
        if bins.len() < LEAST_BINS {
            return None;
        }
        let end = bins.last()?.at;
        let span = end - bins.first()?.at;
        if span <= 0.0 {
            return None;
        }
        let grid: Vec<f64> =
            (0..SLOW_STEPS).map(|k| span / 20.0 * 1200f64.powf(k as f64 / (SLOW_STEPS - 1) as f64)).collect();
        let single = minimize(&grid, 24, |tau| trial(&bins, tau, None))?;
        let double = with_fast_part(&bins, &grid, span);
        let best = match double {
            Some(double) if is_significant(&single, &double) => double,
            _ => single,
        };
        Self::account(best, &bins, &grid)
    }

    fn account(best: Trial, bins: &[Bin], grid: &[f64]) -> Option<Self> {
        let (covariance, columns) = tangent(&best, bins)?;
        let dof = (bins.len() as f64 - columns as f64).max(1.0);
        let inflation = (best.fit.sum_of_squares / dof).max(1.0) * correlation_factor(&best, bins);
        let u_ln_tau = (covariance[2 * columns + 2] * inflation).sqrt() / best.tau;
        let mut taus: Vec<f64> = grid.to_vec();
        let reach = if u_ln_tau.is_finite() { u_ln_tau.clamp(1e-6, 1.0) } else { 1.0 };
        taus.extend((1..=10).flat_map(|k| [-1.0, 1.0].map(|s| best.tau * (s * 0.3 * f64::from(k) * reach).exp())));
        let mut around: Vec<Trial> = taus
            .into_iter()
            .filter_map(|tau| match best.fast_tau {
                Some(fast) => best_fast(bins, tau, &[fast / tau * 0.7, fast / tau, fast / tau * 1.4], 6),
                None => trial(bins, tau, None),
            })
            .collect();
        around.push(best.clone());
        let t95 = student_t_quantile(0.95, dof).unwrap_or(1.645);
        let u_form = form_error(&best, bins, grid);
        Some(Self { best, around, covariance, columns, u_form, inflation, dof, t95 })
    }

    /// Time constant of the slow part, s.
    pub fn tau(&self) -> f64 {
        self.best.tau
    }

    /// Its standard uncertainty, s.
    pub fn u_tau(&self) -> f64 {
        self.u_of(&self.gradient(0.0, 0.0, 1.0, 0.0))
    }

    /// Time constant and share of the fast part, where there is one.
    pub fn fast_part(&self) -> Option<(f64, f64)> {
        self.best.fast_tau.map(|tau| (tau, self.best.fast_amplitude() / self.n_infinity()))
    }

    /// Whole walk from first light, spacings.
    pub fn n_infinity(&self) -> f64 {
        self.best.amplitude() + self.best.fast_amplitude()
    }

    /// Its standard uncertainty.
    pub fn u_n_infinity(&self) -> f64 {
        self.u_of(&self.gradient(0.0, 1.0, 0.0, 1.0))
    }

    /// What to add to the observations so that they count from first light, and its standard uncertainty.
    pub fn origin(&self) -> (f64, f64) {
        let value = self.n_infinity() - self.best.fit.coefficients[0];
        (value, self.u_of(&self.gradient(-1.0, 1.0, 0.0, 1.0)))
    }

    /// Walk from first light to `at`.
    pub fn walked(&self, at: f64) -> f64 {
        let part = |n: f64, tau: f64| n * -(-at / tau).exp_m1();
        let fast = self.best.fast_tau.map_or(0.0, |tau| part(self.best.fast_amplitude(), tau));
        part(self.best.amplitude(), self.best.tau) + fast
    }

    /// Rate of walk at `at`, spacings per second, and its standard uncertainty.
    pub fn rate(&self, at: f64) -> (f64, f64) {
        let (a, tau) = (self.best.amplitude(), self.best.tau);
        let e = (-at / tau).exp() / tau;
        let fast = self.best.fast_tau.map_or(0.0, |tau| (-at / tau).exp() / tau);
        let by_tau = a * e * (at / tau - 1.0) / tau;
        (a * e + self.best.fast_amplitude() * fast, self.u_of(&self.gradient(0.0, e, by_tau, fast)))
    }

    /// Expected walk between `at` and `at + horizon`.
    pub fn residual(&self, at: f64, horizon: f64) -> f64 {
        self.best.residual(at, horizon).0
    }

    /// Upper bound of that walk at one-sided 95 %: the greatest value among all (A, τ) whose sum of squares lies within t² of
    /// the least (profile likelihood), so that a τ known badly to one side is not hidden by a tangent; the form of the model
    /// adds its share.
    pub fn residual_upper(&self, at: f64, horizon: f64) -> f64 {
        let allowed = self.t95().powi(2) * self.inflation;
        let expected = self.residual(at, horizon);
        let upper = self
            .around
            .iter()
            .filter_map(|trial| {
                let excess = trial.fit.sum_of_squares - self.best.fit.sum_of_squares;
                if excess > allowed {
                    return None;
                }
                let (value, slope) = trial.residual(at, horizon);
                let u_amplitude = trial.fit.standard_error_from_weights(1)?;
                Some(value + (allowed - excess.max(0.0)).sqrt() * u_amplitude * slope)
            })
            .fold(expected, f64::max);
        // d/dτ of exp(−t/τ)·(1 − exp(−h/τ)), by its logarithm.
        let tau = self.best.tau;
        let by_tau = expected * (at - horizon / (horizon / tau).exp_m1()) / (tau * tau);
        expected + (upper - expected).hypot(self.t95 * by_tau * self.u_form)
    }

    /// One-sided 95 % point of Student's t for this fit.
    pub fn t95(&self) -> f64 {
        self.t95
    }

    /// Earliest time at which `upper(at)` stays below `bound`; `None` if that lies beyond 60 time constants.
    pub fn time_below(&self, bound: f64, upper: impl Fn(&Self, f64) -> f64) -> Option<f64> {
        let (mut low, mut high) = (0.0, 60.0 * self.tau());
        if upper(self, low) < bound {
            return Some(0.0);
        }
        if upper(self, high) >= bound {
            return None;
        }
        // 60 halvings of 60 τ: far below a millisecond.
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if upper(self, middle) < bound { high = middle } else { low = middle }
        }
        Some(high)
    }

    fn gradient(&self, c: f64, a: f64, tau: f64, fast: f64) -> Vec<f64> {
        if self.columns == 5 { vec![c, a, tau, fast, 0.0] } else { vec![c, a, tau] }
    }

    fn u_of(&self, gradient: &[f64]) -> f64 {
        let n = self.columns;
        let variance: f64 = (0..n)
            .flat_map(|i| (0..n).map(move |j| (i, j)))
            .map(|(i, j)| gradient[i] * self.covariance[i * n + j] * gradient[j])
            .sum();
        (variance * self.inflation).max(0.0).sqrt()
    }
}

fn gather(points: &[WalkPoint]) -> Vec<Bin> {
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

fn trial(bins: &[Bin], tau: f64, fast_tau: Option<f64>) -> Option<Trial> {
    let fit = solve(bins, |b| match fast_tau {
        Some(fast) => vec![1.0, -b.exponential(tau), -b.exponential(fast)],
        None => vec![1.0, -b.exponential(tau)],
    })?;
    Some(Trial { tau, fast_tau, fit })
}

/// Best trial over a grid of positive numbers, refined by golden section on the logarithm.
fn minimize(grid: &[f64], rounds: usize, at: impl Fn(f64) -> Option<Trial>) -> Option<Trial> {
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

/// Best fast part for a given τ; both amplitudes must be positive: a warming tube grows.
fn best_fast(bins: &[Bin], tau: f64, ratios: &[f64], rounds: usize) -> Option<Trial> {
    let growing = |t: Trial| (t.amplitude() > 0.0 && t.fast_amplitude() > 0.0).then_some(t);
    minimize(ratios, rounds, |ratio| trial(bins, tau, Some(ratio * tau)).and_then(growing))
}

fn with_fast_part(bins: &[Bin], grid: &[f64], span: f64) -> Option<Trial> {
    if bins.len() < LEAST_BINS + 4 {
        return None;
    }
    // A fast part shorter than the time between bins cannot be seen, a slow one far beyond the time seen not be told.
    let slow: Vec<f64> = grid.iter().copied().filter(|tau| *tau < 10.0 * span).collect();
    let rough = minimize(&slow, 0, |tau| best_fast(bins, tau, &FAST_RATIOS, 0))?;
    let ratio = rough.fast_tau? / rough.tau;
    let near: Vec<f64> = [0.6, 0.75, 0.87, 1.0, 1.15, 1.33, 1.7].iter().map(|f| f * rough.tau).collect();
    minimize(&near, 12, |tau| {
        let ratio = ratio * rough.tau / tau;
        best_fast(bins, tau, &[ratio * 0.5, ratio * 0.7, ratio, ratio * 1.4, (ratio * 2.0).min(0.6)], 8)
    })
}

fn is_significant(single: &Trial, double: &Trial) -> bool {
    let dof = double.fit.degrees_of_freedom as f64 - 1.0;
    let gain = single.fit.sum_of_squares - double.fit.sum_of_squares;
    if dof < 2.0 || gain <= 0.0 {
        return false;
    }
    // Two more parameters. A sum of squares of exactly zero (no noise at all) makes any gain significant.
    let f = gain / 2.0 / (double.fit.sum_of_squares / dof).max(f64::MIN_POSITIVE);
    FisherSnedecor::new(2.0, dof).is_ok_and(|d| d.sf(f) < FAST_LEVEL)
}

/// Covariance by the tangent at the best trial, columns (C, A, τ[, A_f, τ_f]).
fn tangent(best: &Trial, bins: &[Bin]) -> Option<(Vec<f64>, usize)> {
    let by_tau = |b: &Bin, amplitude: f64, tau: f64| -amplitude * b.exponential(tau) * b.at / (tau * tau);
    let fit = solve(bins, |b| {
        let mut row = vec![1.0, -b.exponential(best.tau), by_tau(b, best.amplitude(), best.tau)];
        if let Some(fast) = best.fast_tau {
            row.extend([-b.exponential(fast), by_tau(b, best.fast_amplitude(), fast)]);
        }
        row
    })?;
    let columns = if best.fast_tau.is_some() { 5 } else { 3 };
    Some((fit.covariance, columns))
}

/// Shift of τ when the first fifth of the bins is left out, as a standard uncertainty (limits of a rectangle).
///
/// A walk that is not quite of the form fitted gives another τ there; noise does too, so the shift is never too small.
fn form_error(best: &Trial, bins: &[Bin], grid: &[f64]) -> f64 {
    let late = &bins[bins.len() / 5..];
    let again = match best.fast_tau {
        // The fast part is over by then, or nearly: its time constant is kept.
        Some(fast) => minimize(grid, 16, |tau| trial(late, tau, Some(fast).filter(|f| *f < 0.9 * tau))),
        None => minimize(grid, 16, |tau| trial(late, tau, None)),
    };
    again.map_or(0.0, |again| (again.tau - best.tau).abs() / 3f64.sqrt())
}

/// (1 + ρ)/(1 − ρ) with ρ the correlation of neighbouring weighted residuals, within [0, 0.95].
fn correlation_factor(best: &Trial, bins: &[Bin]) -> f64 {
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
