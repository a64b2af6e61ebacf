//! The model of all lines of one ramp and its derivatives, as columns that are zero outside short windows.
//! Must not solve anything.
//! Main type: [`Problem`].

use super::{lag::Lag, samples::Samples};

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

    /// Model and, where wanted, the columns of its Jacobian weighted by the root of each bin's samples.
    // Over 60 lines: values and derivatives of each parameter in turn; apart they would be computed twice.
    pub fn evaluate(&self, p: &[f64], want_columns: bool) -> (Vec<f64>, Vec<Column>) {
        let xs = &self.samples.x;
        let n = xs.len();
        let n_peaks = self.n_peaks();
        let width = p[2 * n_peaks];
        let lag = self.with_pole.then(|| Lag::new(xs, p[2 * n_peaks + 1]));
        let extra = if self.with_pole { TAIL * p[2 * n_peaks + 1] } else { 0.0 };
        let mut model = vec![0.0; n];
        let mut width_column = vec![0.0; n];
        let mut columns: Vec<Column> = Vec::with_capacity(if want_columns { self.n_parameters() } else { 0 });
        let mut height_columns: Vec<Column> = Vec::new();
        for j in 0..n_peaks {
            let (centre, height, w) = (p[j], p[n_peaks + j], width * self.stretch[j]);
            let from = xs.partition_point(|x| *x < centre - REACH * w);
            let to = xs.partition_point(|x| *x <= centre + REACH * w + extra);
            let size = to - from;
            let (mut by_centre, mut by_height) = (vec![0.0; size], vec![0.0; size]);
            let per = 2.0 / w;
            let (bow, by_width) = (&self.samples.bow[from..to], &mut width_column[from..to]);
            let places = xs[from..to].iter().zip(bow).zip(&mut model[from..to]).zip(by_width);
            for ((((x, bow), model), by_width), (by_centre, by_height)) in
                places.zip(by_centre.iter_mut().zip(&mut by_height))
            {
                let q = per * (x - centre);
                let l = 1.0 / (1.0 + q * q);
                // The bin's mean differs from its middle by the curvature.
                let mean = l + bow * per * per * (6.0 * q * q - 2.0) * l * l * l;
                let slope = height * 2.0 * q * l * l;
                *model += height * mean;
                *by_height = mean;
                *by_centre = slope * per;
                *by_width += slope * q / width;
            }
            if want_columns {
                if let Some(lag) = &lag {
                    lag.apply(&mut by_centre, from);
                    lag.apply(&mut by_height, from);
                }
                columns.push(Column { from, values: by_centre });
                height_columns.push(Column { from, values: by_height });
            }
        }
        columns.append(&mut height_columns);
        if let Some(lag) = &lag {
            if want_columns {
                lag.apply(&mut width_column, 0);
                columns.push(Column { from: 0, values: width_column });
                columns.push(Column { from: 0, values: lag.derivative(&mut model) });
            } else {
                lag.apply(&mut model, 0);
            }
        } else if want_columns {
            columns.push(Column { from: 0, values: width_column });
        }
        let (b0, b1) = (p[p.len() - 2], p[p.len() - 1]);
        let half = self.samples.n as f64 / 2.0;
        let slope: Vec<f64> = xs.iter().map(|x| (x - half) / half).collect();
        model.iter_mut().zip(&slope).for_each(|(value, u)| *value += b0 + b1 * u);
        if want_columns {
            columns.push(Column { from: 0, values: vec![1.0; n] });
            columns.push(Column { from: 0, values: slope });
            for column in &mut columns {
                let roots = &self.samples.root[column.from..];
                column.values.iter_mut().zip(roots).for_each(|(value, root)| *value *= root);
            }
        }
        (model, columns)
    }

    /// Signal less model, weighted by the root of each bin's samples: 0 where a bin may not be fitted.
    pub fn residuals(&self, model: &[f64]) -> Vec<f64> {
        let pairs = self.samples.signal.iter().zip(model).zip(&self.samples.root);
        pairs.map(|((s, m), root)| (s - m) * root).collect()
    }
}

/// Scalar product of two columns.
pub(super) fn dot(a: &Column, b: &Column) -> f64 {
    let from = a.from.max(b.from);
    let to = (a.from + a.values.len()).min(b.from + b.values.len());
    if from >= to {
        return 0.0;
    }
    product(&a.values[from - a.from..to - a.from], &b.values[from - b.from..to - b.from])
}

/// Σ aᵢ·bᵢ in eight sums side by side: one sum alone waits for each addition.
pub(super) fn product(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; 8];
    let (a_blocks, b_blocks) = (a.chunks_exact(8), b.chunks_exact(8));
    let rest: f64 = a_blocks.remainder().iter().zip(b_blocks.remainder()).map(|(x, y)| x * y).sum();
    for (x, y) in a_blocks.zip(b_blocks) {
        for k in 0..8 {
            sums[k] += x[k] * y[k];
        }
    }
    rest + sums.iter().sum::<f64>()
}
