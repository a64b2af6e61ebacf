//! A tube that a rack warmed: since when it burns, when its dwell is over, and what such a run cannot show.
//! Must not fit or judge.
//! Main type: [`Rack`].

use chrono::{DateTime, FixedOffset, NaiveDateTime};

use super::Run;
use crate::{
    behaviour::{Rest, WarmupState, rest},
    limits::Limits,
    phrase::{Saying, minute, reasons},
    recipe,
    record::{
        event::Identity,
        sheet::{Row, Value},
    },
};

/// Share of the wanted cycles that is watched.
const MARGIN: f64 = 1.02;

/// Where a tube comes from that burns already.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Rack {
    /// Date and time of day since when it burns.
    since: NaiveDateTime,
    /// How long it burnt when the run was opened, s.
    pub age_s: f64,
}

impl Rack {
    /// None for a tube that is struck here.
    pub fn of(identity: &Identity, opened_at: Option<DateTime<FixedOffset>>) -> Option<Self> {
        let since = DateTime::parse_from_rfc3339(identity.lit_since.as_deref()?).ok()?;
        let age_s = opened_at.map_or(0.0, |at| (at - since).num_milliseconds() as f64 / 1e3).max(0.0);
        Some(Self { since: since.naive_local(), age_s })
    }

    /// Why its strike and its warm-up have no rows.
    pub fn reason(&self) -> Saying {
        reasons::FROM_RACK.with([minute(self.since)])
    }

    /// The same for a reader of the sheet.
    pub fn sentence(&self) -> Saying {
        reasons::FROM_RACK_REMARK.with([minute(self.since)])
    }
}

/// What the walk seen so far says on the walk to come; none before the recipe's shortest look is over.
pub(super) fn resting(state: &WarmupState, keys: &recipe::Dwell) -> Option<Rest> {
    rest(&state.points, keys.rest_for_s, keys.horizon_s)
}

/// At rest: the walk to come is inside the recipe's bound.
pub(super) fn is_at_rest(state: &WarmupState, keys: &recipe::Dwell) -> bool {
    resting(state, keys).is_some_and(|rest| rest.upper < keys.residual_walk)
}

/// Nothing more to wait for: at rest, and the whole cycles wanted were seen or cannot come before `longest`. The rate of
/// a warm-up only falls: at its upper bound, and no faster, the comb can walk in the time left.
pub(super) fn is_over(state: &WarmupState, keys: &recipe::Dwell) -> bool {
    let Some(rest) = resting(state, keys).filter(|rest| rest.upper < keys.residual_walk) else { return false };
    let seconds = state.points.last().map_or(0.0, |point| point.0);
    // A whole cycle must still be one when its ends are drawn again on the final axis.
    let wanted = MARGIN * keys.rack_cycles - state.cycles_seen;
    wanted <= 0.0 || rest.rate_upper * (keys.longest_s - seconds).max(0.0) < wanted
}

/// Empties what a walk of less than one cycle cannot show: a swap comes back once a cycle, at its own detuning.
pub(super) fn empty_unseen(rows: &mut [Row]) {
    let watched = rows.iter().find(|row| row.measurand == "cycles_watched").map(|row| row.value.clone());
    let under_one = matches!(watched, Some(Value::Number { value, .. }) if value.abs() < 1.0);
    for row in rows.iter_mut().filter(|row| under_one && row.measurand == "swap_count") {
        if matches!(row.value, Value::Count { value: 0, .. }) {
            row.value = Value::Absent((&reasons::RACK_NO_CYCLE).into());
            row.note = Saying::none();
        }
    }
}

/// The limits without those that do not bind a tube from the rack (`rack = "skip"`), where the rack is why there is no
/// value; their rows say so.
pub(super) fn limits(run: &Run, rows: &mut [Row]) -> Limits {
    let mut left = run.plan.limits.clone();
    let Some(rack) = &run.book.rack else { return left };
    let hidden = [rack.reason(), (&reasons::RACK_NO_CYCLE).into()];
    for limit in run.plan.limits.limits.iter().filter(|limit| limit.rack_skips) {
        let unseen = |row: &&mut Row| {
            row.measurand == limit.measurand && matches!(&row.value, Value::Absent(why) if hidden.contains(why))
        };
        if let Some(row) = rows.iter_mut().find(unseen) {
            row.note = (&reasons::RACK_NOT_JUDGED).into();
            left.limits.retain(|other| other.measurand != limit.measurand);
        }
    }
    left
}
