//! All peaks of one ramp in one weighted least-squares fit: centres, heights, one line width, the detector's pole, baseline.
//! Must not know orders or combs: it takes positions in samples and gives them back better, with their covariance.
//! Main entry: [`fit`]; main types: [`Start`], [`LineFit`].

use nalgebra::{DMatrix, DVector};

use super::{
    model::{Column, Problem, dot, product},
    samples::Samples,
};

/// Where a fit begins.
#[derive(Debug, Clone)]
pub(super) struct Start {
    /// Centres, samples.
    pub centres: Vec<f64>,
    /// Heights, V.
    pub heights: Vec<f64>,
    /// Width of each line over the common width (the ramp's local speed).
    pub stretch: Vec<f64>,
    /// Common full width at half maximum, samples.
    pub width: f64,
    /// Time constant of the detector, samples; none: not fitted.
    pub pole: Option<f64>,
    /// Baseline, V.
    pub baseline: f64,
}

/// The fit's account.
#[derive(Debug, Clone)]
pub(super) struct LineFit {
    /// Centres, samples.
    pub centres: Vec<f64>,
    /// Heights, V.
    pub heights: Vec<f64>,
    /// Standard uncertainties of the heights, V.
    pub u_heights: Vec<f64>,
    /// Common full width at half maximum, samples.
    pub width: f64,
    /// Time constant of the detector, samples.
    pub pole: Option<f64>,
    /// Baseline in the middle and its rise to the end, V.
    pub baseline: (f64, f64),
    /// Covariance of the centres, samples², row by row; scaled by the residuals.
    pub centre_covariance: DMatrix<f64>,
    /// Residual standard deviation of one sample, V.
    pub residual: f64,
    /// Sum of squares.
    pub sum_of_squares: f64,
    /// Degrees of freedom.
    pub dof: f64,
    /// Residuals of the bins, V, times the root of their samples.
    pub residuals: Vec<f64>,
}

/// Most iterations.
const MOST_ITERATIONS: usize = 40;
/// A relative gain below this ends the fit.
const GAIN_TOLERANCE: f64 = 1e-8;
/// Damping at which a step is too short to matter.
const MOST_DAMPING: f64 = 1e9;
/// A step below this share of a line width, and of every height, ends the fit.
const STEP_TOLERANCE: f64 = 1e-5;

/// Fits all lines at once by Levenberg–Marquardt on the normal equations, whose columns are short windows.
///
/// Returns none if the fit does not come to rest or its uncertainty cannot be had.
// Over 60 lines: one loop and its ends; cut in pieces, each would be handed all of its state.
pub(super) fn fit(samples: &Samples, start: &Start) -> Option<LineFit> {
    let n_peaks = start.centres.len();
    let problem = Problem { samples, stretch: &start.stretch, with_pole: start.pole.is_some() };
    let n_parameters = problem.n_parameters();
    let n_used = samples.n_used();
    if n_peaks == 0 || n_used <= n_parameters {
        return None;
    }
    let mut p: Vec<f64> = start.centres.clone();
    p.extend(&start.heights);
    p.push(start.width);
    p.extend(start.pole.map(|pole| pole.max(0.05)));
    p.push(start.baseline);
    p.push(0.0);
    let top = start.heights.iter().cloned().fold(0.0, f64::max);
    let cost_of = |r: &[f64]| product(r, r);
    let (model, mut columns) = problem.evaluate(&p, true);
    let mut residuals = problem.residuals(&model);
    let mut cost = cost_of(&residuals);
    let mut damping = 1e-3;
    let mut settled = false;
    let mut last_gain = f64::INFINITY;
    for _ in 0..MOST_ITERATIONS {
        let (normal, gradient) = normal_equations(&columns, &residuals);
        let mut improved = false;
        while damping < MOST_DAMPING {
            let mut damped = normal.clone();
            for i in 0..n_parameters {
                damped[(i, i)] += damping * normal[(i, i)].max(1e-300);
            }
            let Some(step) = damped.cholesky().map(|c| c.solve(&gradient)) else {
                damping = (damping * 10.0).max(1e-9);
                continue;
            };
            let width = p[2 * n_peaks];
            let mut trial = p.clone();
            let mut size: f64 = 0.0;
            for i in 0..n_parameters {
                let mut d = step[i];
                if i < n_peaks {
                    let most = width * start.stretch[i];
                    d = d.clamp(-most, most);
                    size = size.max(d.abs() / most);
                } else if i < 2 * n_peaks {
                    size = size.max(d.abs() / top.max(1e-300));
                } else if i == 2 * n_peaks {
                    d = d.clamp(-0.5 * width, width);
                    size = size.max(d.abs() / width);
                } else if problem.with_pole && i == 2 * n_peaks + 1 {
                    d = d.clamp(-0.7 * p[i], 2.0 * p[i] + width);
                }
                trial[i] += d;
            }
            trial[2 * n_peaks] = trial[2 * n_peaks].max(0.3);
            if problem.with_pole {
                trial[2 * n_peaks + 1] = trial[2 * n_peaks + 1].max(0.02);
            }
            // Nearly every trial is taken: its columns are made at once.
            let (trial_model, trial_columns) = problem.evaluate(&trial, true);
            let trial_residuals = problem.residuals(&trial_model);
            let trial_cost = cost_of(&trial_residuals);
            if trial_cost.is_finite() && trial_cost <= cost {
                last_gain = (cost - trial_cost) / cost.max(1e-300);
                settled = size < STEP_TOLERANCE || last_gain < GAIN_TOLERANCE;
                p = trial;
                cost = trial_cost;
                columns = trial_columns;
                residuals = trial_residuals;
                damping = (damping * 0.1).max(1e-12);
                improved = true;
                break;
            }
            if size < STEP_TOLERANCE {
                settled = true;
                break;
            }
            damping = (damping * 10.0).max(1e-9);
        }
        if settled || !improved {
            // No step of any size improves it: rest at the precision of the sums.
            settled = true;
            break;
        }
    }
    // A weak line in the noise may wander on without changing the sum: that is rest enough, its height will not pass.
    if !settled && last_gain > 1e-3 {
        return None;
    }
    let (normal, _) = normal_equations(&columns, &residuals);
    let inverse = scaled_inverse(&normal)?;
    let dof = (n_used - n_parameters) as f64;
    let variance = cost / dof;
    let memory = memory_factor(&on_lines(samples, &residuals), p[2 * n_peaks] / samples.finest as f64);
    let scale = variance * memory;
    let mut centre_covariance = DMatrix::zeros(n_peaks, n_peaks);
    for i in 0..n_peaks {
        for j in 0..n_peaks {
            centre_covariance[(i, j)] = inverse[(i, j)] * scale;
        }
    }
    Some(LineFit {
        centres: p[..n_peaks].to_vec(),
        heights: p[n_peaks..2 * n_peaks].to_vec(),
        u_heights: (n_peaks..2 * n_peaks).map(|i| (inverse[(i, i)] * scale).max(0.0).sqrt()).collect(),
        width: p[2 * n_peaks],
        pole: problem.with_pole.then(|| p[2 * n_peaks + 1]),
        baseline: (p[n_parameters - 2], p[n_parameters - 1]),
        centre_covariance,
        residual: variance.sqrt(),
        sum_of_squares: cost,
        dof,
        residuals,
    })
}

fn normal_equations(columns: &[Column], residuals: &[f64]) -> (DMatrix<f64>, DVector<f64>) {
    let n = columns.len();
    let mut normal = DMatrix::zeros(n, n);
    let mut gradient = DVector::zeros(n);
    for i in 0..n {
        for j in 0..=i {
            let value = dot(&columns[i], &columns[j]);
            normal[(i, j)] = value;
            normal[(j, i)] = value;
        }
        let c = &columns[i];
        gradient[i] = product(&c.values, &residuals[c.from..c.from + c.values.len()]);
    }
    (normal, gradient)
}

/// Inverse of a symmetric matrix, columns scaled to one first so that volts and samples mix safely.
pub(super) fn scaled_inverse(normal: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let n = normal.nrows();
    let scale: Vec<f64> = (0..n).map(|i| normal[(i, i)].max(1e-300).sqrt()).collect();
    let scaled = DMatrix::from_fn(n, n, |i, j| normal[(i, j)] / (scale[i] * scale[j]));
    let inverse = scaled.cholesky()?.inverse();
    Some(DMatrix::from_fn(n, n, |i, j| inverse[(i, j)] / (scale[i] * scale[j])))
}

/// Residuals of the finest bins alone: those on the lines, evenly spaced there.
pub(super) fn on_lines(samples: &Samples, residuals: &[f64]) -> Vec<f64> {
    let fine = |i: &usize| samples.bounds[i + 1] - samples.bounds[*i] == samples.finest;
    (0..residuals.len()).filter(fine).map(|i| residuals[i]).collect()
}

/// How much residuals that remember each other inflate a variance: 1 + 2 Σ ρ over one line width, less what chance gives.
pub(super) fn memory_factor(residuals: &[f64], width: f64) -> f64 {
    let n = residuals.len();
    let lags = (width.ceil() as usize).clamp(1, 64).min(n / 4);
    let power: f64 = residuals.iter().map(|r| r * r).sum();
    if power.is_nan() || power <= 0.0 || lags == 0 {
        return 1.0;
    }
    let sum: f64 =
        (1..=lags).map(|k| residuals[k..].iter().zip(residuals).map(|(a, b)| a * b).sum::<f64>() / power).sum();
    (1.0 + 2.0 * sum - 2.0 * (4.0 * lags as f64 / n as f64).sqrt()).max(1.0)
}

/// Heights of the same lines in one photodiode alone, centres, width and pole held.
///
/// * `samples`: those of the fit; `signal`: the photodiode's, over the whole ramp.
///
/// Returns heights and their standard uncertainties, V; none if the lines lie on each other.
pub(super) fn heights_in(
    signal: &[f64],
    samples: &Samples,
    fit: &LineFit,
    stretch: &[f64],
) -> Option<(Vec<f64>, Vec<f64>)> {
    let n_peaks = fit.centres.len();
    let problem = Problem { samples, stretch, with_pole: fit.pole.is_some() };
    let mut p: Vec<f64> = fit.centres.clone();
    p.extend(vec![1.0; n_peaks]);
    p.push(fit.width);
    p.extend(fit.pole);
    p.extend([0.0, 0.0]);
    let (_, mut columns) = problem.evaluate(&p, true);
    let tail = columns.split_off(columns.len() - 2);
    let mut linear: Vec<Column> = columns.drain(n_peaks..2 * n_peaks).collect();
    linear.extend(tail);
    let used: Vec<f64> = samples.means(signal).iter().zip(&samples.root).map(|(s, root)| s * root).collect();
    let (normal, gradient) = normal_equations(&linear, &used);
    let inverse = scaled_inverse(&normal)?;
    let solved = &inverse * &gradient;
    // ‖y − Ax‖² = y·y − x·Aᵀy for the least-squares x.
    let left = product(&used, &used) - solved.dot(&gradient);
    let variance = (left / (samples.n_used().saturating_sub(linear.len())).max(1) as f64).max(0.0);
    let heights = solved.iter().take(n_peaks).copied().collect();
    Some((heights, (0..n_peaks).map(|i| (inverse[(i, i)] * variance).max(0.0).sqrt()).collect()))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::numerics::least_squares::{Model, Options, fit as certified_fit};

    /// The same lines as a dense model for the solver that is checked against certified data (`tests/strd.rs`).
    struct Dense<'a>(Problem<'a>);

    impl Model for Dense<'_> {
        fn n_parameters(&self) -> usize {
            self.0.n_parameters()
        }

        fn n_points(&self) -> usize {
            self.0.samples.x.len()
        }

        fn evaluate(&self, parameters: &[f64], residuals: &mut [f64], jacobian: Option<&mut [f64]>) {
            let (model, columns) = self.0.evaluate(parameters, jacobian.is_some());
            for (residual, signed) in residuals.iter_mut().zip(self.0.residuals(&model)) {
                *residual = -signed;
            }
            let Some(jacobian) = jacobian else { return };
            jacobian.fill(0.0);
            for (j, column) in columns.iter().enumerate() {
                for (k, value) in column.values.iter().enumerate() {
                    jacobian[(column.from + k) * columns.len() + j] = *value;
                }
            }
        }
    }

    /// Three overlapping lines behind a slow detector, with a small seeded noise.
    fn made() -> (Samples, Start) {
        let truth = [300.0, 345.0, 620.0, 1.0, 0.6, 0.8, 14.0, 6.0, 0.05, 0.01];
        let blank = Samples::new(&[0.0; 900], &[true; 900], &[], 3.0);
        let stretch = [1.0, 1.02, 1.1];
        let problem = Problem { samples: &blank, stretch: &stretch, with_pole: true };
        let mut state = 1u64;
        let mut noise = || {
            // Knuth's linear congruential generator, upper bits.
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 33) as f64 / f64::from(1u32 << 31) - 0.5
        };
        let signal = problem.evaluate(&truth, false).0.iter().map(|v| v + 0.01 * noise()).collect();
        let start = Start {
            centres: vec![302.0, 349.0, 623.0],
            heights: vec![0.8, 0.5, 0.7],
            stretch: stretch.to_vec(),
            width: 18.0,
            pole: Some(3.0),
            baseline: 0.0,
        };
        (Samples { signal, ..blank }, start)
    }

    #[test]
    fn agrees_with_the_certified_solver() {
        let (samples, start) = made();
        let ours = fit(&samples, &start).unwrap();
        let problem = Problem { samples: &samples, stretch: &start.stretch, with_pole: true };
        let from = [302.0, 349.0, 623.0, 0.8, 0.5, 0.7, 18.0, 3.0, 0.0, 0.0];
        let theirs = certified_fit(&Dense(problem), &from, &Options::default()).unwrap();
        for j in 0..3 {
            // Both end at one minimum: the steps they stop at are 1e-5 of a width, 1e-4 of a sample here.
            assert!((ours.centres[j] - theirs.parameters[j]).abs() < 1e-3, "centre {j}");
            assert!((ours.heights[j] - theirs.parameters[3 + j]).abs() < 1e-4, "height {j}");
            let variance = theirs.covariance_at(j, j).unwrap() * theirs.reduced_chi_square().unwrap();
            // Ours may be raised by the memory of the residuals; white noise has none beyond chance.
            assert!((ours.centre_covariance[(j, j)] / variance - 1.0).abs() < 0.05, "variance of centre {j}");
        }
        assert!((ours.pole.unwrap() - theirs.parameters[7]).abs() < 1e-3);
        assert!((ours.sum_of_squares / theirs.sum_of_squares - 1.0).abs() < 1e-7);
    }
}
