//! One model of all samples of one or two ramps: axis, comb, one Airy line, detector, heights and baseline at once.
//! Must not decide which line is which, nor how many axis terms: it starts from what is known and makes it sharper.
//! Main entry: [`fit`]; main types: [`Track`], [`Shape`], [`Global`].

use nalgebra::{DMatrix, DVector};

use super::{
    airy::{self, Bins},
    axis::legendre_sum,
    lag::Lag,
    lines::{memory_factor, on_lines, scaled_inverse},
    model::product,
    samples::Samples,
};

/// One ramp with its start.
pub(super) struct Track<'a> {
    /// What was measured on it.
    pub samples: &'a Samples,
    /// Legendre coefficients of detuning over the ramp mapped to [−1, 1], Hz, ascending with time.
    pub axis: Vec<f64>,
    /// +1: teeth ascend with time; −1: they descend.
    pub way: f64,
}

/// What the ramps share.
#[derive(Debug, Clone)]
pub(super) struct Shape {
    /// Free spectral range, Hz: known.
    pub fsr: f64,
    /// Spacing of the comb, Hz.
    pub spacing: f64,
    /// Teeth of the modes on the comb.
    pub teeth: Vec<f64>,
    /// Places of further lights, Hz from tooth 0, each free.
    pub free: Vec<f64>,
    /// Full width at half maximum, Hz.
    pub width: f64,
    /// Time constant of the detector, samples; none: not in the model.
    pub pole: Option<f64>,
}

/// The fit's account.
#[derive(Debug, Clone)]
pub(super) struct Global {
    /// Shape found.
    pub shape: Shape,
    /// Axis of each ramp, Hz.
    pub axes: Vec<Vec<f64>>,
    /// Standard uncertainty of the spacing for samples of unit noise, Hz/V.
    pub u_spacing: f64,
    /// Last axis coefficient of each ramp, Hz, and its standard uncertainty for samples of unit noise, Hz/V.
    pub last: Vec<(f64, f64)>,
    /// Σ of squared residuals of each ramp, each bin weighted by its samples, V².
    pub sums: Vec<f64>,
    /// How much residuals that remember each other inflate a variance, at least 1.
    pub memory: f64,
    /// Degrees of freedom.
    pub dof: f64,
}

/// Most iterations.
const MOST_ITERATIONS: usize = 25;
/// A further gain in chi-square below this moves no value by more than a hundredth of its uncertainty: rest.
const REST: f64 = 1e-4;
/// Times a step is halved before the fit gives up.
const HALVINGS: usize = 8;

/// What iterates, as one vector: axis of each ramp (in orders), spacing, free places, width (in orders), pole (samples).
struct Layout {
    /// First parameter and number of each ramp's axis.
    axes: Vec<(usize, usize)>,
    spacing: usize,
    free: usize,
    width: usize,
    pole: Option<usize>,
    n: usize,
    n_lights: usize,
}

impl Layout {
    fn new(tracks: &[Track<'_>], shape: &Shape) -> Self {
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

    fn start(tracks: &[Track<'_>], shape: &Shape) -> Vec<f64> {
        let in_hertz = tracks.iter().flat_map(|track| &track.axis).chain([&shape.spacing]).chain(&shape.free);
        let mut p: Vec<f64> = in_hertz.chain([&shape.width]).map(|hertz| hertz / shape.fsr).collect();
        p.extend(shape.pole);
        p
    }

    /// Last coefficient of each ramp, Hz, and its standard uncertainty for unit noise.
    fn last_of(&self, p: &[f64], inverse: &DMatrix<f64>, fsr: f64) -> Vec<(f64, f64)> {
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
struct Ground<'a> {
    track: &'a Track<'a>,
    /// Legendre polynomials at the bins.
    basis: Vec<Vec<f64>>,
    /// Signal, and the two columns of the baseline, weighted.
    signal: Vec<f64>,
    baseline: [Vec<f64>; 2],
    /// Roots of the bins' samples, 0 where a bin is not fitted.
    root: Vec<f64>,
}

/// Time constants of the detector after which it has forgotten what came before the ramp (e⁻⁶ is left).
const FORGOTTEN: f64 = 6.0;

impl<'a> Ground<'a> {
    /// * `pole`: time constant of the detector, samples, as the fit starts.
    fn new(track: &'a Track<'a>, pole: Option<f64>) -> Self {
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

/// Fits everything at once.
///
/// Heights and baselines are linear: at every step they are solved for, and only axis, comb, width and pole iterate
/// (variable projection, Golub & Pereyra 1973, with the gradient of Kaufman 1975; from memory).
/// Returns none if the fit does not come to rest.
pub(super) fn fit(tracks: &[Track<'_>], shape: &Shape) -> Option<Global> {
    let layout = Layout::new(tracks, shape);
    let grounds: Vec<Ground<'_>> = tracks.iter().map(|track| Ground::new(track, shape.pole)).collect();
    let n_used = grounds.iter().flat_map(|ground| &ground.root).filter(|root| **root > 0.0).count();
    let dof = n_used.checked_sub(layout.n + layout.n_lights + 2 * tracks.len()).filter(|dof| *dof > 0)? as f64;
    let mut p = Layout::start(tracks, shape);
    let mut state = State::at(&grounds, shape, &layout, &p)?;
    for _ in 0..MOST_ITERATIONS {
        let step = &state.inverse * &state.gradient;
        if state.gradient.dot(&step) < REST * state.cost() / dof {
            return Some(state.account(&grounds, shape, &layout, &p, dof));
        }
        let mut share = shorten(&step, &p, &layout);
        let mut next = None;
        for _ in 0..HALVINGS {
            let trial: Vec<f64> = p.iter().zip(step.iter()).map(|(p, d)| p + share * d).collect();
            next = State::at(&grounds, shape, &layout, &trial)
                .filter(|found| found.cost() <= state.cost())
                .map(|found| (trial, found));
            if next.is_some() {
                break;
            }
            share *= 0.5;
        }
        (p, state) = next?;
    }
    None
}

/// What one axis term more on every ramp would change.
pub(super) struct Wider {
    /// Fall of the sum of squares, V².
    pub gain: f64,
    /// Change of the spacing, Hz.
    pub moved: f64,
    /// Standard uncertainty of the spacing with it, for samples of unit noise, Hz/V.
    pub u_spacing: f64,
    /// The new coefficient of each ramp, Hz, and its standard uncertainty for samples of unit noise, Hz/V.
    pub last: Vec<(f64, f64)>,
}

/// One step of the model with one axis term more, from a fit that came to rest: at rest a step is all there is to go.
pub(super) fn wider(tracks: &[Track<'_>], found: &Global) -> Option<Wider> {
    let wider: Vec<Track<'_>> = tracks
        .iter()
        .zip(&found.axes)
        .map(|(track, axis)| Track {
            samples: track.samples,
            axis: axis.iter().copied().chain([0.0]).collect(),
            way: track.way,
        })
        .collect();
    let layout = Layout::new(&wider, &found.shape);
    let grounds: Vec<Ground<'_>> = wider.iter().map(|track| Ground::new(track, found.shape.pole)).collect();
    let state = State::at(&grounds, &found.shape, &layout, &Layout::start(&wider, &found.shape))?;
    let step = &state.inverse * &state.gradient;
    Some(Wider {
        gain: state.gradient.dot(&step),
        moved: step[layout.spacing] * found.shape.fsr,
        u_spacing: state.inverse[(layout.spacing, layout.spacing)].max(0.0).sqrt() * found.shape.fsr,
        last: layout.last_of(step.as_slice(), &state.inverse, found.shape.fsr),
    })
}

/// Share of a step that moves no line by more than half its width, and neither width nor pole by more than half.
fn shorten(step: &DVector<f64>, p: &[f64], layout: &Layout) -> f64 {
    let width = p[layout.width];
    let pole = layout.pole.map_or(0.0, |at| step[at].abs() / p[at]);
    let most = (0..=layout.width).map(|at| step[at].abs() / width).fold(pole, f64::max);
    (0.5 / most.max(1e-300)).min(1.0)
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
struct State {
    sums: Vec<f64>,
    residuals: Vec<Vec<f64>>,
    gradient: DVector<f64>,
    /// Inverse of the projected normal matrix.
    inverse: DMatrix<f64>,
}

impl State {
    /// None where the linear part is not determined or a parameter is out of range.
    fn at(grounds: &[Ground<'_>], shape: &Shape, layout: &Layout, p: &[f64]) -> Option<Self> {
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

    fn cost(&self) -> f64 {
        self.sums.iter().sum()
    }

    fn account(&self, grounds: &[Ground<'_>], shape: &Shape, layout: &Layout, p: &[f64], dof: f64) -> Global {
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
