//! The dwell: captures on a grid of times from first light until the walk has settled. It is no timer.
//! Must not fit anything itself: `behaviour` does.
//! Main type: [`Dwell`].

use super::{Given, Room, Step, Wish};
use crate::{
    behaviour::{Glimpse, Warmup, WarmupSettings, WarmupState, line_drift, tau_per_slope},
    phrase::{Saying, figure, name, reasons, said},
    recipe,
    run::{
        charts,
        filled::Filled,
        grid::Grid,
        notebook::{DwellEnd, Dwelt, Kept, Notebook},
        rack,
    },
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Two or more captures without light in between, the first and the last of them this far apart: a dark tube, ms. Time in which
/// nothing was captured (a pause, a wide grid) says nothing of the light.
const DARK_AFTER_MS: u64 = 30_000;
/// Standard uncertainty of the rate at which an interferometer's body moves, Hz/s: aluminium moves 1,090 MHz for 0.1 K
/// (`measurement.md` 8), taken as within 0.1 K an hour, rectangular (the hour from memory).
pub(super) const U_DRIFT: f64 = 1.09e9 / 3600.0 / 1.732_050_8;
const KEYS: [&str; 5] = ["warmup_tau", "warmup_ready", "walk_cycles", "walk_growth", "walk_rate"];

/// The step.
pub(super) struct Dwell {
    keys: recipe::Dwell,
    grid: Grid,
    next_ms: u64,
    wavelength: f64,
    /// Monotonic ms of the first dark capture since light was last seen.
    dark_since_ms: Option<u64>,
    any_light: bool,
    any_dark: bool,
    n_lost: u64,
    /// Why the first of them was lost.
    first_lost: Option<Saying>,
    begun: bool,
    done: bool,
    filled: Vec<Filled>,
}

impl Dwell {
    pub fn new(keys: &recipe::Dwell) -> Self {
        Self {
            grid: Grid::new(0, keys.early_every_s, keys.early_for_s, keys.every_s),
            keys: keys.clone(),
            next_ms: 0,
            wavelength: 0.0,
            dark_since_ms: None,
            any_light: false,
            any_dark: false,
            n_lost: 0,
            first_lost: None,
            begun: false,
            done: false,
            filled: Vec::new(),
        }
    }

    /// Goes on to the next time of the grid, or ends at `longest`.
    fn go_on(&mut self, room: &mut Room<'_>) {
        self.next_ms = self.grid.after(self.next_ms.max(room.now_ms));
        let first = room.book.first_light_ms.unwrap_or(0);
        if self.next_ms.saturating_sub(first) as f64 > self.keys.longest_s * 1e3 {
            self.end(DwellEnd::Longest, room);
        }
    }

    fn lose(&mut self, why: impl Into<Saying>) {
        self.n_lost += 1;
        self.first_lost.get_or_insert_with(|| why.into());
    }

    fn captured(&mut self, captured: &crate::record::event::Captured, room: &mut Room<'_>) {
        if captured.finding.dark {
            self.any_dark = true;
            let since_ms = *self.dark_since_ms.get_or_insert(room.now_ms);
            if room.now_ms.saturating_sub(since_ms) >= DARK_AFTER_MS {
                return self.end(DwellEnd::Dark, room);
            }
            return self.go_on(room);
        }
        let kept = room.book.keep(captured);
        if kept == Kept::No {
            match &captured.finding.refused {
                Some(reason) => self.lose(Saying::outside(reason)),
                None => self.lose(&reasons::OUT_OF_ORDER),
            }
            return self.go_on(room);
        }
        self.dark_since_ms = None;
        self.any_light = true;
        if kept == Kept::Redrawn {
            self.follow_again(room);
        }
        if self.settled(kept, room) { self.end(DwellEnd::Settled, room) } else { self.go_on(room) }
    }

    /// Asks whether the dwell is over, once the warm-up has the last capture.
    fn settled(&self, kept: Kept, room: &mut Room<'_>) -> bool {
        let Some(glimpse) = room.book.of(room.step).last().map(|seen| seen.glimpse.clone()) else { return false };
        let step = room.step;
        let Some(dwelt) = room.book.dwells.iter_mut().find(|dwelt| dwelt.step == step) else { return false };
        if kept == Kept::Added {
            dwelt.warmup.take(&glimpse);
        }
        dwelt.seconds = glimpse.at;
        let state = dwelt.warmup.state();
        if room.book.rack.is_some() {
            return rack::is_over(&state, &self.keys);
        }
        // A time constant known to no better than a half predicts nothing: a walk misread early must not end the dwell.
        let tau_known = state.tau.as_ref().is_none_or(|tau| tau.expanded() <= 0.5 * tau.value.abs());
        // What strayed from the fit over the last horizon (a draught) may stray again over the next.
        let upper = state.residual_upper.unwrap_or(0.0) + strayed(&state, self.keys.horizon_s);
        state.settled && tau_known && upper < self.keys.residual_walk
    }

    /// Follows the warm-up from its beginning again, after its positions were drawn anew.
    fn follow_again(&self, room: &mut Room<'_>) {
        let mut warmup = Warmup::new(self.settings(room));
        for seen in room.book.of(room.step) {
            warmup.take(&seen.glimpse);
        }
        let step = room.step;
        if let Some(dwelt) = room.book.dwells.iter_mut().find(|dwelt| dwelt.step == step) {
            dwelt.warmup = warmup;
        }
    }

    fn settings(&self, room: &Room<'_>) -> WarmupSettings {
        WarmupSettings {
            nominal_spacing: room.plan.recipe.nominal_spacing,
            residual_walk: self.keys.residual_walk,
            horizon: self.keys.horizon_s,
            cycles: self.keys.cycles,
        }
    }

    fn end(&mut self, end: DwellEnd, room: &mut Room<'_>) {
        self.done = true;
        let step = room.step;
        room.book.redraw(step);
        self.follow_again(room);
        let now = room.book.since_first_light(room.now_ms as f64 / 1e3);
        let from_rack = room.book.rack.is_some();
        let Some(dwelt) = room.book.dwells.iter_mut().find(|dwelt| dwelt.step == step) else { return };
        // At rest without the cycles wanted is at rest all the same.
        let at_rest = from_rack && end == DwellEnd::Longest && rack::is_at_rest(&dwelt.warmup.state(), &self.keys);
        let end = if at_rest { DwellEnd::Settled } else { end };
        dwelt.end = Some(end);
        if end != DwellEnd::SourceEnded || dwelt.seconds <= 0.0 {
            dwelt.seconds = now.max(dwelt.seconds);
        }
        dwelt.warmup.finish();
        let state = dwelt.warmup.state();
        let longest = self.keys.longest_s / 60.0;
        if from_rack && end == DwellEnd::Settled && state.cycles_seen < self.keys.rack_cycles {
            room.book.holds.push((&reasons::RACK_NO_CYCLE_HOLD).into());
        }
        match end {
            DwellEnd::Dark => room.book.dark = Some((&reasons::NO_LIGHT_FOR).into()),
            DwellEnd::Longest => {
                room.book.remark(reasons::NOT_SETTLED_REMARK.with([figure(format!("{longest:.0}"))]));
            }
            DwellEnd::SourceEnded if self.any_dark && !self.any_light => {
                room.book.dark = Some((&reasons::NO_LIGHT_IN_DWELL).into());
            }
            _ => {}
        }
        if self.n_lost > 0 {
            let why = said(self.first_lost.clone().unwrap_or_default());
            room.book.remark(reasons::UNREADABLE_FIRST.with([figure(self.n_lost), name(step), why]));
        }
        if room.book.dark.is_none() {
            self.filled = match &room.book.rack {
                Some(rack) => self.rack_rows(&rack.reason(), &state, room),
                None => self.rows(end, &state, room),
            };
            room.book.gain_chart = charts::gain_chart(room.book, step, room.plan.recipe.nominal_spacing);
        }
    }

    /// Of a tube from the rack only the rate at rest was seen here.
    fn rack_rows(&self, reason: &Saying, state: &WarmupState, room: &Room<'_>) -> Vec<Filled> {
        let glimpses: Vec<Glimpse> = room.book.of(room.step).iter().map(|seen| seen.glimpse.clone()).collect();
        let drift = Drift::new(state, room.plan.recipe.nominal_spacing, &glimpses);
        let rate = rack::resting(state, &self.keys).map(|rest| {
            let u = rest.u_rate * state.spacing;
            let line =
                BudgetLine::direct("scatter", "scatter of the walk at rest", Evaluation::TypeA, u, f64::INFINITY);
            drift.on(Measured::with_line(rest.rate * state.spacing, line), 1.0)
        });
        let mut rows: Vec<Filled> = KEYS[..4].iter().map(|key| Filled::absent(key, reason.clone())).collect();
        rows.push(some_number(KEYS[4], rate.as_ref(), &(&reasons::NO_RATE).into()));
        rows
    }

    fn rows(&self, end: DwellEnd, state: &WarmupState, room: &Room<'_>) -> Vec<Filled> {
        let why = why_empty(end, &self.keys, state);
        let mut rows = Vec::new();
        let settled = end == DwellEnd::Settled || (end == DwellEnd::SourceEnded && state.settled);
        let tau_stands = settled || end == DwellEnd::SourceEnded;
        let glimpses: Vec<Glimpse> = room.book.of(room.step).iter().map(|seen| seen.glimpse.clone()).collect();
        let drift = Drift::new(state, room.plan.recipe.nominal_spacing, &glimpses);
        let tau = state.tau.clone().map(|tau| drift.on(tau, drift.tau));
        let ready = state.ready.clone().map(|ready| drift.on(ready, drift.ready));
        rows.push(some_number(KEYS[0], tau.as_ref().filter(|_| tau_stands), &why));
        rows.push(some_number(KEYS[1], ready.as_ref().filter(|_| settled), &why));
        if self.any_light && state.walked.is_finite() && !room.book.of(room.step).is_empty() {
            let line =
                BudgetLine::direct("walk", "tube phase at both ends", Evaluation::TypeA, state.u_walked, f64::INFINITY);
            let cycles = drift.on(Measured::with_line(state.walked, line), drift.walked);
            let note = if state.early_unknown { (&reasons::EARLY_UNKNOWN).into() } else { Saying::none() };
            rows.push(Filled::number(KEYS[2], &cycles).noted(note.clone()));
            rows.push(Filled::number(KEYS[3], &cycles.scaled(self.wavelength / 2.0)).noted(note));
        }
        let rate = state.rate.clone().map(|rate| drift.on(rate, 1.0));
        rows.push(some_number(KEYS[4], rate.as_ref(), &Saying::from(&reasons::NO_RATE)));
        rows
    }
}

/// Greatest less least departure of the walk from its fit over the last horizon, mode spacings; 0 without a fit.
fn strayed(state: &WarmupState, horizon: f64) -> f64 {
    let Some((last, _)) = state.points.last() else { return 0.0 };
    let (mut least, mut greatest) = (f64::INFINITY, f64::NEG_INFINITY);
    for (at, walked) in state.points.iter().filter(|(at, _)| *at >= last - horizon) {
        let after = state.prediction.partition_point(|(time, _)| time < at).max(1);
        let (Some(left), Some(right)) = (state.prediction.get(after - 1), state.prediction.get(after)) else {
            continue;
        };
        let share = if right.0 > left.0 { (at - left.0) / (right.0 - left.0) } else { 0.0 };
        let departure = walked - (left.1 + share * (right.1 - left.1));
        (least, greatest) = (least.min(departure), greatest.max(departure));
    }
    if greatest >= least { greatest - least } else { 0.0 }
}

/// What a steady drift of the interferometer does to the findings of a dwell: ∂(value)/∂(drift), and how large it may be.
struct Drift {
    /// Standard uncertainty of the drift, Hz/s.
    u: f64,
    words: &'static str,
    tau: f64,
    ready: f64,
    walked: f64,
}

impl Drift {
    fn new(state: &WarmupState, spacing: f64, glimpses: &[Glimpse]) -> Self {
        let seconds = state.points.last().map_or(0.0, |point| point.0);
        let fit = state.tau.as_ref().zip(state.n_infinity.as_ref());
        let tau = fit.and_then(|(tau, n)| tau_per_slope(tau.value, n.value, seconds)).unwrap_or(0.0) / spacing;
        // The end moves with the time constant that it is counted in.
        let ready = fit.zip(state.ready.as_ref()).map_or(0.0, |((t, _), ready)| tau * ready.value / t.value);
        // The tube's gain line stands still: what it moved on the scan axis is the interferometer's. The walk is not
        // corrected for it, so all of it stays in the budget.
        let seen = line_drift(glimpses, spacing).map(|drift| drift.value.hypot(drift.u())).filter(|u| *u < U_DRIFT);
        let words = if seen.is_some() {
            "drift of the interferometer, from its gain line"
        } else {
            "drift of the interferometer"
        };
        Self { u: seen.unwrap_or(U_DRIFT), words, tau, ready, walked: seconds / spacing }
    }

    /// Peak positions alone cannot tell the tube's walk from the interferometer's.
    fn on(&self, mut measured: Measured, per_drift: f64) -> Measured {
        let source = "interferometer drift";
        let mut line = BudgetLine::direct(source, self.words, Evaluation::TypeB, self.u, f64::INFINITY);
        line.sensitivity = per_drift;
        measured.budget.push(line);
        measured
    }
}

fn some_number(key: &str, measured: Option<&Measured>, why: &Saying) -> Filled {
    measured.map_or_else(|| Filled::absent(key, why.clone()), |measured| Filled::number(key, measured))
}

fn why_empty(end: DwellEnd, keys: &recipe::Dwell, state: &WarmupState) -> Saying {
    // The same as what the end of the dwell hangs on: what strayed from the fit may stray again.
    let residual = state.residual_upper.map(|residual| residual + strayed(state, keys.horizon_s));
    let residual = residual.filter(|residual| residual.is_finite());
    let residual = residual.map(|cycles| figure(format!("{cycles:.1}")));
    let longest = figure(format!("{:.0}", keys.longest_s / 60.0));
    match (end, residual) {
        (DwellEnd::Longest, Some(residual)) => reasons::NOT_SETTLED_PREDICTED.with([longest, residual]),
        (DwellEnd::Longest, None) => reasons::NOT_SETTLED.with([longest]),
        (DwellEnd::SourceEnded, Some(residual)) => reasons::ENDED_EARLY_PREDICTED.with([residual]),
        (DwellEnd::SourceEnded, None) => (&reasons::ENDED_EARLY).into(),
        _ => (&reasons::NO_FIT).into(),
    }
}

impl Step for Dwell {
    fn begin(&mut self, room: &mut Room<'_>) {
        let first_light = *room.book.first_light_ms.get_or_insert(room.now_ms);
        self.wavelength = room.plan.recipe.wavelength;
        // A tube from the rack walks slowly from the first capture on.
        let early_for = if room.book.rack.is_some() { 0.0 } else { self.keys.early_for_s };
        self.grid = Grid::new(first_light, self.keys.early_every_s, early_for, self.keys.every_s);
        // Without a strike, first light is now and so is the first capture.
        self.next_ms = self.grid.at_or_after(room.now_ms);
        self.begun = true;
        let settings = self.settings(room);
        room.book.dwells.push(Dwelt {
            step: room.step.into(),
            warmup: Warmup::new(settings),
            end: None,
            seconds: 0.0,
            cycles: self.keys.cycles,
            longest: self.keys.longest_s,
        });
    }

    fn wants(&self) -> Wish {
        if self.done {
            return Wish::Nothing;
        }
        Wish::Capture { not_before_ms: self.next_ms, samples: self.keys.samples, keep: false, trace: false }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        match given {
            Given::Capture(captured) => self.captured(captured, room),
            Given::Lost { for_good: true, reason } => {
                if !self.any_light && !self.any_dark {
                    let reason = self.first_lost.clone().unwrap_or_else(|| Saying::outside(reason));
                    self.filled = KEYS.iter().map(|key| Filled::absent(key, reason.clone())).collect();
                    self.done = true;
                } else {
                    self.end(DwellEnd::SourceEnded, room);
                }
            }
            Given::Lost { for_good: false, reason } => {
                self.lose(Saying::outside(reason));
                self.go_on(room);
            }
            _ => {}
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, book: &Notebook) -> Option<f64> {
        if self.done {
            return Some(0.0);
        }
        if !self.begun {
            return None;
        }
        book.dwells.iter().rfind(|dwelt| dwelt.end.is_none()).and_then(|dwelt| dwelt.warmup.remaining())
    }
}
