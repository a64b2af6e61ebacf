//! A bench in words, and as JSON.
//! Must not decide anything about it.
//! Main functions: [`text`], [`json`].

use chrono::{DateTime, FixedOffset};
use serde_json::json;

use super::{Bench, plot::plot};
use crate::{
    cli::{Failure, output},
    phrase::Saying,
    station::{
        file::{BeatNote, Reference},
        standing::{Standing, clock},
    },
};

/// Date and time of day at the bench.
pub(super) fn local(bench: &Bench, at: DateTime<FixedOffset>) -> String {
    clock(&at.with_timezone(&bench.station.time_zone))
}

/// For people.
pub(super) fn text(bench: &Bench) -> Result<(), Failure> {
    let station = &bench.station;
    let shift =
        bench.shift.map_or(String::new(), |shift| format!(", shift {} to {}", clock(&shift.start), clock(&shift.end)));
    output::result(&format!(
        "{} at {} ({}){shift}",
        station.station,
        local(bench, bench.at),
        station.time_zone.name()
    ))?;
    if bench.holds.is_empty() {
        output::result("Gives verdicts.")?;
    }
    for sentence in &bench.holds {
        output::result(&format!("Gives no verdicts: {}", sentence.english()))?;
    }
    for sentence in &bench.unclosed {
        output::result(sentence)?;
    }
    certificates(bench)?;
    for (tube, standing) in bench.standings() {
        reference(bench, tube, &standing)?;
    }
    match station.references.len() {
        0 => output::result("\nNo reference tubes: nothing shows whether the bench still reads what it read.")?,
        1 => output::result("One reference tube only: two would tell a change of the tube from one of the bench.")?,
        _ => {}
    }
    due_next(bench)?;
    runs(bench)
}

fn certificates(bench: &Bench) -> Result<(), Failure> {
    output::result("\nCertificates")?;
    let today = bench.at.date_naive();
    for (role, certificate) in bench.station.certificates() {
        let days = (certificate.due - today).num_days();
        let left = match days {
            days if days < 0 => format!("OVERDUE by {} days", -days),
            0 => "due today".to_owned(),
            days => format!("{days} days left"),
        };
        let number = &certificate.number;
        output::result(&format!(
            "  {:<15} {number:<12} of {}, due {}, {left}",
            role.en, certificate.date, certificate.due
        ))?;
    }
    Ok(())
}

fn reference(bench: &Bench, tube: &Reference, standing: &Standing) -> Result<(), Failure> {
    let how = match standing {
        Standing::Never => "never checked here".to_owned(),
        Standing::Good { last } => format!("in bounds at {}", clock(last)),
        Standing::Due { since, last } => format!("DUE since {}; last checked {}", clock(since), clock(last)),
        Standing::Out { last, why } => format!("OUT OF BOUNDS at {}: {}", clock(last), why.english()),
    };
    output::result(&format!("\nReference tube {} ({}): {how}", tube.serial, tube.tube_type))?;
    for (_, chart) in bench.charts(tube) {
        let Some(last) = chart.points.last() else { continue };
        let decimals = chart.decimals;
        let sums = match last.sums {
            Some((up, down)) => format!("sums {up:.1} up, {down:.1} down, alarm above {}", chart.alarm),
            None => "no sums yet".to_owned(),
        };
        let name = chart.measurand.en.to_lowercase();
        output::result(&format!(
            "  {name}, {}: {:.decimals$}, off by {:+.decimals$} of ±{:.decimals$} allowed; {} checks; {sums}",
            chart.unit,
            last.value,
            last.value - chart.value,
            chart.within,
            chart.points.len()
        ))?;
        for line in plot(&chart) {
            output::result(&format!("  {line}"))?;
        }
    }
    tube.beat_note.as_ref().map_or(Ok(()), |beat| beat_note(bench, tube, beat))
}

/// The one line that speaks of accuracy, not only of stability.
fn beat_note(bench: &Bench, tube: &Reference, beat: &BeatNote) -> Result<(), Failure> {
    let last = bench.checks.iter().rfind(|check| check.serial == tube.serial);
    let Some(read) = last.and_then(|check| check.value("mode_spacing")) else { return Ok(()) };
    let fsr_u = bench.station.interferometer.as_ref().map_or(0.0, |interferometer| interferometer.fsr_u);
    let (off, expanded) = (read.value - beat.value, 2.0 * (fsr_u * read.value).hypot(beat.u));
    output::result(&format!(
        "  beat note {:.3} MHz ({}): the bench is off by {:+.3} MHz, {} its expanded uncertainty {:.3} MHz",
        beat.value / 1e6,
        beat.source,
        off / 1e6,
        if off.abs() <= expanded { "inside" } else { "OUTSIDE" },
        expanded / 1e6
    ))
}

fn due_next(bench: &Bench) -> Result<(), Failure> {
    output::result("\nDue next")?;
    if let Some(shift) = bench.shift.filter(|_| !bench.station.references.is_empty()) {
        let serials: Vec<&str> = bench.station.references.iter().map(|tube| tube.serial.as_str()).collect();
        let line = format!("  before {}, the end of the shift: {}", clock(&shift.end), serials.join(", "));
        output::result(&line)?;
    }
    let certificates = bench.station.certificates();
    match certificates.iter().min_by_key(|(_, certificate)| certificate.due) {
        Some((role, certificate)) => {
            output::result(&format!("  {}: certificate {} of the {}", certificate.due, certificate.number, role.en))
        }
        None => Ok(()),
    }
}

fn runs(bench: &Bench) -> Result<(), Failure> {
    if bench.since.is_empty() {
        return Ok(());
    }
    output::result("\nRuns since the last good check of every reference tube: they rest on the next one")?;
    for run in &bench.since {
        let identity = &run.opened.identity;
        output::result(&format!("  {}  {}  {}", identity.started_at, identity.serial, identity.run_id))?;
    }
    Ok(())
}

/// One object a line, told apart by `kind`.
pub(super) fn json(bench: &Bench) -> Result<(), Failure> {
    let say = |value: serde_json::Value| output::result(&value.to_string());
    let shift = bench.shift.map(|shift| [shift.start.to_rfc3339(), shift.end.to_rfc3339()]);
    say(json!({
        "kind": "bench", "station": bench.station.station, "at": bench.at.to_rfc3339(), "shift": shift,
        "gives_verdicts": bench.holds.is_empty(), "holds": bench.holds.iter().map(Saying::english).collect::<Vec<_>>(), "unclosed": bench.unclosed,
    }))?;
    for (role, certificate) in bench.station.certificates() {
        say(json!({
            "kind": "certificate", "role": role.en, "number": certificate.number, "date": certificate.date.to_string(),
            "due": certificate.due.to_string(), "medium": certificate.medium,
            "days_left": (certificate.due - bench.at.date_naive()).num_days(),
        }))?;
    }
    for (tube, standing) in bench.standings() {
        let (state, last, why) = match &standing {
            Standing::Never => ("never", None, None),
            Standing::Due { last, .. } => ("due", Some(last), None),
            Standing::Out { last, why } => ("out", Some(last), Some(why)),
            Standing::Good { last } => ("good", Some(last), None),
        };
        say(json!({
            "kind": "reference", "serial": tube.serial, "type": tube.tube_type, "state": state,
            "last": last.map(chrono::DateTime::to_rfc3339), "why": why.map(Saying::english),
        }))?;
        for (target, chart) in bench.charts(tube) {
            for point in &chart.points {
                say(json!({
                    "kind": "check", "serial": tube.serial, "measurand": target.measurand, "at": point.at.to_rfc3339(),
                    "run_id": point.run_id, "value": point.value, "unit": chart.unit, "inside": point.inside,
                    "sum_up": point.sums.map(|sums| sums.0), "sum_down": point.sums.map(|sums| sums.1),
                }))?;
            }
        }
    }
    for run in &bench.since {
        let identity = &run.opened.identity;
        say(json!({
            "kind": "run_since", "serial": identity.serial, "run_id": identity.run_id, "started_at": identity.started_at,
        }))?;
    }
    Ok(())
}
