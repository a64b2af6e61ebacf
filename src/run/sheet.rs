//! Puts the sheet of a run together: head, rows, verdict, charts, caution, foot.
//! Must not measure; `limits::judge` decides.
//! Main function: [`sheet_of`].

use std::borrow::Cow;

use chrono::NaiveDate;

use super::{
    Run,
    caution::caution,
    filled::Filled,
    rack::{self, Rack},
    reference,
};
use crate::{
    limits::{Judging, Limits, judge},
    measurand,
    phrase::{Phrase, Saying, figure, name, reasons, said, verdict},
    quantity::{FrequencyDifference, Resistance},
    record::sheet::{Instrument, MeasuredBy, Outcome, Revision, Row, Sheet, TubeVerdict, Value},
    station::{file::StationFile, standing},
    uncertainty::Certificate,
};

/// The sheet at this moment.
pub(super) fn sheet_of(run: &Run) -> Sheet {
    let plan = &run.plan;
    let finished = run.ending.as_ref().filter(|ending| !ending.unsafe_yet);
    let mut rows = rows(run);
    let day = run.opened_at.map(|at| at.date_naive());
    // A reference tube judges the bench: what holds a product must not hold its check.
    let product = run.identity.run_kind.is_product();
    let at = run.opened_at.filter(|_| product);
    let mut holds =
        at.map_or_else(Vec::new, |at| standing::holds(&plan.station, at, run.identity.reference_checks.as_deref()));
    holds.extend(run.book.holds.iter().cloned());
    let complete = finished.is_some_and(|ending| ending.stopped.is_none());
    let dark = run.book.dark.is_some();
    let limits = limits(run, &mut rows);
    let judged = judge(Judging { limits: &limits, rows: &mut rows, bench_holds: &holds, finished: complete, dark });
    let judged = if product { judged } else { reference::verdict(judged) };
    let verdict = match run.ending.as_ref().and_then(|ending| ending.stopped.as_ref()) {
        Some(reason) => stopped(reason),
        None => judged,
    };
    let initials = if run.identity.technician.is_empty() { &run.answered_by } else { &run.identity.technician };
    let measured_by = finished.filter(|_| complete && !initials.is_empty()).map(|ending| MeasuredBy {
        initials: initials.clone(),
        at: ending.at,
        meaning: (&reasons::MEASURED).into(),
    });
    Sheet {
        identity: run.identity.clone(),
        title: reference::title(run).unwrap_or_else(|| Saying::of(name(limits.title.clone()))),
        station: plan.station.station.clone(),
        started_at: run.opened_at,
        ended_at: finished.map(|ending| ending.at),
        dwell: run.book.dwells.last().filter(|dwelt| dwelt.end.is_some()).map(|dwelt| dwelt.seconds),
        recipe: Revision { revision: plan.recipe.revision, sha256: plan.recipe.sha256.clone() },
        limits: Revision { revision: plan.limits.revision, sha256: plan.limits.sha256.clone() },
        station_file: Revision { revision: 0, sha256: plan.station.sha256.clone() },
        rule: limits.rule.to_string(),
        instruments: instruments(&plan.station, day),
        run_current: run.book.mean_current().or_else(|| typed_current(&rows)),
        verdict,
        rows,
        sweep_chart: run.book.sweep_chart.clone(),
        gain_chart: run.book.gain_chart.clone(),
        walk_chart: run.walk(),
        remarks: remarks(run),
        caution: caution(run.book.greatest_power),
        measured_by,
    }
}

/// What the rows are judged by: the type's limits, or the values of the reference tube.
fn limits<'a>(run: &'a Run, rows: &mut [Row]) -> Cow<'a, Limits> {
    let reference = run.plan.station.reference(&run.identity.serial).filter(|_| !run.identity.run_kind.is_product());
    match reference {
        Some(reference) => Cow::Owned(reference::limits(reference)),
        None if run.book.rack.is_some() => Cow::Owned(rack::limits(run, rows)),
        None => Cow::Borrowed(&run.plan.limits),
    }
}

/// The run current that a person read off, where no capture carries one.
fn typed_current(rows: &[Row]) -> Option<f64> {
    let row = rows.iter().find(|row| row.measurand == "run_current")?;
    if let Value::Number { value, .. } = row.value { Some(value) } else { None }
}

fn stopped(reason: &str) -> TubeVerdict {
    TubeVerdict {
        outcome: Outcome::Stopped,
        grade: None,
        reject_code: None,
        sentence: (&verdict::STOPPED).into(),
        reason: Saying::outside(reason),
    }
}

/// Rows that count in time: captures without a time cannot fill them.
const NEED_TIME: [&str; 4] = ["warmup_tau", "warmup_ready", "walk_rate", "power_drift"];

/// Every row of the recipe, filled or empty with the reason, in the order of the catalogue.
fn rows(run: &Run) -> Vec<Row> {
    let mut rows: Vec<(&'static str, Row)> = Vec::new();
    for (index, (step, state)) in run.plan.recipe.steps.iter().zip(&run.steps).enumerate() {
        let filled = state.filled();
        let pending =
            step.kind.fills(&step.name).into_iter().filter(|key| filled.iter().all(|row| row.measurand != *key));
        let why = why_open(run, index);
        let pending = pending.map(|key| Filled::absent(&key, why));
        for row in filled.iter().cloned().chain(pending) {
            put(&mut rows, step.kind.word(), row, &step.name);
        }
    }
    let mut rows: Vec<Row> = rows.into_iter().map(|(_, row)| row).collect();
    if run.identity.times_assumed {
        for row in rows.iter_mut().filter(|row| NEED_TIME.contains(&row.measurand.as_str())) {
            row.value = Value::Absent((&reasons::NO_TIMES).into());
            row.budget = Vec::new();
            row.note = Saying::none();
        }
        // Counts stand, rates do not.
        for row in rows.iter_mut().filter(|row| ["hop_count", "swap_count"].contains(&row.measurand.as_str())) {
            row.note = Saying::none();
        }
    }
    if run.book.rack.is_some() {
        rack::empty_unseen(&mut rows);
    }
    // Stable: equal ranks stay in the order of the recipe.
    rows.sort_by_key(|row| measurand::rank(&row.measurand));
    rows
}

/// Two steps of one kind both keep their row; of two kinds that can fill the same row, the first that has a value fills it.
fn put(rows: &mut Vec<(&'static str, Row)>, kind: &'static str, row: Filled, step: &str) {
    let other = rows.iter().position(|(word, other)| *word != kind && other.measurand == row.measurand);
    match other {
        Some(place) if row.is_absent() || !matches!(rows[place].1.value, Value::Absent(_)) => {}
        Some(place) => rows[place] = (kind, row.into_row(step)),
        None => rows.push((kind, row.into_row(step))),
    }
}

/// Why a step has not filled its row.
fn why_open(run: &Run, index: usize) -> &'static Phrase {
    if run.book.dark.is_some() {
        return &reasons::TUBE_DARK;
    }
    match &run.ending {
        Some(ending) if ending.stopped.is_some() => &reasons::STOPPED_BEFORE,
        _ if index < run.current => &reasons::STEP_GAVE_NONE,
        _ => &reasons::NOT_YET,
    }
}

fn remarks(run: &Run) -> Vec<Saying> {
    let simulated = run.identity.simulated.then(|| Saying::from(&reasons::SIMULATED));
    let captures = run.identity.from_captures.then(|| (&reasons::FROM_CAPTURES).into());
    let untimed = run.identity.times_assumed.then(|| (&reasons::UNTIMED).into());
    let repeats = run.identity.repeats.as_ref();
    let repeats = repeats.map(|it| reasons::REPEATS.with([name(it.run_id.clone()), said(Saying::outside(&it.reason))]));
    let dark = run.book.dark.as_ref().map(|how| reasons::DARK_TUBE.with([said(how.clone())]));
    let stopped = run.ending.as_ref().and_then(|ending| ending.stopped.as_ref());
    let stopped = stopped.map(|why| reasons::STOPPED.with([said(Saying::outside(why))]));
    let reference = (!run.identity.run_kind.is_product())
        .then(|| reasons::REFERENCE_TUBE.with([name(run.plan.station.station.clone())]));
    let rack = run.book.rack.as_ref().map(Rack::sentence);
    let origin = simulated.into_iter().chain(reference).chain(rack).chain(captures).chain(untimed);
    let all = origin.chain(repeats).chain(dark).chain(stopped);
    all.chain(run.book.remarks.iter().cloned()).collect()
}

/// The instruments of the station with what their certificates say.
fn instruments(station: &StationFile, day: Option<NaiveDate>) -> Vec<Instrument> {
    let percent = |u: f64| format!("{} %", (u * 1e6).round() / 1e4);
    let one = |role: &'static Phrase, what: Saying, certificate: Option<&Certificate>| Instrument {
        role: role.into(),
        what,
        certificate: certificate.map_or_else(String::new, |certificate| certificate.number.clone()),
        due: certificate.map(|certificate| certificate.due),
        overdue: certificate.zip(day).is_some_and(|(certificate, day)| certificate.overdue_on(day)),
    };
    let interferometer = station.interferometer.as_ref().map(|it| {
        let what = reasons::RANGE.with([figure(FrequencyDifference::from_si(it.fsr)), figure(percent(it.fsr_u))]);
        one(&reasons::INTERFEROMETER, what, it.certificate.as_ref())
    });
    let power_meter = station.power_meter.as_ref().map(|it| {
        let what = reasons::READING_TIMES.with([figure(it.factor), figure(percent(it.u))]);
        one(&reasons::POWER_METER, what, it.certificate.as_ref())
    });
    let supply = station.supply.as_ref().map(|it| {
        let what = reasons::BALLAST.with([figure(Resistance::from_si(it.ballast)), figure(percent(it.u))]);
        one(&reasons::SUPPLY, what, it.certificate.as_ref())
    });
    let polarizer = station.polarizer.as_ref().map(|it| {
        let u_angle = (it.u_angle.to_degrees() * 1e4).round() / 1e4;
        one(
            &reasons::POLARIZER,
            reasons::EXTINCTION_ANGLE.with([figure(it.extinction), figure(format!("{u_angle}°"))]),
            None,
        )
    });
    [interferometer, power_meter, supply, polarizer].into_iter().flatten().collect()
}
