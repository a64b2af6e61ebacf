//! Whether a bench gives verdicts: its certificates and its reference tubes at a moment, from what is frozen into a run.
//! Must not look anything up: checks come in.
//! Main functions: [`holds`], [`standings`], [`unclosed`].

use chrono::{DateTime, FixedOffset};
use chrono_tz::Tz;

use super::{
    file::{Reference, ReferenceValue, StationFile},
    shift::{Shift, shift_at},
};
use crate::{
    gauge::reference::{ALARM, Target, drifts, inside},
    measurand,
    phrase::{Piece, Saying, figure, minute, name, said, verdict::*, within},
    record::reference::{CheckedValue, ReferenceCheck},
};

/// How a reference tube stands at a moment.
#[derive(Debug, Clone, PartialEq)]
pub enum Standing {
    /// It was never checked since its values were assigned.
    Never,
    /// Its last check was inside its bounds, but before the shift began.
    Due {
        /// Start of the shift.
        since: DateTime<Tz>,
        /// The last check.
        last: DateTime<Tz>,
    },
    /// Its last check was out of bounds, or the sums of its checks show a drift.
    Out {
        /// The last check.
        last: DateTime<Tz>,
        /// In words.
        why: Saying,
    },
    /// Checked within the shift, and in bounds.
    Good {
        /// The last check.
        last: DateTime<Tz>,
    },
}

/// Targets of a reference tube, as `gauge` takes them.
pub fn targets(reference: &Reference) -> Vec<Target> {
    let target = |value: &ReferenceValue| Target {
        measurand: value.measurand.clone(),
        value: value.value,
        within: value.within,
        sd: value.sd,
    };
    reference.values.iter().map(target).collect()
}

/// Moment of a check in the zone of a station; none for one that no clock gave.
pub fn moment_of(station: &StationFile, check: &ReferenceCheck) -> Option<DateTime<Tz>> {
    Some(DateTime::parse_from_rfc3339(&check.at).ok()?.with_timezone(&station.time_zone))
}

/// The checks of one tube that count at a moment: not after it, not before its values were assigned; in the order of time.
pub fn counted<'a>(
    station: &StationFile,
    reference: &Reference,
    at: DateTime<FixedOffset>,
    checks: &'a [ReferenceCheck],
) -> Vec<(DateTime<Tz>, &'a ReferenceCheck)> {
    let own = checks.iter().filter(|check| check.serial == reference.serial);
    let mut own: Vec<_> = own.filter_map(|check| Some((moment_of(station, check)?, check))).collect();
    own.retain(|(moment, _)| *moment <= at && reference.since.is_none_or(|day| moment.date_naive() >= day));
    own.sort_by_key(|(moment, _)| *moment);
    own
}

/// What is wrong with a check, for people; none if all of it is in order.
pub fn out_of_bounds(reference: &Reference, check: &ReferenceCheck) -> Option<Saying> {
    targets(reference).iter().find_map(|target| match check.value(&target.measurand) {
        None => Some(CHECK_LACKS.with([label(&target.measurand)])),
        Some(found) if !inside(target, found.value) => Some(stray(target, found)),
        Some(CheckedValue { sums: Some(sums), .. }) if drifts(*sums) => {
            let sum = figure(format!("{:.1}", sums.0.max(sums.1)));
            Some(CHECK_DRIFTS.with([label(&target.measurand), sum, figure(ALARM)]))
        }
        Some(_) => None,
    })
}

fn label(key: &str) -> Piece {
    measurand::find(key).map_or_else(|| name(key), |measurand| within(&measurand.name))
}

/// "power 0.950 mW is 0.040 mW above 0.910 mW, and 0.027 mW is allowed".
fn stray(target: &Target, found: &CheckedValue) -> Saying {
    let shown = |si: f64| {
        figure(match measurand::find(&target.measurand) {
            Some(m) => format!("{:.*} {}", m.decimals, m.shown(si), m.unit().symbol).trim_end().to_owned(),
            None => si.to_string(),
        })
    };
    let side = if found.value < target.value { &CHECK_BELOW } else { &CHECK_ABOVE };
    let away = shown((found.value - target.value).abs());
    side.with([label(&target.measurand), shown(found.value), away, shown(target.value), shown(target.within)])
}

/// How every reference tube of a station stands, in the order of its file.
pub fn standings<'a>(
    station: &'a StationFile,
    at: DateTime<FixedOffset>,
    checks: &[ReferenceCheck],
) -> Vec<(&'a Reference, Standing)> {
    let shift = shift_at(&station.shifts, station.time_zone, at.with_timezone(&station.time_zone));
    let standing = |reference: &'a Reference| {
        let standing = match counted(station, reference, at, checks).last() {
            None => Standing::Never,
            Some((last, check)) => match (out_of_bounds(reference, check), shift) {
                (Some(why), _) => Standing::Out { last: *last, why },
                (None, Some(Shift { start, .. })) if *last < start => Standing::Due { since: start, last: *last },
                (None, _) => Standing::Good { last: *last },
            },
        };
        (reference, standing)
    };
    station.references.iter().map(standing).collect()
}

/// Why a bench gives no verdict on a tube at a moment, a sentence each; empty if it is in order.
///
/// * `checks`: at least the last one of every reference tube; none where nobody looked (an earlier version of the program).
pub fn holds(station: &StationFile, at: DateTime<FixedOffset>, checks: Option<&[ReferenceCheck]>) -> Vec<Saying> {
    let mut holds = station.overdue_on(at.date_naive());
    let standings = checks.map_or_else(Vec::new, |checks| standings(station, at, checks));
    holds.extend(standings.iter().filter_map(|(tube, standing)| sentence(&tube.serial, standing)));
    holds
}

/// A standing that holds, in words: what, since when or by how much, what to do.
fn sentence(serial: &str, standing: &Standing) -> Option<Saying> {
    let tube = name(serial);
    let at = |moment: &DateTime<Tz>| minute(moment.naive_local());
    Some(match standing {
        Standing::Good { .. } => return None,
        Standing::Never => NEVER_CHECKED.with([tube]),
        Standing::Due { since, last } => CHECK_DUE.with([tube, at(since), at(last)]),
        Standing::Out { last, why } => CHECK_OUT.with([tube, at(last), said(why.clone())]),
    })
}

/// Date and time of day in the station's zone.
pub fn clock(moment: &DateTime<Tz>) -> String {
    moment.format("%Y-%m-%d %H:%M").to_string()
}

/// The last shift before the present one in which there was a check, where it was not closed by one, a sentence for each
/// tube: only one check of the tube was made in it, or the last failed.
///
/// * `checks`: all of them, or at least those of that shift.
pub fn unclosed(station: &StationFile, at: DateTime<FixedOffset>, checks: &[ReferenceCheck]) -> Vec<String> {
    let shift_of = |moment: DateTime<Tz>| shift_at(&station.shifts, station.time_zone, moment);
    let Some(present) = shift_of(at.with_timezone(&station.time_zone)) else { return Vec::new() };
    let of_tube = |reference: &Reference| {
        let own = counted(station, reference, at, checks);
        let before: Vec<_> = own.into_iter().filter(|(moment, _)| *moment < present.start).collect();
        let (last, check) = before.last()?;
        let shift = shift_of(*last)?;
        let in_it = before.iter().filter(|(moment, _)| *moment >= shift.start).count();
        let (serial, from, to) = (&reference.serial, clock(&shift.start), clock(&shift.end));
        match out_of_bounds(reference, check) {
            Some(why) => Some(format!(
                "The shift {from} to {to} ended with reference tube {serial} out of bounds: {}; see `tubewright station`.",
                why.english()
            )),
            None if in_it < 2 => Some(format!(
                "The shift {from} to {to} has no end check of reference tube {serial}; see `tubewright station`."
            )),
            None => None,
        }
    };
    station.references.iter().filter_map(of_tube).collect()
}

#[cfg(test)]
#[path = "standing_tests.rs"]
mod tests;
