//! One model of all samples of one or two ramps: axis, comb, one Airy line, detector, heights and baseline at once.
//! Must not decide which line is which, nor how many axis terms: it starts from what is known and makes it sharper.
//! Main entry: [`fit`]; main types: [`Track`], [`Shape`], [`Global`].

use nalgebra::DVector;

use super::{
    samples::Samples,
    separable::{Ground, Layout, State},
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
