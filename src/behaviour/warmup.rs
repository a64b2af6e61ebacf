//! Follows a tube from first light and says how far it has walked, how it goes on, and whether it is ready.
//! Must not read a clock: its state is a function of the glimpses taken.
//! Main type: [`Warmup`].

use std::sync::OnceLock;

use super::decay::{Decay, WalkPoint};
use super::glimpse::Glimpse;
use super::jumps;
use super::track::{Track, pooled_spacing};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// The walk is analysed again whenever time since first light has grown by this factor: what it costs in all stays
/// proportional to the number of glimpses, and what is known changes little in between.
const AGAIN_AFTER: f64 = 1.02;

/// Points of a chart.
const CHART_POINTS: usize = 200;

/// What the recipe asks of a warm-up.
#[derive(Debug, Clone, PartialEq)]
pub struct WarmupSettings {
    /// Mode spacing of the type, Hz: used until some were measured.
    pub nominal_spacing: f64,
    /// Walk that may be left, mode spacings …
    pub residual_walk: f64,
    /// … over this time, s.
    pub horizon: f64,
    /// Whole walk cycles that must have been seen.
    pub cycles: f64,
}

/// A warm-up being watched.
#[derive(Debug, Clone)]
pub struct Warmup {
    settings: WarmupSettings,
    glimpses: Vec<Glimpse>,
    /// Glimpses that the next analysis uses.
    due: usize,
    analysis: OnceLock<Analysis>,
}

/// What is known of a warm-up.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct WarmupState {
    /// Mode spacings walked from first light to the last glimpse, sudden jumps taken out. The part before the first
    /// glimpse is taken from the fit; where [`Self::early_unknown`], it counts from the first glimpse that could be
    /// followed.
    pub walked: f64,
    /// Its standard uncertainty.
    pub u_walked: f64,
    /// Whole cycles really seen, from the first glimpse that could be followed.
    pub cycles_seen: f64,
    /// Time constant of the walk (of its slow part where there is a fast one), s.
    pub tau: Option<Measured>,
    /// Whole walk expected from first light, mode spacings.
    pub n_infinity: Option<Measured>,
    /// Time constant, s, and share of the fast part, where one is significant at 0.1 %.
    pub fast_part: Option<(f64, f64)>,
    /// Earliest time after which the upper 95 % prediction of the walk over the horizon stays below the bound, s since
    /// first light.
    pub ready: Option<Measured>,
    /// Expected walk over the horizon from the last glimpse on, mode spacings.
    pub residual: Option<f64>,
    /// Upper 95 % prediction of that walk.
    pub residual_upper: Option<f64>,
    /// Rate of walk at the last glimpse, Hz/s, positive as the tube grows.
    pub rate: Option<Measured>,
    /// Nothing more to wait for: residual walk inside its bound and the wanted cycles seen.
    pub settled: bool,
    /// The stream was too slow at the start: early cycles are unknown.
    pub early_unknown: bool,
    /// Mode spacing the walk is counted in, Hz.
    pub spacing: f64,
    /// (s since first light, mode spacings walked), thinned for a chart.
    pub points: Vec<(f64, f64)>,
    /// The same as fitted and predicted, to one horizon ahead.
    pub prediction: Vec<(f64, f64)>,
}

/// What a set of glimpses says; independent of when it is asked for.
#[derive(Debug, Clone)]
struct Analysis {
    walk: Vec<WalkPoint>,
    decay: Option<Decay>,
    /// Times at which upper and expected residual walk come inside the bound.
    ready: Option<(f64, f64)>,
    early_unknown: bool,
    spacing: f64,
}

impl Warmup {
    /// Nothing seen yet.
    pub fn new(settings: WarmupSettings) -> Self {
        Self { settings, glimpses: Vec::new(), due: 0, analysis: OnceLock::new() }
    }

    /// Takes the next glimpse, in order of time. Glimpses without modes, and ones not later than the last, are passed
    /// over.
    pub fn take(&mut self, glimpse: &Glimpse) {
        if !glimpse.is_usable() || self.glimpses.last().is_some_and(|last| glimpse.at <= last.at) {
            return;
        }
        self.glimpses.push(glimpse.clone());
        let analysed_to =
            self.due.checked_sub(1).and_then(|i| self.glimpses.get(i)).map_or(f64::NEG_INFINITY, |g| g.at);
        if glimpse.at >= AGAIN_AFTER * analysed_to {
            self.due = self.glimpses.len();
            self.analysis = OnceLock::new();
        }
    }

    /// Analyses every glimpse taken, as at the end of a dwell.
    pub fn finish(&mut self) {
        if self.due < self.glimpses.len() {
            self.due = self.glimpses.len();
            self.analysis = OnceLock::new();
        }
    }

    /// What is known now. The same glimpses give the same state, whatever was asked in between.
    pub fn state(&self) -> WarmupState {
        let analysis = self.analysis();
        let Some(last) = self.glimpses.last() else {
            return WarmupState { spacing: self.settings.nominal_spacing, ..WarmupState::default() };
        };
        let seen = analysis.seen_at(last.at);
        let mut state = WarmupState {
            cycles_seen: seen,
            walked: seen,
            u_walked: analysis.walk.last().map_or(0.0, |p| p.u),
            early_unknown: analysis.early_unknown,
            spacing: analysis.spacing,
            ..WarmupState::default()
        };
        if let Some(decay) = &analysis.decay {
            self.fill(&mut state, decay, last.at);
        }
        let shift = state.walked - seen;
        state.points = thinned(&analysis.walk).map(|p| (p.at, p.walked + shift)).collect();
        state
    }

    fn fill(&self, state: &mut WarmupState, decay: &Decay, now: f64) {
        let settings = &self.settings;
        let (origin, u_origin) = decay.origin();
        if !state.early_unknown {
            state.walked += origin;
            state.u_walked = state.u_walked.hypot(u_origin);
        }
        let scatter = |value: f64, u: f64| {
            Measured::with_line(
                value,
                BudgetLine::direct("scatter", "scatter of the walk about its fit", Evaluation::TypeA, u, decay.dof),
            )
        };
        let mut tau = scatter(decay.tau(), decay.u_tau());
        tau.budget.push(BudgetLine::direct(
            "form",
            "form of the walk: without its first fifth",
            Evaluation::TypeB,
            decay.u_form,
            f64::INFINITY,
        ));
        state.tau = Some(tau);
        state.n_infinity = Some(scatter(decay.n_infinity(), decay.u_n_infinity()));
        state.fast_part = decay.fast_part();
        let (rate, u_rate) = decay.rate(now);
        state.rate = Some(scatter(rate * state.spacing, u_rate * state.spacing));
        let upper = decay.residual_upper(now, settings.horizon);
        state.residual = Some(decay.residual(now, settings.horizon));
        state.residual_upper = Some(upper);
        state.settled = upper < settings.residual_walk && state.cycles_seen >= settings.cycles;
        let ready = self.analysis().ready;
        state.ready = ready.map(|(upper, expected)| scatter(upper, (upper - expected) / decay.t95()));
        let shift = if state.early_unknown { origin } else { 0.0 };
        let end = now + settings.horizon;
        state.prediction = (0..=CHART_POINTS)
            .map(|k| end * k as f64 / CHART_POINTS as f64)
            .map(|at| (at, decay.walked(at) - shift))
            .collect();
    }

    /// Time window (from, to), s since first light, of the last `n` whole walk cycles; `None` where fewer were seen.
    pub fn last_cycles(&self, n: f64) -> Option<(f64, f64)> {
        let walk = &self.analysis().walk;
        let last = walk.last()?;
        let wanted = last.walked - n;
        let before = walk.iter().rposition(|p| p.walked <= wanted)?;
        let (p, q) = (&walk[before], walk.get(before + 1).unwrap_or(last));
        let share = if q.walked > p.walked { (wanted - p.walked) / (q.walked - p.walked) } else { 0.0 };
        Some((p.at + share * (q.at - p.at), last.at))
    }

    /// Expected seconds until settled, by the present fit; 0 when settled.
    pub fn remaining(&self) -> Option<f64> {
        let last = self.glimpses.last()?;
        let analysis = self.analysis();
        let decay = analysis.decay.as_ref()?;
        let seen = analysis.seen_at(last.at);
        let ready = analysis.ready?.0.max(last.at);
        // The wanted cycles count from the first glimpse that could be followed.
        let start = decay.walked(last.at) - seen;
        let wanted = start + self.settings.cycles;
        let cycles = decay.time_below(-wanted, |d, at| -d.walked(at))?.max(last.at);
        Some(ready.max(cycles) - last.at)
    }

    /// Glimpses taken, in order.
    pub fn glimpses(&self) -> &[Glimpse] {
        &self.glimpses
    }

    fn analysis(&self) -> &Analysis {
        self.analysis.get_or_init(|| Analysis::of(&self.glimpses[..self.due], &self.settings))
    }
}

impl Analysis {
    fn of(glimpses: &[Glimpse], settings: &WarmupSettings) -> Self {
        let spacing = pooled_spacing(glimpses, settings.nominal_spacing);
        let track = Track::follow(glimpses, spacing);
        let jumps = jumps::find(&track);
        let removed = |i: usize| jumps.iter().take_while(|j| j.point <= i).map(|j| j.size).sum::<f64>();
        let direction = track.direction(removed);
        let first = track.points.first().map_or(0.0, |p| p.phase);
        let walk: Vec<WalkPoint> = track
            .points
            .iter()
            .enumerate()
            .map(|(i, p)| WalkPoint {
                at: p.at,
                walked: direction * (p.phase - first - removed(i)),
                u: p.u_phase.max(track.scatter).max(1e-9),
            })
            .collect();
        let decay = Decay::fit(&walk);
        let (bound, horizon) = (settings.residual_walk, settings.horizon);
        let ready = decay.as_ref().and_then(|d| {
            let upper = d.time_below(bound, |d, at| d.residual_upper(at, horizon))?;
            Some((upper, d.time_below(bound, |d, at| d.residual(at, horizon))?))
        });
        Self { decay, ready, early_unknown: track.early_unknown, spacing, walk }
    }

    /// Walk seen up to `at`: measured up to the last glimpse analysed, by the fit over the short time since.
    fn seen_at(&self, at: f64) -> f64 {
        let Some(last) = self.walk.last() else { return 0.0 };
        last.walked + self.decay.as_ref().map_or(0.0, |d| d.walked(at) - d.walked(last.at))
    }
}

fn thinned(walk: &[WalkPoint]) -> impl Iterator<Item = &WalkPoint> {
    let step = walk.len().div_ceil(CHART_POINTS).max(1);
    let last = walk.len().saturating_sub(1);
    walk.iter().enumerate().filter(move |(i, _)| i % step == 0 || *i == last).map(|(_, p)| p)
}

#[cfg(test)]
#[path = "warmup_tests.rs"]
mod tests;
