//! The checks of a station's reference tubes, gathered from its records and from what came with the scenario.
//! Must not judge a check.
//! Main functions: [`checks_of`], [`last_of_each`].

use chrono::{DateTime, FixedOffset};

use super::Failure;
use crate::{
    disk::{FoundRun, Store, demo_checks, frozen_record},
    gauge::reference::with_sums,
    measurand,
    record::{
        event::RunKind,
        reference::{CheckedValue, ReferenceCheck},
    },
    station::{
        file::{Reference, StationFile},
        standing::{counted, targets},
        stored::stored_checks,
    },
};

/// Every finished check of a station's reference tubes up to a moment, tube by tube in the order of time, with its sums.
///
/// * `simulated`: checks that came with the demo scenario count too.
///
/// A check counts if its run ended in a verdict: stopped and held ones showed nothing.
pub(super) fn checks_of(
    store: &Store,
    station: &StationFile,
    simulated: bool,
    at: DateTime<FixedOffset>,
) -> Result<Vec<ReferenceCheck>, Failure> {
    let mut all = if simulated { stored(station) } else { Vec::new() };
    for reference in &station.references {
        for run in store.runs_of(&reference.serial).map_err(|error| Failure::store(&error))? {
            all.extend(check_of(&run, station, reference)?);
        }
    }
    let mut checks = Vec::new();
    for reference in &station.references {
        let own = counted(station, reference, at, &all);
        let mut own: Vec<ReferenceCheck> = own.into_iter().map(|(_, check)| check.clone()).collect();
        with_sums(&mut own, &targets(reference));
        checks.extend(own);
    }
    Ok(checks)
}

/// The last check of each tube, as it is frozen into a run.
pub(super) fn last_of_each(station: &StationFile, checks: &[ReferenceCheck]) -> Vec<ReferenceCheck> {
    let last = |tube: &Reference| checks.iter().rfind(|check| check.serial == tube.serial).cloned();
    station.references.iter().filter_map(last).collect()
}

/// What came with the demo scenario for this bench. A test proves that the file can be read.
fn stored(station: &StationFile) -> Vec<ReferenceCheck> {
    let all = stored_checks("checks.toml", demo_checks()).unwrap_or_default();
    all.into_iter().filter(|(bench, _)| *bench == station.station).map(|(_, check)| check).collect()
}

/// The check that a run was; none if it is open, was no check of this bench, or ended without a verdict.
fn check_of(run: &FoundRun, station: &StationFile, tube: &Reference) -> Result<Option<ReferenceCheck>, Failure> {
    let identity = &run.opened.identity;
    if !run.frozen || identity.run_kind != RunKind::Reference || !is_at(run, station) {
        return Ok(None);
    }
    let record = frozen_record(&run.path).map_err(|error| Failure::store(&error))?;
    if !["pass", "fail"].contains(&record.outcome.as_str()) {
        return Ok(None);
    }
    let value = |key: &String| {
        let read = record.values.iter().find(|value| value.measurand == *key)?;
        let factor = measurand::find(key)?.unit().factor;
        Some(CheckedValue { measurand: key.clone(), value: read.number()? * factor, sums: None })
    };
    Ok(Some(ReferenceCheck {
        serial: tube.serial.clone(),
        run_id: identity.run_id.clone(),
        at: identity.started_at.clone(),
        stored: false,
        values: tube.values.iter().filter_map(|value_of| value(&value_of.measurand)).collect(),
    }))
}

/// Whether a run was made at a station, by its name.
pub(super) fn is_at(run: &FoundRun, station: &StationFile) -> bool {
    let name = || StationFile::parse("station.toml", &run.opened.station).map(|file| file.station);
    run.opened.station.contains(&station.station) && name().is_ok_and(|name| name == station.station)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::disk::demo_bench;
    use crate::station::standing::holds;

    #[test]
    fn the_checks_of_the_demo_can_be_read_and_its_benches_are_in_bounds_in_all_four_shifts() {
        stored_checks("checks.toml", demo_checks()).unwrap();
        let store = Store::new("nowhere");
        for bench in ["bench-1", "bench-2"] {
            let station = StationFile::parse(bench, demo_bench(bench).unwrap()).unwrap();
            assert_eq!(station.references.len(), 2, "{bench}");
            for at in ["2026-03-02T08:00:00Z", "2026-03-02T14:15:00Z", "2026-03-03T08:00:00Z", "2026-03-03T14:15:00Z"] {
                let at = DateTime::parse_from_rfc3339(at).unwrap();
                let checks = checks_of(&store, &station, true, at).unwrap();
                let frozen = last_of_each(&station, &checks);
                let held: Vec<String> = holds(&station, at, Some(&frozen)).iter().map(|it| it.english()).collect();
                let held: Vec<_> = held.iter().filter(|sentence| sentence.contains("Reference")).collect();
                assert!(held.is_empty(), "{bench} {at}: {held:?}");
                assert!(checks.iter().all(|check| check.stored));
            }
        }
    }
}
