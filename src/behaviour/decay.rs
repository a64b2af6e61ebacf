//! Fits the walk of a warming tube, N(t) = C − A·exp(−t/τ) − A_f·exp(−t/τ_f), and says how much walk is left.
//! Must not unwrap phases or decide when a dwell ends.
//! Main type: [`Decay`].

use statrs::distribution::{ContinuousCDF, FisherSnedecor};

pub(crate) use super::trial::WalkPoint;
use super::trial::{Bin, Trial, correlation_factor, gather, minimize, polished, tangent, trial, with_fast_part};
use crate::numerics::distributions::student_t_quantile;

/// Fewest bins to fit.
const LEAST_BINS: usize = 8;

/// A fast part is kept only where an F-test calls it significant at this level.
const FAST_LEVEL: f64 = 1e-3;

/// Time constants tried, per fit: from 1/20 of the time seen to 60 times.
const SLOW_STEPS: usize = 28;

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
    /// 1. Gather the points in bins. 2. Variable projection: for each trial τ the offset and amplitudes are a weighted
    ///    linear fit; the sum of squares is then searched over τ, by grid, golden section and Gauss-Newton (Golub &
    ///    Pereyra 1973).
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
        let single = polished(&bins, minimize(&grid, 6, |tau| trial(&bins, tau, None))?, true, 8);
        // A slow part far beyond the time seen cannot be told from a straight line.
        let slow: Vec<f64> = grid.iter().copied().chain([single.tau]).filter(|tau| *tau < 10.0 * span).collect();
        let double = if bins.len() < LEAST_BINS + 4 { None } else { with_fast_part(&bins, &slow) };
        let best = match double {
            Some(double) if is_significant(&single, &double) => double,
            _ => single,
        };
        Self::account(best, &bins, &grid)
    }

    fn account(best: Trial, bins: &[Bin], grid: &[f64]) -> Option<Self> {
        let fit = tangent(&best, bins, true)?;
        let (covariance, columns) = (fit.covariance, fit.coefficients.len());
        let dof = (bins.len() as f64 - columns as f64).max(1.0);
        let inflation = (best.fit.sum_of_squares / dof).max(1.0) * correlation_factor(&best, bins);
        let u_ln_tau = (covariance[2 * columns + 2] * inflation).sqrt() / best.tau;
        let reach = if u_ln_tau.is_finite() { u_ln_tau.clamp(1e-6, 1.0) } else { 1.0 };
        let mut taus: Vec<f64> =
            (1..=12).flat_map(|k| [-1.0, 1.0].map(|s| best.tau * (s * 0.3 * f64::from(k) * reach).exp())).collect();
        if reach > 0.1 {
            // The tangent is no guide here: look everywhere.
            taus.extend(grid);
        }
        // The fast part follows τ from one trial to the next.
        let follow = |tau: f64| {
            let start = trial(bins, tau, best.fast_tau)?;
            Some(if best.fast_tau.is_some() { polished(bins, start, false, 3) } else { start })
        };
        let mut around: Vec<Trial> =
            taus.into_iter().filter(|tau| best.fast_tau.is_none_or(|f| f < *tau)).filter_map(follow).collect();
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

    /// Upper bound of that walk at one-sided 95 %: the greatest value among all (A, τ) whose sum of squares lies within
    /// t² of the least (profile likelihood), so that a τ known badly to one side is not hidden by a tangent; the form
    /// of the model adds its share.
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

/// Shift of τ when the first fifth of the bins is left out, as a standard uncertainty (limits of a rectangle).
///
/// A walk that is not quite of the form fitted gives another τ there; noise does too, so the shift is never too small.
fn form_error(best: &Trial, bins: &[Bin], grid: &[f64]) -> f64 {
    let late = &bins[bins.len() / 5..];
    let again = match best.fast_tau {
        // The fast part is over by then, or nearly: its time constant is kept.
        Some(fast) => minimize(grid, 16, |tau| trial(late, tau, Some(fast).filter(|f| *f < 0.9 * tau))),
        None => None,
    };
    let again = again.or_else(|| minimize(grid, 16, |tau| trial(late, tau, None)));
    again.map_or(0.0, |again| (again.tau - best.tau).abs() / 3f64.sqrt())
}
