//! What the earlier runs of a serial allow: a first run, a named repeat, or nothing.
//! Must not look at a measured value: how a run ended and why it is repeated is all that counts.
//! Main function: [`allow`].

use std::fmt::Write as _;

use chrono::{DateTime, FixedOffset, TimeDelta};

use crate::cli::{Ending, Failure};
use crate::disk::{DiskError, FoundRun, frozen_record};
use crate::record::{event::Repeat, life::LifeEvent};
use crate::report::ReadRecord;

/// On the simulated bench a run begins this long after the one before it.
const BETWEEN_MIN: i64 = 15;

/// A finished run and its record, where that can still be read.
pub(super) struct Finished<'a> {
    pub run: &'a FoundRun,
    pub record: Result<ReadRecord, DiskError>,
}

impl<'a> Finished<'a> {
    /// The finished runs of a tube that was to be judged, in their order.
    pub fn of(runs: &'a [FoundRun]) -> Vec<Self> {
        let of_tube = |run: &&FoundRun| run.frozen && run.opened.identity.run_kind.is_product();
        runs.iter().filter(of_tube).map(|run| Self { run, record: frozen_record(&run.path) }).collect()
    }

    fn run_id(&self) -> &str {
        &self.run.opened.identity.run_id
    }

    fn outcome(&self) -> &str {
        self.record.as_ref().map_or("", |record| record.outcome.as_str())
    }

    /// It left a verdict on the tube; a record that cannot be read is taken for one.
    fn has_verdict(&self) -> bool {
        !matches!(self.outcome(), "hold" | "stopped")
    }

    /// Date, ending and folder.
    pub fn line(&self) -> String {
        let day = self.run.opened.identity.started_at.get(..10).unwrap_or("(no date)");
        let ending = match &self.record {
            Ok(record) => ending_words(record),
            Err(error) => format!("its record cannot be read: {error}"),
        };
        format!("  {day}  {ending}  {}", self.run.path.display())
    }

    /// When it ended.
    fn ended_at(&self) -> Option<DateTime<FixedOffset>> {
        let record = self.record.as_ref().ok()?;
        [&record.ended_at, &record.started_at].into_iter().find_map(|text| DateTime::parse_from_rfc3339(text).ok())
    }
}

/// "pass, prime", "fail, dim", "hold".
pub(in crate::cli) fn ending_words(record: &ReadRecord) -> String {
    let more = if record.grade.is_empty() { &record.reject_code } else { &record.grade };
    if more.is_empty() { record.outcome.clone() } else { format!("{}, {more}", record.outcome) }
}

/// What is known when a new run is wanted.
pub(super) struct Wanted<'a> {
    pub serial: &'a str,
    pub tube_type: &'a str,
    /// Why a finished run is to be repeated, as given.
    pub why: Option<&'a str>,
    /// `retests` of the recipe.
    pub retests: u32,
}

/// Whether a new run may be opened, and which run it repeats.
///
/// * A serial without a finished run: a first run.
/// * After a run that was stopped: a new run that names it; a stop is no verdict, so no retest is used.
/// * After the tube itself was changed (rework, return) since the last run: a new run that names it and the change.
/// * After a hold: a run that says why, without limit: there is no verdict that it could replace (the bench or the supply was
///   put right).
/// * After a pass or a fail: a run with an assigned cause, as often as the recipe allows since the tube was changed last.
///
/// Errors say what there is and what to type.
pub(super) fn allow(
    wanted: &Wanted<'_>,
    finished: &[Finished<'_>],
    life: &[LifeEvent],
) -> Result<Option<Repeat>, Failure> {
    let why = wanted.why.map(reason).transpose()?;
    let Some(last) = finished.last() else {
        return match why {
            Some(_) => Err(Failure::unusable(format!(
                "`{}` has no finished run that could be repeated: leave out `--retest`",
                wanted.serial
            ))),
            None => Ok(None),
        };
    };
    let repeat = |reason: String| Ok(Some(Repeat { run_id: last.run_id().to_owned(), reason }));
    if last.outcome() == "stopped" {
        let stop = last.record.as_ref().map_or("", |record| record.reason.as_str());
        return repeat(why.unwrap_or_else(|| format!("that run was stopped: {stop}")));
    }
    if let Some(change) = changed_after(last, life) {
        return repeat(why.unwrap_or_else(|| change.sentence()));
    }
    let used = used(wanted.tube_type, finished, life);
    if last.has_verdict() && used >= wanted.retests {
        return Err(used_up(wanted, finished, used));
    }
    match why {
        Some(why) => repeat(why),
        None => Err(no_silent_retest(wanted, finished, last, used)),
    }
}

/// When a run on the simulated bench may begin: not before the one before it has ended.
pub(super) fn not_before(finished: &[Finished<'_>]) -> Option<DateTime<FixedOffset>> {
    let latest = finished.iter().filter_map(Finished::ended_at).max()?;
    latest.checked_add_signed(TimeDelta::minutes(BETWEEN_MIN))
}

/// The reason as it is stored. Errors: there is none, or it cannot be printed.
pub(in crate::cli) fn reason(text: &str) -> Result<String, Failure> {
    let text = text.trim();
    if text.is_empty() || text.chars().any(char::is_control) {
        return Err(Failure::unusable("the reason is blank or cannot be printed; expected it in words, on one line"));
    }
    Ok(text.to_owned())
}

/// What was done to the tube since a run ended, so that the next one is of a changed tube.
fn changed_after<'a>(last: &Finished<'_>, life: &'a [LifeEvent]) -> Option<&'a LifeEvent> {
    life.iter().rfind(|entry| entry.changes_the_tube() && entry.after == last.run_id())
}

/// Retests used since the tube was changed last: runs of the type that repeat a run which had a verdict.
fn used(tube_type: &str, finished: &[Finished<'_>], life: &[LifeEvent]) -> u32 {
    let since = finished.iter().rposition(|run| changed_after(run, life).is_some()).map_or(0, |place| place + 1);
    let repeats_a_verdict = |run: &&Finished<'_>| {
        let repeated = run.run.opened.identity.repeats.as_ref().map(|repeat| repeat.run_id.as_str());
        let of_type = run.run.opened.identity.tube_type == tube_type;
        of_type && finished.iter().any(|other| Some(other.run_id()) == repeated && other.has_verdict())
    };
    // The first run after a change names the run before it, but is no retest of the tube as it is now.
    let chain = finished.get(since..).unwrap_or_default();
    let skipped = usize::from(since > 0);
    u32::try_from(chain.iter().skip(skipped).filter(repeats_a_verdict).count()).unwrap_or(u32::MAX)
}

fn listed(finished: &[Finished<'_>]) -> String {
    finished.iter().fold(String::new(), |mut text, run| {
        // Writing to a String cannot fail.
        let _ = write!(text, "\n{}", run.line());
        text
    })
}

fn no_silent_retest(wanted: &Wanted<'_>, finished: &[Finished<'_>], last: &Finished<'_>, used: u32) -> Failure {
    let serial = wanted.serial;
    let rest = if last.has_verdict() {
        format!("the recipe allows `retests = {}`, {used} used", wanted.retests)
    } else {
        "a hold is no verdict: a run after it uses no retest".to_owned()
    };
    Failure::new(
        Ending::NotAllowed,
        format!(
            "`{serial}` was inspected already, and no run is repeated without a cause:{}\n\
             to repeat the last one, say the cause: tubewright inspect {} --retest \"what was wrong and is put right\"\n{rest}",
            listed(finished),
            quoted(serial),
        ),
    )
}

fn used_up(wanted: &Wanted<'_>, finished: &[Finished<'_>], used: u32) -> Failure {
    let Wanted { serial, tube_type, retests, .. } = wanted;
    Failure::new(
        Ending::NotAllowed,
        format!(
            "no further run of `{serial}`: {used} used of `retests = {retests}` in the recipe of `{tube_type}`:{}\n\
             all of these count; if the tube itself was changed, note that first: \
             tubewright history {} --add rework --date YYYY-MM-DD --note \"what was done\"",
            listed(finished),
            quoted(serial),
        ),
    )
}

/// A serial as it can be typed again.
pub(super) fn quoted(serial: &str) -> String {
    let plain = |c: char| c.is_alphanumeric() || matches!(c, '-' | '_' | '.' | '/');
    if serial.chars().all(plain) { serial.to_owned() } else { format!("'{}'", serial.replace('\'', r"'\''")) }
}
