//! All peaks of one ramp in one weighted least-squares fit: centres, heights, one line width, the detector's pole, baseline.
//! Must not know orders or combs: it takes positions in samples and gives them back better, with their covariance.
//! Main entry: [`fit`]; main types: [`Start`], [`LineFit`].

use nalgebra::{DMatrix, DVector};

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
    /// Residual standard deviation, V.
    pub residual: f64,
    /// Sum of squares.
    pub sum_of_squares: f64,
    /// Degrees of freedom.
    pub dof: f64,
    /// Residuals, V, in fitted samples.
    pub residuals: Vec<f64>,
}

/// Samples to fit: thinned by whole bins where the lines are wide.
#[derive(Debug, Clone)]
pub(super) struct Samples {
    /// Mean of each bin, V.
    pub signal: Vec<f64>,
    /// Bins without a clipped sample.
    pub usable: Vec<bool>,
    /// Samples a bin.
    pub bin: usize,
}

impl Samples {
    /// Thins a signal so that a line of `width` samples keeps at least twelve bins: white noise loses nothing by it.
    pub fn new(signal: &[f64], usable: &[bool], width: f64) -> Self {
        let bin = ((width / 12.0).floor() as usize).clamp(1, 4096);
        let means = signal.chunks(bin).map(|c| c.iter().sum::<f64>() / c.len() as f64).collect();
        let usable = usable.chunks(bin).map(|c| c.len() == bin && c.iter().all(|u| *u)).collect();
        Self { signal: means, usable, bin }
    }

    fn to_bins(&self, x: f64) -> f64 {
        (x - (self.bin as f64 - 1.0) / 2.0) / self.bin as f64
    }

    fn from_bins(&self, x: f64) -> f64 {
        x * self.bin as f64 + (self.bin as f64 - 1.0) / 2.0
    }
}

/// A column of the Jacobian that is zero outside its window.
struct Column {
    from: usize,
    values: Vec<f64>,
}

/// Line widths on either side of a centre over which a Lorentzian is followed: its tail is 1e-4 there.
const REACH: f64 = 50.0;
/// Time constants over which a decaying tail is followed: e⁻¹².
const TAIL: f64 = 12.0;
/// Most iterations.
const MOST_ITERATIONS: usize = 40;
/// A relative gain below this ends the fit.
const GAIN_TOLERANCE: f64 = 1e-8;
/// Damping at which a step is too short to matter.
const MOST_DAMPING: f64 = 1e9;
/// A step below this share of a line width, and of every height, ends the fit.
const STEP_TOLERANCE: f64 = 1e-5;

struct Problem<'a> {
    samples: &'a Samples,
    stretch: &'a [f64],
    with_pole: bool,
}

/// Parameters in one vector: centres, heights, width, (pole), baseline, slope.
impl Problem<'_> {
    fn n_peaks(&self) -> usize {
        self.stretch.len()
    }

    fn n_parameters(&self) -> usize {
        2 * self.n_peaks() + 3 + usize::from(self.with_pole)
    }

    /// Model and, where wanted, the columns of its Jacobian.
    fn evaluate(&self, p: &[f64], want_columns: bool) -> (Vec<f64>, Vec<Column>) {
        let n = self.samples.signal.len();
        let n_peaks = self.n_peaks();
        let width = p[2 * n_peaks];
        let pole = if self.with_pole { p[2 * n_peaks + 1] } else { 0.0 };
        let extra = if self.with_pole { TAIL * pole } else { 0.0 };
        let mut model = vec![0.0; n];
        let mut width_column = vec![0.0; if want_columns { n } else { 0 }];
        let mut columns: Vec<Column> = Vec::with_capacity(if want_columns { self.n_parameters() } else { 0 });
        let mut height_columns: Vec<Column> = Vec::new();
        for j in 0..n_peaks {
            let (centre, height, w) = (p[j], p[n_peaks + j], width * self.stretch[j]);
            let from = (centre - REACH * w).floor().clamp(0.0, n as f64) as usize;
            let to = (centre + REACH * w + extra).ceil().clamp(0.0, n as f64) as usize;
            let (mut by_centre, mut by_height) = (Vec::new(), Vec::new());
            for i in from..to {
                let q = 2.0 * (i as f64 - centre) / w;
                let l = 1.0 / (1.0 + q * q);
                model[i] += height * l;
                if want_columns {
                    by_height.push(l);
                    by_centre.push(height * 4.0 * q * l * l / w);
                    width_column[i] += height * 2.0 * q * q * l * l / width;
                }
            }
            if want_columns {
                if self.with_pole {
                    lag(&mut by_centre, pole);
                    lag(&mut by_height, pole);
                }
                columns.push(Column { from, values: by_centre });
                height_columns.push(Column { from, values: by_height });
            }
        }
        columns.append(&mut height_columns);
        if want_columns {
            if self.with_pole {
                lag(&mut width_column, pole);
            }
            columns.push(Column { from: 0, values: width_column });
        }
        if self.with_pole {
            let by_pole = lag_with_derivative(&mut model, pole);
            if want_columns {
                columns.push(Column { from: 0, values: by_pole });
            }
        }
        let (b0, b1) = (p[p.len() - 2], p[p.len() - 1]);
        let half = n as f64 / 2.0;
        let mut slope_column = Vec::with_capacity(n);
        for (i, value) in model.iter_mut().enumerate() {
            let u = (i as f64 - half) / half;
            *value += b0 + b1 * u;
            if want_columns {
                slope_column.push(u);
            }
        }
        if want_columns {
            columns.push(Column { from: 0, values: vec![1.0; n] });
            columns.push(Column { from: 0, values: slope_column });
            for column in &mut columns {
                for (k, value) in column.values.iter_mut().enumerate() {
                    if !self.samples.usable[column.from + k] {
                        *value = 0.0;
                    }
                }
            }
        }
        (model, columns)
    }

    fn residuals(&self, model: &[f64]) -> Vec<f64> {
        let pairs = self.samples.signal.iter().zip(model).zip(&self.samples.usable);
        pairs.map(|((s, m), usable)| if *usable { s - m } else { 0.0 }).collect()
    }
}

/// One-pole low pass, started at rest at the first value.
fn lag(values: &mut [f64], pole: f64) {
    let a = (-1.0 / pole.max(1e-3)).exp();
    let mut y = values.first().copied().unwrap_or(0.0);
    for value in values {
        y = a * y + (1.0 - a) * *value;
        *value = y;
    }
}

/// The same, with the derivative of its output by the pole.
fn lag_with_derivative(values: &mut [f64], pole: f64) -> Vec<f64> {
    let pole = pole.max(1e-3);
    let a = (-1.0 / pole).exp();
    let da = a / (pole * pole);
    let mut y = values.first().copied().unwrap_or(0.0);
    let mut dy = 0.0;
    let mut derivative = Vec::with_capacity(values.len());
    for value in values {
        dy = a * dy + (y - *value);
        y = a * y + (1.0 - a) * *value;
        *value = y;
        derivative.push(dy * da);
    }
    derivative
}

fn dot(a: &Column, b: &Column) -> f64 {
    let from = a.from.max(b.from);
    let to = (a.from + a.values.len()).min(b.from + b.values.len());
    if from >= to {
        return 0.0;
    }
    a.values[from - a.from..to - a.from].iter().zip(&b.values[from - b.from..to - b.from]).map(|(x, y)| x * y).sum()
}

/// Fits all lines at once by Levenberg–Marquardt on the normal equations, whose columns are short windows.
///
/// Returns none if the fit does not come to rest or its uncertainty cannot be had.
pub(super) fn fit(samples: &Samples, start: &Start) -> Option<LineFit> {
    let n_peaks = start.centres.len();
    let problem = Problem { samples, stretch: &start.stretch, with_pole: start.pole.is_some() };
    let n_parameters = problem.n_parameters();
    let n_used = samples.usable.iter().filter(|u| **u).count();
    if n_peaks == 0 || n_used <= n_parameters {
        return None;
    }
    let bin = samples.bin as f64;
    let mut p: Vec<f64> = start.centres.iter().map(|x| samples.to_bins(*x)).collect();
    p.extend(&start.heights);
    p.push(start.width / bin);
    p.extend(start.pole.map(|pole| (pole / bin).max(0.05)));
    p.push(start.baseline);
    p.push(0.0);
    let top = start.heights.iter().cloned().fold(0.0, f64::max);
    let cost_of = |r: &[f64]| r.iter().map(|x| x * x).sum::<f64>();
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
            let trial_residuals = problem.residuals(&problem.evaluate(&trial, false).0);
            let trial_cost = cost_of(&trial_residuals);
            if trial_cost.is_finite() && trial_cost <= cost {
                last_gain = (cost - trial_cost) / cost.max(1e-300);
                settled = size < STEP_TOLERANCE || last_gain < GAIN_TOLERANCE;
                p = trial;
                cost = trial_cost;
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
        let (model, new_columns) = problem.evaluate(&p, true);
        columns = new_columns;
        residuals = problem.residuals(&model);
    }
    // A weak line in the noise may wander on without changing the sum: that is rest enough, its height will not pass.
    if !settled && last_gain > 1e-3 {
        return None;
    }
    let (model, columns) = problem.evaluate(&p, true);
    let residuals = problem.residuals(&model);
    let (normal, _) = normal_equations(&columns, &residuals);
    let inverse = scaled_inverse(&normal)?;
    let dof = (n_used - n_parameters) as f64;
    let variance = cost / dof;
    let memory = memory_factor(&residuals, p[2 * n_peaks]);
    let scale = variance * memory;
    let mut centre_covariance = DMatrix::zeros(n_peaks, n_peaks);
    for i in 0..n_peaks {
        for j in 0..n_peaks {
            centre_covariance[(i, j)] = inverse[(i, j)] * scale * bin * bin;
        }
    }
    Some(LineFit {
        centres: p[..n_peaks].iter().map(|x| samples.from_bins(*x)).collect(),
        heights: p[n_peaks..2 * n_peaks].to_vec(),
        u_heights: (n_peaks..2 * n_peaks).map(|i| (inverse[(i, i)] * scale).max(0.0).sqrt()).collect(),
        width: p[2 * n_peaks] * bin,
        pole: problem.with_pole.then(|| p[2 * n_peaks + 1] * bin),
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
        gradient[i] = c.values.iter().zip(&residuals[c.from..]).map(|(a, r)| a * r).sum();
    }
    (normal, gradient)
}

/// Inverse of a symmetric matrix, columns scaled to one first so that volts and samples mix safely.
fn scaled_inverse(normal: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let n = normal.nrows();
    let scale: Vec<f64> = (0..n).map(|i| normal[(i, i)].max(1e-300).sqrt()).collect();
    let scaled = DMatrix::from_fn(n, n, |i, j| normal[(i, j)] / (scale[i] * scale[j]));
    let inverse = scaled.cholesky()?.inverse();
    Some(DMatrix::from_fn(n, n, |i, j| inverse[(i, j)] / (scale[i] * scale[j])))
}

/// How much residuals that remember each other inflate a variance: 1 + 2 Σ ρ over one line width, less what chance gives.
fn memory_factor(residuals: &[f64], width: f64) -> f64 {
    let n = residuals.len();
    let lags = (width.ceil() as usize).clamp(1, 64).min(n / 4);
    let power: f64 = residuals.iter().map(|r| r * r).sum();
    if !(power > 0.0) || lags == 0 {
        return 1.0;
    }
    let sum: f64 =
        (1..=lags).map(|k| residuals[k..].iter().zip(residuals).map(|(a, b)| a * b).sum::<f64>() / power).sum();
    (1.0 + 2.0 * sum - 2.0 * (4.0 * lags as f64 / n as f64).sqrt()).max(1.0)
}

/// Heights of the same lines in another signal (the crossed photodiode), centres, width and pole held.
pub(super) fn heights_in(signal: &[f64], usable: &[bool], fit: &LineFit, stretch: &[f64]) -> Option<Vec<f64>> {
    let samples = Samples::new(signal, usable, fit.width);
    let n_peaks = fit.centres.len();
    let problem = Problem { samples: &samples, stretch, with_pole: fit.pole.is_some() };
    let bin = samples.bin as f64;
    let mut p: Vec<f64> = fit.centres.iter().map(|x| samples.to_bins(*x)).collect();
    p.extend(vec![1.0; n_peaks]);
    p.push(fit.width / bin);
    p.extend(fit.pole.map(|pole| pole / bin));
    p.extend([0.0, 0.0]);
    let (_, mut columns) = problem.evaluate(&p, true);
    let tail = columns.split_off(columns.len() - 2);
    let mut linear: Vec<Column> = columns.drain(n_peaks..2 * n_peaks).collect();
    linear.extend(tail);
    let residuals: Vec<f64> =
        samples.signal.iter().zip(&samples.usable).map(|(s, u)| if *u { *s } else { 0.0 }).collect();
    let (normal, gradient) = normal_equations(&linear, &residuals);
    let solved = normal.cholesky()?.solve(&gradient);
    Some(solved.iter().take(n_peaks).copied().collect())
}
