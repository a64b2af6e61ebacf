//! Whole captures at rest: mode spacing, mirror spacing, finesse, and the chart of one sweep.
//! Must not fit a sweep: findings come in.
//! Main type: [`Sweep`].

use super::{Given, Room, Step, Wish};
use crate::{
    phrase::{Saying, figure, list, name, reasons, said, verdict},
    recipe,
    record::event::Captured,
    run::{
        charts,
        filled::Filled,
        notebook::{Kept, Notebook},
        pool::pool,
        spacing,
    },
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Relative standard uncertainty of a finesse from one capture, where no scatter is seen (common practice).
const U_FINESSE: f64 = 0.05;

/// Expanded uncertainty at rest over that of the dwell from which on the dwell's captures give the spacing: where a tube
/// rests with one mode near threshold, or its modes near the turns of the ramp, few captures say little (found on sound
/// simulated tubes: 10–25 MHz where the dwell gives 4–6).
const SURER: f64 = 1.5;

/// Reasons shown on the sheet.
const SHOWN: usize = 3;

/// The step.
pub(super) struct Sweep {
    keys: recipe::Sweep,
    taken: u64,
    dark: u64,
    trace_all: bool,
    done: bool,
    finesse: Vec<f64>,
    /// Why captures are missing, first reason first.
    reasons: Vec<Saying>,
    filled: Vec<Filled>,
}

impl Sweep {
    pub fn new(keys: &recipe::Sweep) -> Self {
        Self {
            keys: keys.clone(),
            taken: 0,
            dark: 0,
            trace_all: false,
            done: false,
            finesse: Vec::new(),
            reasons: Vec::new(),
            filled: Vec::new(),
        }
    }

    fn captured(&mut self, captured: &Captured, room: &mut Room<'_>) {
        let finding = &captured.finding;
        self.dark += u64::from(finding.dark);
        match &finding.refused {
            Some(reason) => {
                let number = captured.number;
                let reason = Saying::outside(reason);
                self.reasons.push(of_capture(number, reason.clone()));
                // A verdict leans on these captures singly (`formats.md`: one that cannot be read gives hold).
                room.book.holds.push(verdict::CAPTURE_UNREADABLE.with([figure(number), said(reason)]));
            }
            None if finding.dark => self.reasons.push(of_capture(captured.number, &reasons::NO_LIGHT)),
            None => {
                if room.book.keep(captured) == Kept::No {
                    self.reasons.push(of_capture(captured.number, &reasons::OUT_OF_ORDER));
                }
                self.finesse.extend(finding.finesse.filter(|finesse| finesse.is_finite()));
                if let Some(chart) = charts::sweep_chart(captured, room) {
                    room.book.sweep_chart = Some(chart);
                }
            }
        }
    }

    fn finish(&mut self, room: &mut Room<'_>) {
        self.done = true;
        if self.dark > 0 && self.dark == self.taken {
            room.book.dark = Some(reasons::NO_LIGHT_IN_ANY.with([figure(self.dark)]));
            return;
        }
        let own = room.book.of(room.step);
        let n_own = own.len();
        let (pooled, from) = match (spacing::pooled(own), spacing::pooled(room.book.of_dwells())) {
            (Some(rest), Some(dwell)) if rest.measured.expanded() > SURER * dwell.measured.expanded() => {
                (Some(dwell), &reasons::OF_DWELL_SURER)
            }
            (Some(rest), _) => (Some(rest), &reasons::AT_REST),
            (None, dwell) if n_own > 0 => (dwell, &reasons::OF_DWELL_ONE_MODE),
            (None, dwell) => (dwell, &reasons::OF_DWELL_NONE),
        };
        match spacing::rows(pooled, from.into(), room.book) {
            Some(rows) => self.filled.extend(rows),
            None => {
                let reason = match self.reasons.first() {
                    Some(reason) if n_own == 0 => reason.clone(),
                    _ => (&reasons::NOT_TWO_MODES).into(),
                };
                self.filled.push(Filled::absent("mode_spacing", reason.clone()));
                self.filled.push(Filled::absent("mirror_spacing", reason));
            }
        }
        if self.finesse.is_empty() {
            // A folder may end in the dwell: its last whole cycles show the bench as well.
            let seen = room.book.of_dwells().filter_map(|seen| seen.finding.finesse);
            self.finesse.extend(seen.filter(|finesse| finesse.is_finite()));
        }
        self.filled.push(finesse(&self.finesse));
        if !self.reasons.is_empty() {
            let step = room.step;
            let more = self.reasons.len().saturating_sub(SHOWN);
            let more = (more > 0).then(|| reasons::AND_MORE.with([figure(more)]));
            let shown = self.reasons.iter().take(SHOWN).cloned().chain(more);
            room.book.remark(reasons::STEP.with([name(step), list(shown, &verdict::SEMICOLON)]));
        }
    }
}

/// What is to be said of one capture.
fn of_capture(number: u64, what: impl Into<Saying>) -> Saying {
    reasons::CAPTURE.with([figure(number), said(what)])
}

/// Mean over captures with its scatter.
fn finesse(values: &[f64]) -> Filled {
    let pairs: Vec<_> = values.iter().map(|value| (*value, &[][..])).collect();
    let Some(pooled) = pool(&pairs) else {
        return Filled::absent("finesse", &reasons::NO_FINESSE);
    };
    let mut measured = pooled.measured;
    if pooled.used == 1 {
        let u = U_FINESSE * measured.value;
        let line =
            BudgetLine::direct("one capture", "no scatter from one capture", Evaluation::TypeB, u, f64::INFINITY);
        measured = Measured::with_line(measured.value, line);
    }
    Filled::number("finesse", &measured)
}

impl Step for Sweep {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.trace_all = room.from_captures;
    }

    fn wants(&self) -> Wish {
        if self.done {
            return Wish::Nothing;
        }
        // Of a folder nobody knows which capture is the last.
        let trace = self.trace_all || self.taken + 1 >= self.keys.captures;
        Wish::Capture { not_before_ms: 0, samples: self.keys.samples, keep: self.keys.keep, trace }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        self.taken += 1;
        match given {
            Given::Capture(captured) => self.captured(captured, room),
            Given::Lost { reason, for_good } => {
                if !for_good {
                    let step = room.step;
                    let reason = Saying::outside(reason);
                    self.reasons.push(reason.clone());
                    room.book.holds.push(verdict::CAPTURE_NOT_HAD.with([name(step), said(reason)]));
                } else {
                    // The end of a folder is no capture.
                    self.taken -= 1;
                    if self.taken == 0 {
                        self.reasons.push(Saying::outside(reason));
                    }
                    return self.finish(room);
                }
            }
            _ => {}
        }
        if self.taken >= self.keys.captures {
            self.finish(room);
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        // About a second a capture on a bench (practice).
        Some(if self.done { 0.0 } else { self.keys.captures.saturating_sub(self.taken) as f64 })
    }
}
