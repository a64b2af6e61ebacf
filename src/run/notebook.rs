//! What a run has seen so far and later steps lean on: captures by step, dwells, first light, charts, remarks.
//! Must not decide what comes next.
//! Main types: [`Notebook`], [`Seen`], [`Dwelt`].

use super::rack::Rack;
use crate::{
    behaviour::{Glimpse, GlimpseMode, Hop, Swap, Warmup},
    phrase::Saying,
    record::{
        event::Captured,
        finding::{CaptureFinding, ModeFinding},
        sheet::{GainChart, SweepChart},
    },
    sweep::{Place, SharedAxis},
    uncertainty::{BudgetLine, Measured},
};

/// One capture with light that could be measured.
#[derive(Debug, Clone)]
pub(crate) struct Seen {
    /// As `behaviour` takes it; `at` counts from first light.
    pub glimpse: Glimpse,
    /// The finding, its trace taken out.
    pub finding: CaptureFinding,
}

/// The captures of one step, on one scan axis.
struct Taken {
    step: String,
    seen: Vec<Seen>,
    axis: Option<SharedAxis>,
    /// The axis is solved again at this many captures.
    solve_at: usize,
}

/// The scan axis of a step is solved at this many captures, then whenever they have doubled: early positions are drawn
/// again a few times only, and always at the same captures.
const FIRST_AXIS: usize = 8;

/// What became of a capture.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kept {
    /// Refused, dark, or out of the order of time.
    No,
    /// Kept behind the others.
    Added,
    /// Kept, and the positions of all captures of the step were drawn again on a better axis.
    Redrawn,
}

/// How a dwell ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum DwellEnd {
    /// The prediction of the residual walk is inside its bound and the wanted cycles were seen.
    Settled,
    /// `longest` came first.
    Longest,
    /// The captures were at their end.
    SourceEnded,
    /// No light.
    Dark,
}

/// A dwell as later steps see it.
pub(crate) struct Dwelt {
    /// Its step.
    pub step: String,
    /// The warm-up fitted so far.
    pub warmup: Warmup,
    /// How it ended; none while it lasts.
    pub end: Option<DwellEnd>,
    /// Seconds from first light to its last moment.
    pub seconds: f64,
    /// Walk cycles that the recipe wants whole.
    pub cycles: f64,
    /// `longest` of the recipe, s.
    pub longest: f64,
}

/// What was seen so far.
#[derive(Default)]
pub(crate) struct Notebook {
    /// The tube burnt already when the run was opened; times then count from the opening.
    pub rack: Option<Rack>,
    /// What the air of the bench adds to a mode spacing, relative.
    pub air: Option<BudgetLine>,
    /// Monotonic ms of first light.
    pub first_light_ms: Option<u64>,
    /// The tube gives no light, and how that was seen.
    pub dark: Option<Saying>,
    /// Captures of each step, in the order of the steps.
    captures: Vec<Taken>,
    /// Dwells.
    pub dwells: Vec<Dwelt>,
    /// Mode spacing as it stands on the sheet.
    pub spacing: Option<Measured>,
    /// Greatest power at any point of the walk: (W, standard uncertainty W).
    pub greatest_power: Option<(f64, f64)>,
    /// Hops seen over a dwell.
    pub hops: Vec<Hop>,
    /// Swaps seen over a dwell.
    pub swaps: Vec<Swap>,
    /// Tube current noted with the captures: sum, A, and how many.
    current: (f64, u64),
    /// Chart of one sweep.
    pub sweep_chart: Option<SweepChart>,
    /// Chart of heights along the gain line.
    pub gain_chart: Option<GainChart>,
    /// Why there can be no verdict on the tube, as sentences.
    pub holds: Vec<Saying>,
    /// For a reader of the sheet.
    pub remarks: Vec<Saying>,
}

impl Notebook {
    /// Nothing seen yet, of a tube from the rack or one that is struck here.
    pub fn begin(rack: Option<Rack>, air: Option<BudgetLine>) -> Self {
        Self { rack, air, ..Self::default() }
    }

    /// Seconds since first light, negative before it; since the opening while there was no light yet.
    pub fn since_first_light(&self, seconds_since_opened: f64) -> f64 {
        seconds_since_opened - self.first_light_ms.unwrap_or(0) as f64 / 1e3
    }

    /// Keeps a capture of a step.
    pub fn keep(&mut self, captured: &Captured) -> Kept {
        let finding = &captured.finding;
        let at = self.since_first_light(captured.fact.taken_s);
        if finding.refused.is_some() || finding.dark || !at.is_finite() {
            return Kept::No;
        }
        let place = match self.captures.iter().position(|taken| taken.step == captured.step) {
            Some(place) => place,
            None => {
                let step = captured.step.clone();
                self.captures.push(Taken { step, seen: Vec::new(), axis: None, solve_at: FIRST_AXIS });
                self.captures.len() - 1
            }
        };
        let taken = &mut self.captures[place];
        if taken.seen.last().is_some_and(|last| last.glimpse.at > at) {
            return Kept::No;
        }
        if let Some(current) = captured.fact.run_current.filter(|current| current.is_finite()) {
            self.current = (self.current.0 + current, self.current.1 + 1);
        }
        taken.repeats(finding);
        let glimpse = glimpse_of(captured, at, taken.axis.as_ref());
        taken.seen.push(Seen { glimpse, finding: CaptureFinding { trace: None, ..finding.clone() } });
        if taken.seen.len() < taken.solve_at {
            return Kept::Added;
        }
        taken.solve_at *= 2;
        taken.redraw();
        Kept::Redrawn
    }

    /// Mean tube current over the captures that carry it, A.
    pub fn mean_current(&self) -> Option<f64> {
        (self.current.1 > 0).then(|| self.current.0 / self.current.1 as f64)
    }

    /// Draws the positions of all captures of a step again, on the axis of everything seen.
    pub fn redraw(&mut self, step: &str) {
        if let Some(taken) = self.captures.iter_mut().find(|taken| taken.step == step) {
            taken.redraw();
        }
    }

    /// Captures of a step, in the order of time.
    pub fn of(&self, step: &str) -> &[Seen] {
        self.captures.iter().find(|taken| taken.step == step).map_or(&[], |taken| &taken.seen)
    }

    /// Captures of a step inside a window of seconds since first light, ends inclusive.
    pub fn of_within(&self, step: &str, window: (f64, f64)) -> &[Seen] {
        let list = self.of(step);
        let first = list.partition_point(|seen| seen.glimpse.at < window.0);
        let end = list.partition_point(|seen| seen.glimpse.at <= window.1);
        list.get(first..end).unwrap_or(&[])
    }

    /// Captures of the last whole cycles of every dwell; all of a dwell that has none.
    pub fn of_dwells(&self) -> impl Iterator<Item = &Seen> {
        self.dwells.iter().flat_map(|dwelt| match dwelt.warmup.last_cycles(dwelt.cycles) {
            Some(window) => self.of_within(&dwelt.step, window),
            None => self.of(&dwelt.step),
        })
    }

    /// A dwell by the name of its step.
    pub fn dwelt(&self, step: &str) -> Option<&Dwelt> {
        self.dwells.iter().find(|dwelt| dwelt.step == step)
    }

    /// Raises the greatest power seen.
    pub fn power_seen(&mut self, power: f64, u: f64) {
        if power.is_finite() && u.is_finite() && self.greatest_power.is_none_or(|(greatest, _)| power > greatest) {
            self.greatest_power = Some((power, u));
        }
    }

    /// Puts a sentence on the sheet, once.
    pub fn remark(&mut self, sentence: impl Into<Saying>) {
        let sentence = sentence.into();
        if !self.remarks.contains(&sentence) {
            self.remarks.push(sentence);
        }
    }
}

impl Taken {
    /// Gives the axis what repeats in one capture.
    fn repeats(&mut self, finding: &CaptureFinding) {
        let Some(ends) = finding.ramp_ends else { return };
        let axis = self.axis.get_or_insert_with(|| SharedAxis::new(ends, finding.free_spectral_range));
        for mode in &finding.modes {
            axis.add(&places(mode), mode.u_ramp);
        }
    }

    fn redraw(&mut self) {
        let Some(axis) = &mut self.axis else { return };
        if !axis.solve() {
            return;
        }
        for seen in &mut self.seen {
            for (drawn, mode) in seen.glimpse.modes.iter_mut().zip(seen.finding.modes.iter().filter(sound)) {
                (drawn.position, drawn.u_position) = position(mode, Some(axis));
            }
        }
    }
}

/// Position and its standard uncertainty, Hz: on the shared axis, else as the capture alone gave it.
fn position(mode: &ModeFinding, axis: Option<&SharedAxis>) -> (f64, f64) {
    let shared = axis.and_then(|axis| axis.position(&places(mode), mode.u_ramp));
    shared.filter(|(value, u)| value.is_finite() && u.is_finite()).unwrap_or((mode.position, mode.u_position))
}

fn places(mode: &ModeFinding) -> Vec<Place> {
    mode.places.iter().map(|(order, ramp)| Place { order: *order, ramp: *ramp }).collect()
}

/// Every number of the mode is finite.
fn sound(mode: &&ModeFinding) -> bool {
    [mode.position, mode.u_position, mode.peak_height, mode.u_peak_height].iter().all(|x| x.is_finite())
}

/// The capture as `behaviour` takes it; modes with numbers that are not finite are left out.
fn glimpse_of(captured: &Captured, at: f64, axis: Option<&SharedAxis>) -> Glimpse {
    let modes = captured.finding.modes.iter().filter(sound).map(|mode| {
        let (position, u_position) = position(mode, axis);
        GlimpseMode {
            position,
            u_position,
            height: mode.peak_height,
            u_height: mode.u_peak_height,
            crossed: mode.crossed_height.filter(|height| height.is_finite()),
        }
    });
    Glimpse {
        at,
        modes: modes.collect(),
        free_spectral_range: captured.finding.free_spectral_range,
        mode_spacing: captured.finding.mode_spacing.filter(|spacing| spacing.is_finite() && *spacing > 0.0),
        power: captured.fact.power.filter(|power| power.is_finite()),
    }
}
