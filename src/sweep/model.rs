//! The model of all lines of one ramp and its derivatives, as columns that are zero outside short windows.
//! Must not solve anything.
//! Main type: [`Problem`].

use super::lines::Samples;

/// A column of the Jacobian that is zero outside its window.
pub(super) struct Column {
    /// First sample of the window.
    pub from: usize,
    /// Values in the window.
    pub values: Vec<f64>,
}

/// Line widths on either side of a centre over which a Lorentzian is followed: its tail is 1e-4 there.
const REACH: f64 = 50.0;
/// Time constants over which a decaying tail is followed: e⁻¹².
const TAIL: f64 = 12.0;
/// Lines of given stretch on given samples.
pub(super) struct Problem<'a> {
    /// What is fitted.
    pub samples: &'a Samples,
    /// Width of each line over the common width.
    pub stretch: &'a [f64],
    /// The detector's pole is a parameter.
    pub with_pole: bool,
}

/// Parameters in one vector: centres, heights, width, (pole), baseline, slope.
impl Problem<'_> {
    /// Lines.
    pub fn n_peaks(&self) -> usize {
        self.stretch.len()
    }

    /// Length of the parameter vector.
    pub fn n_parameters(&self) -> usize {
        2 * self.n_peaks() + 3 + usize::from(self.with_pole)
    }

    /// Model and, where wanted, the columns of its Jacobian.
    // Over 60 lines: values and derivatives of each parameter in turn; apart they would be computed twice.
    pub fn evaluate(&self, p: &[f64], want_columns: bool) -> (Vec<f64>, Vec<Column>) {
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

    /// Signal less model, 0 where a sample is not usable.
    pub fn residuals(&self, model: &[f64]) -> Vec<f64> {
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

/// Scalar product of two columns.
pub(super) fn dot(a: &Column, b: &Column) -> f64 {
    let from = a.from.max(b.from);
    let to = (a.from + a.values.len()).min(b.from + b.values.len());
    if from >= to {
        return 0.0;
    }
    a.values[from - a.from..to - a.from].iter().zip(&b.values[from - b.from..to - b.from]).map(|(x, y)| x * y).sum()
}
