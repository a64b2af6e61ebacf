//! Hops and swaps, over a dwell or over captures of its own at rest.
//! Must not look for them itself: `behaviour` does.
//! Main type: [`Watch`].

use super::{Given, Room, Step, Wish};
use crate::{
    behaviour::{Glimpse, Hop, Swap, watch},
    numerics::summary,
    phrase::{Piece, Saying, figure, list, name, reasons, said, verdict},
    recipe,
    run::{
        filled::Filled,
        grid::Grid,
        notebook::{Kept, Notebook},
    },
    uncertainty::{BudgetLine, Evaluation, Measured},
};

const KEYS: [&str; 3] = ["hop_count", "swap_count", "cycles_watched"];
/// Samples of a capture at rest: short ones, as in a dwell.
const SAMPLES: usize = 2_000;
/// −ln 0.05: with none seen, the expected number is below this with 95 % (Poisson).
const NONE_SEEN: f64 = 2.9957;

/// Hops or swaps that a note names one by one; the chart of the walk shows all.
const NAMED: usize = 4;

/// The step.
pub(super) struct Watch {
    keys: recipe::Watch,
    grid: Grid,
    next_ms: u64,
    end_ms: u64,
    n_lost: u64,
    done: bool,
    filled: Vec<Filled>,
}

impl Watch {
    pub fn new(keys: &recipe::Watch) -> Self {
        let grid = Grid::new(0, keys.every_s, 0.0, keys.every_s);
        Self { keys: keys.clone(), grid, next_ms: 0, end_ms: 0, n_lost: 0, done: false, filled: Vec::new() }
    }

    fn go_on(&mut self, room: &mut Room<'_>) {
        self.next_ms = self.grid.after(self.next_ms.max(room.now_ms));
        if self.next_ms > self.end_ms {
            self.finish(room);
        }
    }

    fn finish(&mut self, room: &mut Room<'_>) {
        self.done = true;
        let from = self.keys.from.as_deref().unwrap_or(room.step);
        let over_dwell = room.book.dwelt(from).is_some();
        if !over_dwell {
            room.book.redraw(from);
        }
        let glimpses: Vec<Glimpse> = room.book.of(from).iter().map(|seen| seen.glimpse.clone()).collect();
        let (Some(first), Some(last)) = (glimpses.first(), glimpses.last()) else {
            self.filled = KEYS.map(|key| Filled::absent(key, &reasons::NOT_WATCHED)).to_vec();
            return;
        };
        let spacing = room.book.spacing.as_ref().map_or(room.plan.recipe.nominal_spacing, |spacing| spacing.value);
        let watched = watch(&glimpses, spacing);
        let seconds = last.at - first.at;
        let hops = match watched.unattributed.first() {
            Some(hop) => Filled::absent(
                KEYS[0],
                reasons::UNATTRIBUTED.with([figure(format!("{:.1}", hop.size / 1e6)), at_second(hop.at)]),
            ),
            None => counted(KEYS[0], watched.hops.len(), seconds, hops_named(&watched.hops)),
        };
        let swaps = if watched.axes_seen {
            counted(KEYS[1], watched.swaps.len(), seconds, swaps_named(&watched.swaps, watched.cycles))
        } else {
            let crossed = glimpses.iter().any(|glimpse| glimpse.modes.iter().any(|mode| mode.crossed.is_some()));
            let reason = if crossed { &reasons::AXES_ALIKE } else { &reasons::NO_CROSSED };
            Filled::absent(KEYS[1], reason)
        };
        let u = phase_u(first, spacing).hypot(phase_u(last, spacing));
        let line = BudgetLine::direct("walk", "tube phase at both ends", Evaluation::TypeA, u, f64::INFINITY);
        self.filled = vec![hops, swaps, Filled::number(KEYS[2], &Measured::with_line(watched.cycles, line))];
        if over_dwell {
            room.book.hops = watched.hops;
            room.book.swaps = watched.swaps;
        }
        if self.n_lost > 0 {
            let step = room.step;
            room.book.remark(reasons::UNREADABLE.with([figure(self.n_lost), name(step)]));
        }
    }
}

/// A count with when they were, or with what none says about the rate.
fn counted(key: &str, n: usize, seconds: f64, named: Saying) -> Filled {
    let n = n as u64;
    let row = Filled::count(key, n, n, n);
    if n == 0 && seconds > 0.0 {
        let an_hour = (NONE_SEEN * 3600.0 / seconds).ceil();
        row.noted(reasons::NONE_IN.with([figure(format!("{:.1}", seconds / 60.0)), figure(format!("{an_hour:.0}"))]))
    } else {
        row.noted(named)
    }
}

/// When each hop was and how far it went, modulo one spacing: "at 150.8 s (+210 MHz), …".
fn hops_named(hops: &[Hop]) -> Saying {
    let named = hops.iter().take(NAMED).map(|hop| reasons::AT_BY.with([at_second(hop.at), signed_megahertz(hop.size)]));
    and_more(named.collect(), hops.len())
}

/// When each swap was; of many, also how many a cycle and at what detuning: a tube that swaps does so at one place.
fn swaps_named(swaps: &[Swap], cycles: f64) -> Saying {
    let named = swaps.iter().take(NAMED).map(|swap| reasons::AT.with([at_second(swap.at)]));
    let named = and_more(named.collect(), swaps.len());
    if swaps.len() <= NAMED || cycles <= 0.0 {
        return named;
    }
    let a_cycle = figure(format!("{:.1}", swaps.len() as f64 / cycles));
    match summary::median(&swaps.iter().filter_map(|swap| swap.detuning).collect::<Vec<f64>>()) {
        Some(detuning) => reasons::A_CYCLE_AT.with([a_cycle, signed_megahertz(detuning), said(named)]),
        None => reasons::A_CYCLE.with([a_cycle, said(named)]),
    }
}

fn and_more(named: Vec<Saying>, n: usize) -> Saying {
    let more = n.saturating_sub(named.len());
    let named = list(named, &verdict::COMMA);
    if more > 0 { reasons::LIST_AND_MORE.with([named, figure(more)]) } else { Saying::of(named) }
}

fn at_second(at: f64) -> Piece {
    figure(format!("{at:.1}"))
}

fn signed_megahertz(hertz: f64) -> Piece {
    figure(format!("{:+.0} MHz", hertz / 1e6))
}

/// Standard uncertainty of the comb's phase in one capture, in spacings.
fn phase_u(glimpse: &Glimpse, spacing: f64) -> f64 {
    let weights: f64 = glimpse.modes.iter().filter(|m| m.u_position > 0.0).map(|m| m.u_position.powi(-2)).sum();
    if weights > 0.0 && spacing > 0.0 { weights.sqrt().recip() / spacing } else { 0.0 }
}

impl Step for Watch {
    fn begin(&mut self, room: &mut Room<'_>) {
        match (&self.keys.from, self.keys.for_s) {
            (None, Some(seconds)) => {
                self.grid = Grid::new(room.now_ms, self.keys.every_s, 0.0, self.keys.every_s);
                self.next_ms = self.grid.at_or_after(room.now_ms);
                // `as` saturates.
                self.end_ms = room.now_ms.saturating_add((seconds * 1e3) as u64);
            }
            _ => self.finish(room),
        }
    }

    fn wants(&self) -> Wish {
        if self.done {
            return Wish::Nothing;
        }
        Wish::Capture { not_before_ms: self.next_ms, samples: SAMPLES, keep: false, trace: false }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        match given {
            Given::Capture(captured) => self.n_lost += u64::from(room.book.keep(captured) == Kept::No),
            Given::Lost { for_good: true, .. } => return self.finish(room),
            Given::Lost { .. } => self.n_lost += 1,
            _ => {}
        }
        self.go_on(room);
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        let left = if self.done { 0.0 } else { self.end_ms.saturating_sub(self.next_ms) as f64 / 1e3 };
        Some(if self.end_ms == 0 { self.keys.for_s.unwrap_or(0.0) } else { left })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn hop(at: f64, size: f64) -> Hop {
        Hop { at, size, u_size: 1e6, attributed: true }
    }

    #[test]
    fn notes_name_when() {
        assert_eq!(
            hops_named(&[hop(150.83, 210.2e6), hop(161.0, -90e6)]).english(),
            "at 150.8 s (+210 MHz), at 161.0 s (-90 MHz)"
        );
        let swap = |at| Swap { at, detuning: Some(-180e6) };
        assert_eq!(swaps_named(&[swap(3.04), swap(9.0)], 4.0).english(), "at 3.0 s, at 9.0 s");
        let many: Vec<Swap> = (1..=6).map(|k| swap(f64::from(k))).collect();
        assert_eq!(
            swaps_named(&many, 6.0).english(),
            "1.0 a walk cycle, -180 MHz from the middle of the line; at 1.0 s, at 2.0 s, at 3.0 s, at 4.0 s and 2 more"
        );
    }

    #[test]
    fn none_seen_bounds_the_rate() {
        // 3.00 expected at most in a quarter of an hour: 12 an hour.
        assert!(counted(KEYS[0], 0, 900.0, Saying::none()).note.english().ends_with("fewer than 12 an hour (95 %)"));
    }
}
