//! The damped iteration behind [`fit`].
//! Must not hold state between fits or know a particular model.
//! Main entry: [`fit`].

use super::{Fit, FitError, Model, Options, StopReason};
use crate::numerics::triangle::Triangle;

/// First damping, relative to the squared column lengths: nearly an undamped step, right for a fair start.
const FIRST_DAMPING: f64 = 1e-3;
/// First damping of the second attempt: the first steps follow the gradient and are short.
const CAUTIOUS_DAMPING: f64 = 1e3;
/// Up to this damping a step counts as undisturbed.
const LIGHT_DAMPING: f64 = 1e-3;
/// Beyond this damping a step is far below the rounding of the parameters.
const LARGEST_DAMPING: f64 = 1e30;
/// Keeps the damping a normal number.
const LEAST_DAMPING: f64 = 1e-30;
/// Smallest share of the expected reduction that makes a step acceptable.
const LEAST_GAIN: f64 = 1e-4;
/// Fraction of the sum of squares that may be rounding where residuals are tiny differences of large values.
const ROUNDING_OF_SUM: f64 = 1e-9;
/// Relative to the squared column lengths; far below any curvature that double precision can tell from none.
const TRACE_DAMPING: f64 = 1e-10;
/// A parameter is lost if its derivatives fell to this fraction of the largest met on the way.
const LOST: f64 = 1e-6;
/// Most undamped steps after convergence. Two or three do for small residuals; large residuals with strong curvature
/// (MGH09 of NIST StRD) need tens.
const POLISH_STEPS: usize = 40;
/// Polish steps must shrink by at least this factor; otherwise they are rounding.
const POLISH_SHRINK: f64 = 0.9;
/// A polish step below this fraction of the parameters changes nothing that is ever printed.
const POLISH_END: f64 = 1e-14;

/// Fits `model` by damped least squares from `start`.
///
/// * `start`: one value per parameter; values outside the bounds are moved onto them.
/// * Returns the account of the fit, also when it did not converge: look at [`Fit::stopped`].
///
/// # Errors
/// [`FitError`] if lengths or bounds are wrong, or nothing can be computed at the start. Never for a poor fit.
///
/// # Method
/// 1. QR-reduce the Jacobian `J` and the residuals `r`, so that no digits are lost by forming `JᵀJ`.
/// 2. Solve min |r + J·δ|² + λ·|D·δ|², `D` = the largest column lengths of `J` met so far; parameters pressed against
///    a bound are left out, the new point is clipped to the bounds.
/// 3. Compare the reduction with the expected one; accept, and scale λ by max(1/3, 1 − (2·gain − 1)³), or reject, and
///    raise λ.
/// 4. On convergence, polish with undamped steps as long as these shrink.
/// 5. If the model no longer depends on some parameter at the end (a long first step can carry it there), try again
///    from the start with heavy first damping, and return the better of the two.
///
/// Source: Levenberg 1944, Marquardt 1963; scaling as in Moré 1978; the rule for λ: Nielsen 1999 (all from memory).
///
/// ```
/// use tubewright::numerics::least_squares::{Model, Options, fit};
/// struct Decay { t: Vec<f64>, y: Vec<f64> }
/// impl Model for Decay {
///     fn n_parameters(&self) -> usize { 2 }
///     fn n_points(&self) -> usize { self.t.len() }
///     fn evaluate(&self, p: &[f64], residuals: &mut [f64], jacobian: Option<&mut [f64]>) {
///         for (i, r) in residuals.iter_mut().enumerate() { *r = p[0] * (-self.t[i] / p[1]).exp() - self.y[i]; }
///         if let Some(jacobian) = jacobian {
///             for (row, t) in jacobian.chunks_exact_mut(2).zip(&self.t) {
///                 row[0] = (-t / p[1]).exp();
///                 row[1] = p[0] * row[0] * t / (p[1] * p[1]);
///             }
///         }
///     }
/// }
/// let t: Vec<f64> = (0..20).map(f64::from).collect();
/// let y = t.iter().map(|t| 3.0 * (-t / 5.0).exp()).collect();
/// let found = fit(&Decay { t, y }, &[1.0, 2.0], &Options::default())?;
/// assert!((found.parameters[1] - 5.0).abs() < 1e-9);
/// # Ok::<(), tubewright::numerics::least_squares::FitError>(())
/// ```
pub fn fit(model: &dyn Model, start: &[f64], options: &Options) -> Result<Fit, FitError> {
    let (first, lost) = attempt(model, start, options, FIRST_DAMPING)?;
    if !lost {
        return Ok(first);
    }
    let left =
        Options { max_evaluations: options.max_evaluations.saturating_sub(first.evaluations), ..options.clone() };
    let (second, _) = attempt(model, start, &left, CAUTIOUS_DAMPING)?;
    let evaluations = first.evaluations + second.evaluations;
    let best = if second.sum_of_squares < first.sum_of_squares { second } else { first };
    Ok(Fit { evaluations, ..best })
}

fn attempt(model: &dyn Model, start: &[f64], options: &Options, first_damping: f64) -> Result<(Fit, bool), FitError> {
    let mut search = Search::begin(model, start, options)?;
    let stopped = search.descend(options, first_damping);
    if stopped.converged() {
        search.polish();
    }
    let lost = search.lost_a_parameter();
    Ok((search.account(stopped), lost))
}

/// The best point so far and all that is known there.
struct Search<'a> {
    model: &'a dyn Model,
    bounds: Vec<(f64, f64)>,
    parameters: Vec<f64>,
    residuals: Vec<f64>,
    cost: f64,
    triangle: Triangle,
    /// `D`: largest length of each column met so far.
    scale: Vec<f64>,
    evaluations: usize,
}

/// What became of one trial step.
enum Trial {
    Accepted { gain: f64, small_step: bool, small_change: bool },
    Rejected,
    AtRounding,
    NotFinite,
}

impl<'a> Search<'a> {
    fn begin(model: &'a dyn Model, start: &[f64], options: &Options) -> Result<Self, FitError> {
        let (n, m) = (model.n_parameters(), model.n_points());
        if n == 0 || start.len() != n {
            return Err(FitError::StartLength { found: start.len(), expected: n });
        }
        if m < n {
            return Err(FitError::TooFewPoints { points: m, parameters: n });
        }
        let bounds = checked_bounds(options.bounds.as_deref(), n)?;
        if start.iter().any(|x| !x.is_finite()) {
            return Err(FitError::NotFiniteAtStart);
        }
        let parameters = clipped(start, &bounds);
        let (mut residuals, mut jacobian) = (vec![0.0; m], vec![0.0; m * n]);
        model.evaluate(&parameters, &mut residuals, Some(&mut jacobian));
        let cost = sum_of_squares(&residuals);
        let triangle = Triangle::reduce(&jacobian, &residuals, n).filter(|_| cost.is_finite());
        let triangle = triangle.ok_or(FitError::NotFiniteAtStart)?;
        let scale = triangle.column_lengths();
        Ok(Self { model, bounds, parameters, residuals, cost, triangle, scale, evaluations: 1 })
    }

    /// Damped steps until a reason to stop appears.
    fn descend(&mut self, options: &Options, first_damping: f64) -> StopReason {
        let (mut damping, mut raise) = (first_damping, 2.0);
        loop {
            let free = self.free_to_move();
            if self.cost == 0.0 {
                return StopReason::ZeroResidual;
            }
            if free.is_empty() {
                return StopReason::AllAtBound;
            }
            if self.removable(&free) <= options.relative_cost_tolerance * self.cost {
                return StopReason::SmallCostChange;
            }
            if self.evaluations >= options.max_evaluations {
                return StopReason::MaxEvaluations;
            }
            match self.step(damping, &free, options) {
                Trial::Accepted { gain, small_step, small_change } => {
                    if small_step {
                        return StopReason::SmallStep;
                    }
                    if small_change {
                        return StopReason::SmallCostChange;
                    }
                    damping = (damping * (1.0 - (2.0 * gain - 1.0).powi(3)).max(1.0 / 3.0)).max(LEAST_DAMPING);
                    raise = 2.0;
                }
                Trial::Rejected => {
                    damping *= raise;
                    raise *= 2.0;
                    if damping.is_nan() || damping > LARGEST_DAMPING {
                        return StopReason::NoProgress;
                    }
                }
                Trial::AtRounding => return StopReason::SmallCostChange,
                Trial::NotFinite => return StopReason::NotFinite,
            }
        }
    }

    fn step(&mut self, damping: f64, free: &[usize], options: &Options) -> Trial {
        let Some(delta) = self.damped_step(damping, free) else { return Trial::Rejected };
        let (moved, whole) = self.within_bounds(&delta);
        let delta: Vec<f64> = moved.iter().zip(&self.parameters).map(|(new, old)| new - old).collect();
        let expected = self.triangle.expected_reduction(&delta);
        // A step cut short by a bound says nothing about convergence, nor does one shortened by damping.
        let telling = whole && damping <= LIGHT_DAMPING;
        if telling && expected <= f64::EPSILON * self.cost {
            return Trial::AtRounding;
        }
        let mut residuals = vec![0.0; self.residuals.len()];
        self.model.evaluate(&moved, &mut residuals, None);
        self.evaluations += 1;
        let cost = sum_of_squares(&residuals);
        let reduction = self.cost - cost;
        let gain = reduction / expected;
        let acceptable = cost.is_finite() && expected > 0.0 && reduction > 0.0 && gain >= LEAST_GAIN;
        if !acceptable {
            let hidden = ROUNDING_OF_SUM * self.cost;
            let at_rounding = telling && expected <= hidden && reduction.abs() <= hidden;
            return if at_rounding { Trial::AtRounding } else { Trial::Rejected };
        }
        let small_change = telling && reduction.max(expected) <= options.relative_cost_tolerance * self.cost;
        let small_step = telling && self.relative_length(&delta, &moved) <= options.relative_step_tolerance;
        if self.move_to(moved) { Trial::Accepted { gain, small_step, small_change } } else { Trial::NotFinite }
    }

    /// Where `delta` leads within the bounds, and whether it was left whole. Of clipping each parameter and stopping at the
    /// first bound met, the one that promises more: clipping is quick, but with correlated parameters may lead uphill.
    fn within_bounds(&self, delta: &[f64]) -> (Vec<f64>, bool) {
        let moved: Vec<f64> = self.parameters.iter().zip(delta).map(|(p, d)| p + d).collect();
        let cut = clipped(&moved, &self.bounds);
        if cut == moved {
            return (moved, true);
        }
        let room = |j: usize| {
            let (low, high) = self.bounds[j];
            let room = if delta[j] < 0.0 { low - self.parameters[j] } else { high - self.parameters[j] };
            if delta[j] == 0.0 { 1.0 } else { (room / delta[j]).min(1.0) }
        };
        let part = (0..delta.len()).map(room).fold(1.0, f64::min);
        // The parameter that stops the step lands on its bound exactly, not a rounding beside it.
        let stopped = |j: usize| if room(j) <= part { cut[j] } else { self.parameters[j] + part * delta[j] };
        let short: Vec<f64> = clipped(&(0..delta.len()).map(stopped).collect::<Vec<f64>>(), &self.bounds);
        let promise = |to: &[f64]| {
            let way: Vec<f64> = to.iter().zip(&self.parameters).map(|(new, old)| new - old).collect();
            self.triangle.expected_reduction(&way)
        };
        if promise(&cut) >= promise(&short) { (cut, false) } else { (short, false) }
    }

    /// Evaluates everything at `moved` and stays there; false, and nothing changed, if that is not finite.
    fn move_to(&mut self, moved: Vec<f64>) -> bool {
        let (n, m) = (moved.len(), self.residuals.len());
        let (mut residuals, mut jacobian) = (vec![0.0; m], vec![0.0; m * n]);
        self.model.evaluate(&moved, &mut residuals, Some(&mut jacobian));
        self.evaluations += 1;
        let cost = sum_of_squares(&residuals);
        let Some(triangle) = Triangle::reduce(&jacobian, &residuals, n).filter(|_| cost.is_finite()) else {
            return false;
        };
        for (largest, length) in self.scale.iter_mut().zip(triangle.column_lengths()) {
            *largest = largest.max(length);
        }
        (self.parameters, self.residuals) = (moved, residuals);
        (self.cost, self.triangle) = (cost, triangle);
        true
    }

    /// Undamped steps while they shrink; the sum of squares is blind to the last digits of the parameters, the steps
    /// are not.
    fn polish(&mut self) {
        let mut last = f64::INFINITY;
        for _ in 0..POLISH_STEPS {
            let free = self.free_to_move();
            // Dependent derivatives have no undamped step; a trace of damping picks the shortest of the many.
            let damping = if self.triangle.inverse_normal(&free).is_some() { 0.0 } else { TRACE_DAMPING };
            let lengths = self.triangle.column_lengths();
            let Some(delta) = self.triangle.damped_step(damping, &lengths, &free) else { return };
            let moved: Vec<f64> = self.parameters.iter().zip(&delta).map(|(p, d)| p + d).collect();
            let length = self.relative_length(&delta, &moved);
            if length <= POLISH_END || length >= POLISH_SHRINK * last || clipped(&moved, &self.bounds) != moved {
                return;
            }
            last = length;
            let before = (self.parameters.clone(), self.cost);
            if !self.move_to(moved) {
                return;
            }
            // Rounding of the sum may raise it a little; more than that is a step in the wrong direction.
            if self.cost > before.1 * (1.0 + 1e-9) + f64::MIN_POSITIVE {
                self.move_to(before.0);
                return;
            }
        }
    }

    /// Parameters not pressed against a bound: minus the gradient does not point out of the allowed range there.
    fn free_to_move(&self) -> Vec<usize> {
        let gradient = self.triangle.gradient();
        let pressed = |j: usize| {
            let (low, high) = self.bounds[j];
            let p = self.parameters[j];
            low == high || (p <= low && gradient[j] > 0.0) || (p >= high && gradient[j] < 0.0)
        };
        (0..self.parameters.len()).filter(|&j| !pressed(j)).collect()
    }

    /// A damped step of the `free` parameters; one that would leave a bound on which it sits is held, and the rest
    /// solved again.
    fn damped_step(&self, damping: f64, free: &[usize]) -> Option<Vec<f64>> {
        let mut free = free.to_vec();
        loop {
            let delta = self.triangle.damped_step(damping, &self.scale, &free)?;
            let before = free.len();
            free.retain(|&j| {
                let ((low, high), p) = (self.bounds[j], self.parameters[j]);
                !(p <= low && delta[j] < 0.0 || p >= high && delta[j] > 0.0)
            });
            if free.len() == before {
                return Some(delta);
            }
        }
    }

    /// Sum of squares that an undamped step of the free parameters is expected to remove.
    fn removable(&self, free: &[usize]) -> f64 {
        if free.len() == self.parameters.len() {
            return self.triangle.projected.norm_squared();
        }
        let step = self.damped_step(TRACE_DAMPING, free);
        step.map_or(f64::INFINITY, |delta| self.triangle.expected_reduction(&delta))
    }

    /// True if the model no longer depends on some free parameter, though it did on the way.
    fn lost_a_parameter(&self) -> bool {
        let lengths = self.triangle.column_lengths();
        self.triangle.r.column_iter().any(|c| c.norm() == 0.0)
            || self.free_to_move().iter().any(|&j| lengths[j] < LOST * self.scale[j])
    }

    fn relative_length(&self, delta: &[f64], parameters: &[f64]) -> f64 {
        let length = |values: &[f64]| values.iter().zip(&self.scale).map(|(v, s)| (v * s).powi(2)).sum::<f64>().sqrt();
        let (step, whole) = (length(delta), length(parameters));
        if whole > 0.0 { step / whole } else { step }
    }

    fn account(self, stopped: StopReason) -> Fit {
        let on_bound = |j: usize| self.parameters[j] <= self.bounds[j].0 || self.parameters[j] >= self.bounds[j].1;
        let (at_bound, free): (Vec<usize>, Vec<usize>) = (0..self.parameters.len()).partition(|&j| on_bound(j));
        let covariance = self.triangle.inverse_normal(&free);
        Fit {
            covariance,
            degrees_of_freedom: self.residuals.len() - free.len(),
            sum_of_squares: self.cost,
            evaluations: self.evaluations,
            stopped,
            at_bound,
            parameters: self.parameters,
            residuals: self.residuals,
        }
    }
}

fn checked_bounds(bounds: Option<&[(f64, f64)]>, n: usize) -> Result<Vec<(f64, f64)>, FitError> {
    let Some(bounds) = bounds else { return Ok(vec![(f64::NEG_INFINITY, f64::INFINITY); n]) };
    let sound = |&(low, high): &(f64, f64)| low <= high && low < f64::INFINITY && high > f64::NEG_INFINITY;
    match bounds.iter().position(|pair| !sound(pair)) {
        Some(index) => Err(FitError::Bounds { index }),
        None if bounds.len() != n => Err(FitError::Bounds { index: bounds.len().min(n) }),
        None => Ok(bounds.to_vec()),
    }
}

fn clipped(parameters: &[f64], bounds: &[(f64, f64)]) -> Vec<f64> {
    parameters.iter().zip(bounds).map(|(p, (low, high))| p.max(*low).min(*high)).collect()
}

fn sum_of_squares(values: &[f64]) -> f64 {
    values.iter().map(|x| x * x).sum()
}
