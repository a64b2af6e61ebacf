//! The least-squares problem of all samples at one place of its nonlinear parameters, solved for heights and baselines.
//! Must not iterate: `global` does.
//! Main types: [`Layout`], [`Ground`], [`State`].

use nalgebra::{DMatrix, DVector};

use super::{
    airy::{self, Bins},
    axis::legendre_sum,
    global::{Global, Shape, Track},
    lag::Lag,
    lines::{memory_factor, on_lines, scaled_inverse},
    model::product,
};

/// What iterates, as one vector: axis of each ramp (in orders), spacing, free places, width (in orders), pole (samples).
pub(super) struct Layout {
    /// First parameter and number of each ramp's axis.
    axes: Vec<(usize, usize)>,
    pub spacing: usize,
    pub free: usize,
    pub width: usize,
    pub pole: Option<usize>,
    pub n: usize,
    pub n_lights: usize,
}

impl Layout {
    pub fn new(tracks: &[Track<'_>], shape: &Shape) -> Self {
        let mut spacing = 0;
        let mut axes = Vec::new();
        for track in tracks {
            axes.push((spacing, track.axis.len()));
            spacing += track.axis.len();
        }
        let free = spacing + 1;
        let width = free + shape.free.len();
        let pole = shape.pole.map(|_| width + 1);
        let n = width + 1 + usize::from(pole.is_some());
        Self { axes, spacing, free, width, pole, n, n_lights: shape.teeth.len() + shape.free.len() }
    }

    pub fn start(tracks: &[Track<'_>], shape: &Shape) -> Vec<f64> {
        let in_hertz = tracks.iter().flat_map(|track| &track.axis).chain([&shape.spacing]).chain(&shape.free);
        let mut p: Vec<f64> = in_hertz.chain([&shape.width]).map(|hertz| hertz / shape.fsr).collect();
        p.extend(shape.pole);
        p
    }

    /// Last coefficient of each ramp, Hz, and its standard uncertainty for unit noise.
    pub fn last_of(&self, p: &[f64], inverse: &DMatrix<f64>, fsr: f64) -> Vec<(f64, f64)> {
        let last = |(first, n): &(usize, usize)| first + n - 1;
        self.axes.iter().map(last).map(|at| (p[at] * fsr, inverse[(at, at)].max(0.0).sqrt() * fsr)).collect()
    }

    fn places(&self, p: &[f64], shape: &Shape) -> Vec<f64> {
        shape
            .teeth
            .iter()
            .map(|tooth| tooth * p[self.spacing])
            .chain(p[self.free..self.width].iter().copied())
            .collect()
    }
}

/// What of a ramp no parameter changes.
pub(super) struct Ground<'a> {
    track: &'a Track<'a>,
    /// Legendre polynomials at the bins.
    basis: Vec<Vec<f64>>,
    /// Signal, and the two columns of the baseline, weighted.
    signal: Vec<f64>,
    baseline: [Vec<f64>; 2],
    /// Roots of the bins' samples, 0 where a bin is not fitted.
    pub root: Vec<f64>,
}

/// Time constants of the detector after which it has forgotten what came before the ramp (e⁻⁶ is left).
const FORGOTTEN: f64 = 6.0;

impl<'a> Ground<'a> {
    /// * `pole`: time constant of the detector, samples, as the fit starts.
    pub fn new(track: &'a Track<'a>, pole: Option<f64>) -> Self {
        let samples = track.samples;
        let from = FORGOTTEN * pole.unwrap_or(0.0);
        let root: Vec<f64> =
            samples.x.iter().zip(&samples.root).map(|(x, root)| if *x < from { 0.0 } else { *root }).collect();
        let half = samples.n as f64 / 2.0;
        let u: Vec<f64> = samples.x.iter().map(|x| (x - half) / half).collect();
        let polynomial = |degree: usize| {
            let mut unit = vec![0.0; degree + 1];
            unit[degree] = 1.0;
            u.iter().map(|u| legendre_sum(&unit, *u)).collect()
        };
        let weighted = |values: &[f64]| values.iter().zip(&root).map(|(v, root)| v * root).collect();
        Self {
            track,
            basis: (0..track.axis.len()).map(polynomial).collect(),
            signal: weighted(&samples.signal),
            baseline: [root.clone(), weighted(&u)],
            root,
        }
    }
}

/// One ramp at given nonlinear parameters: weighted columns of heights and baseline, and what the others are made of.
struct Part {
    linear: Vec<Vec<f64>>,
    slopes: Vec<Vec<f64>>,
    by_width: Vec<Vec<f64>>,
    by_pole: Vec<Vec<f64>>,
    lag: Option<Lag>,
}

impl Part {
    fn new(ground: &Ground<'_>, axis: &[f64], places: &[f64], width: f64, pole: Option<f64>) -> Self {
        let samples = ground.track.samples;
        let mut detuning = vec![0.0; samples.x.len()];
        for (c, basis) in axis.iter().zip(&ground.basis) {
            add(&mut detuning, *c, basis);
        }
        let bins = Bins::new(&detuning, &samples.x, &samples.bow);
        let lag = pole.map(|pole| Lag::new(&samples.x, pole));
        let mut part =
            Self { linear: Vec::new(), slopes: Vec::new(), by_width: Vec::new(), by_pole: Vec::new(), lag: None };
        for place in places {
            let mut light = airy::light(&bins, ground.track.way * place, width);
            if let Some(lag) = &lag {
                let mut by_pole = lag.derivative(&mut light.value);
                weigh(&mut by_pole, &ground.root);
                part.by_pole.push(by_pole);
            }
            weigh(&mut light.value, &ground.root);
            part.linear.push(light.value);
            part.slopes.push(light.slope);
            part.by_width.push(light.by_width);
        }
        part.linear.extend(ground.baseline.clone());
        part.lag = lag;
        part
    }

    /// Nonlinear columns, as (parameter, weighted column).
    fn nonlinear(
        &self,
        ground: &Ground<'_>,
        layout: &Layout,
        ramp: usize,
        shape: &Shape,
        heights: &[f64],
    ) -> Vec<(usize, Vec<f64>)> {
        let samples = ground.track.samples;
        let sum = |of: &[Vec<f64>], weight: &dyn Fn(usize) -> f64| {
            let mut total = vec![0.0; samples.x.len()];
            for (k, column) in of.iter().enumerate() {
                add(&mut total, weight(k) * heights[k], column);
            }
            total
        };
        let finish = |mut column: Vec<f64>| {
            if let Some(lag) = &self.lag {
                lag.apply(&mut column, 0);
            }
            weigh(&mut column, &ground.root);
            column
        };
        let way = ground.track.way;
        let all = sum(&self.slopes, &|_| 1.0);
        let mut columns = Vec::with_capacity(layout.n);
        for (degree, basis) in ground.basis.iter().enumerate() {
            let column = all.iter().zip(basis).map(|(slope, basis)| slope * basis).collect();
            columns.push((layout.axes[ramp].0 + degree, finish(column)));
        }
        let by_tooth = |k: usize| shape.teeth.get(k).map_or(0.0, |tooth| -way * tooth);
        columns.push((layout.spacing, finish(sum(&self.slopes, &by_tooth))));
        for k in 0..shape.free.len() {
            let this = shape.teeth.len() + k;
            columns.push((layout.free + k, finish(sum(&self.slopes, &|j| if j == this { -way } else { 0.0 }))));
        }
        columns.push((layout.width, finish(sum(&self.by_width, &|_| 1.0))));
        columns.extend(layout.pole.map(|at| (at, sum(&self.by_pole, &|_| 1.0))));
        columns
    }
}

/// total += factor · column.
fn add(total: &mut [f64], factor: f64, column: &[f64]) {
    if factor != 0.0 {
        total.iter_mut().zip(column).for_each(|(t, c)| *t += factor * c);
    }
}

fn weigh(values: &mut [f64], root: &[f64]) {
    values.iter_mut().zip(root).for_each(|(v, root)| *v *= root);
}

/// The problem at one place, solved for its linear part.
pub(super) struct State {
    sums: Vec<f64>,
    residuals: Vec<Vec<f64>>,
    /// Gradient by the nonlinear parameters, downhill.
    pub gradient: DVector<f64>,
    /// Inverse of the projected normal matrix.
    pub inverse: DMatrix<f64>,
}

impl State {
    /// None where the linear part is not determined or a parameter is out of range.
    pub fn at(grounds: &[Ground<'_>], shape: &Shape, layout: &Layout, p: &[f64]) -> Option<Self> {
        let width = p[layout.width];
        let pole = layout.pole.map(|at| p[at]);
        if !(width > 1e-6 && width < 0.4) || pole.is_some_and(|pole| pole.is_nan() || pole < 1e-3) {
            return None;
        }
        let places = layout.places(p, shape);
        let axis = |ramp: usize| &p[layout.axes[ramp].0..][..layout.axes[ramp].1];
        let part = |(ramp, ground)| Part::new(ground, axis(ramp), &places, width, pole);
        let parts: Vec<Part> = grounds.iter().enumerate().map(part).collect();
        let linear = Linear::solve(grounds, &parts, layout.n_lights)?;
        let n_linear = linear.solved.len();
        let (mut sums, mut kept) = (Vec::new(), Vec::new());
        let mut gradient = DVector::zeros(layout.n);
        let mut block = DMatrix::zeros(layout.n, layout.n);
        let mut mixed = DMatrix::zeros(layout.n, n_linear);
        for (ramp, (ground, part)) in grounds.iter().zip(&parts).enumerate() {
            let mut residuals = ground.signal.clone();
            for (k, column) in part.linear.iter().enumerate() {
                add(&mut residuals, -linear.solved[linear.column(ramp, k)], column);
            }
            sums.push(product(&residuals, &residuals));
            let columns = part.nonlinear(ground, layout, ramp, shape, linear.solved.as_slice());
            for (a, (i, x)) in columns.iter().enumerate() {
                gradient[*i] += product(x, &residuals);
                for (j, y) in &columns[..=a] {
                    let value = product(x, y);
                    block[(*i, *j)] += value;
                    if i != j {
                        block[(*j, *i)] += value;
                    }
                }
                for (k, y) in part.linear.iter().enumerate() {
                    mixed[(*i, linear.column(ramp, k))] += product(x, y);
                }
            }
            kept.push(residuals);
        }
        let projected = &block - &mixed * &linear.inverse * mixed.transpose();
        let finite = sums.iter().all(|sum| sum.is_finite());
        finite.then_some(Self { sums, residuals: kept, gradient, inverse: scaled_inverse(&projected)? })
    }

    /// * `width`: of a line over half of the first ramp.
    fn memory(&self, grounds: &[Ground<'_>], width: f64) -> f64 {
        let of = |(ground, residuals): (&Ground<'_>, &Vec<f64>)| {
            let samples = ground.track.samples;
            let n = grounds.first().map_or(0.0, |first| first.track.samples.n as f64);
            memory_factor(&on_lines(samples, residuals), width * n / 2.0 / samples.finest as f64)
        };
        grounds.iter().zip(&self.residuals).map(of).fold(1.0, f64::max)
    }

    pub fn cost(&self) -> f64 {
        self.sums.iter().sum()
    }

    pub fn account(&self, grounds: &[Ground<'_>], shape: &Shape, layout: &Layout, p: &[f64], dof: f64) -> Global {
        let hertz = |range: &[f64]| range.iter().map(|v| v * shape.fsr).collect::<Vec<f64>>();
        Global {
            shape: Shape {
                spacing: p[layout.spacing] * shape.fsr,
                free: hertz(&p[layout.free..layout.width]),
                width: p[layout.width] * shape.fsr,
                pole: layout.pole.map(|at| p[at]),
                ..shape.clone()
            },
            axes: layout.axes.iter().map(|(first, n)| hertz(&p[*first..first + n])).collect(),
            u_spacing: self.inverse[(layout.spacing, layout.spacing)].max(0.0).sqrt() * shape.fsr,
            last: layout.last_of(p, &self.inverse, shape.fsr),
            memory: self.memory(grounds, p[layout.width] / p[1].abs().max(1e-300)),
            sums: self.sums.clone(),
            dof,
        }
    }
}

/// Heights, common to the ramps, and a baseline for each.
struct Linear {
    n_lights: usize,
    solved: DVector<f64>,
    inverse: DMatrix<f64>,
}

impl Linear {
    /// Where the column `k` of a ramp stands among all.
    fn column(&self, ramp: usize, k: usize) -> usize {
        if k < self.n_lights { k } else { k + 2 * ramp }
    }

    fn solve(grounds: &[Ground<'_>], parts: &[Part], n_lights: usize) -> Option<Self> {
        let n = n_lights + 2 * grounds.len();
        let mut linear = Self { n_lights, solved: DVector::zeros(n), inverse: DMatrix::zeros(n, n) };
        let mut normal = DMatrix::zeros(n, n);
        let mut right = DVector::zeros(n);
        for (ramp, (ground, part)) in grounds.iter().zip(parts).enumerate() {
            for (a, x) in part.linear.iter().enumerate() {
                let i = linear.column(ramp, a);
                right[i] += product(x, &ground.signal);
                for (b, y) in part.linear[..=a].iter().enumerate() {
                    let j = linear.column(ramp, b);
                    let value = product(x, y);
                    normal[(i, j)] += value;
                    if i != j {
                        normal[(j, i)] += value;
                    }
                }
            }
        }
        linear.inverse = scaled_inverse(&normal)?;
        linear.solved = &linear.inverse * right;
        Some(linear)
    }
}
