//! `history SERIAL --add …`: something that happened to a tube between its runs is noted.
//! Must not change a run or a line that is there.
//! Main function: [`add`].

use chrono::{NaiveDate, Utc};
use chrono_tz::Tz;

use super::Arguments;
use crate::cli::{Ending, Failure, inspect::earlier, output};
use crate::disk::{FoundRun, SerialLock, Store, add_to_life};
use crate::limits::nearest;
use crate::record::life::{LifeEvent, LifeKind};

/// Appends one line to the life of a tube.
///
/// * `kind`: what `--add` gave.
pub(super) fn add(arguments: &Arguments, store: &Store, serial: &str, kind: &str) -> Result<Ending, Failure> {
    let kind = kind_of(kind)?;
    let given = |what: &Option<String>, option: &str| {
        what.clone().ok_or_else(|| Failure::unusable(format!("`--add` needs `{option}`")))
    };
    let note = earlier::reason(&given(&arguments.note, "--note \"what was done\"")?)
        .map_err(|failure| Failure::unusable(format!("`--note`: {}", failure.message)))?;
    let date = date_of(&given(&arguments.date, "--date YYYY-MM-DD")?)?;
    let known = |runs: &[FoundRun]| match runs.is_empty() {
        false => Ok(()),
        true => Err(Failure::unusable(format!(
            "`{serial}` has no run in `{}`: only of a tube that was inspected is anything noted",
            store.reports().display()
        ))),
    };
    // Before the lock, so that a serial nobody knows leaves nothing behind.
    let runs = store.runs_of(serial).map_err(|error| Failure::store(&error))?;
    known(&runs)?;
    let now = Utc::now();
    let since = now.format("%Y-%m-%dT%H:%M:%SZ").to_string();
    let _lock = SerialLock::take(store.reports(), serial, &since).map_err(|error| Failure::store(&error))?;
    let runs = store.runs_of(serial).map_err(|error| Failure::store(&error))?;
    let zone = runs.last().and_then(|run| run.opened.identity.time_zone.parse::<Tz>().ok()).unwrap_or(Tz::UTC);
    let noted_at = now.with_timezone(&zone);
    not_in_the_future(date, noted_at.date_naive())?;
    let event = LifeEvent {
        seq: 0,
        noted_at: noted_at.fixed_offset().to_rfc3339_opts(chrono::SecondsFormat::Secs, false),
        version: 0,
        serial: serial.to_owned(),
        kind,
        date: date.to_string(),
        note,
        after: after(&runs, date),
        before: String::new(),
    };
    let sentence = event.sentence();
    let path = add_to_life(store.reports(), event).map_err(|error| Failure::store(&error))?;
    output::talk(&format!("Noted in `{}`, never to be changed: {sentence}", path.display()));
    Ok(Ending::Accepted)
}

fn kind_of(word: &str) -> Result<LifeKind, Failure> {
    let words = LifeKind::ALL.map(LifeKind::word);
    LifeKind::ALL.into_iter().find(|kind| kind.word() == word).ok_or_else(|| {
        let near = nearest(word, words);
        let near = near.map_or_else(String::new, |near| format!("\n  nearest known word: {near}"));
        Failure::unusable(format!("`--add {word}` is not known; expected one of {}{near}", words.join(", ")))
    })
}

fn date_of(text: &str) -> Result<NaiveDate, Failure> {
    let read = NaiveDate::parse_from_str(text, "%Y-%m-%d").ok().filter(|date| date.to_string() == text);
    read.ok_or_else(|| Failure::unusable(format!("`--date {text}` is no day; expected such as 2026-03-04")))
}

fn not_in_the_future(date: NaiveDate, today: NaiveDate) -> Result<(), Failure> {
    match date > today {
        true => {
            Err(Failure::unusable(format!("`--date {date}` is still to come; expected today, {today}, or earlier")))
        }
        false => Ok(()),
    }
}

/// The latest finished run that had been opened by that day: what is noted late belongs where it happened.
fn after(runs: &[FoundRun], date: NaiveDate) -> String {
    let day = date.to_string();
    let by_then =
        |run: &&FoundRun| run.frozen && run.opened.identity.started_at.get(..10).is_some_and(|at| at <= &*day);
    runs.iter().rfind(by_then).map(|run| run.opened.identity.run_id.clone()).unwrap_or_default()
}
