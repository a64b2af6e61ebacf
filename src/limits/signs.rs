//! What judged rows show, as signs for the likely cause, and the cause in words.
//! Must not judge: sides are read from the judged rows.
//! Main function: [`with_cause`].

use crate::{
    phrase::{Phrase, Saying, said, verdict::*},
    record::sheet::{Judged, Row, RowVerdict, Value},
    tube::{Cause, Sign, likely_cause},
};

/// A value within this of twice the middle of its limits counts as twice it: a spacing's limits are 2 % wide.
const TWICE_WITHIN: f64 = 0.05;

/// A reason with its likely cause, where one stands out. Always "likely": a verdict rests on the limits alone.
///
/// * `row`: what the reason is about. `all`: every row of the sheet, judged.
pub(super) fn with_cause(reason: Saying, row: &Row, all: &[Row]) -> Saying {
    match likely_cause(&signs(all), &row.measurand) {
        Some(cause) => LIKELY_CAUSE.with([said(reason), said(words(cause))]),
        None => reason,
    }
}

/// Sides of limits, and words that were seen.
fn signs(rows: &[Row]) -> Vec<Sign<'_>> {
    let mut signs = Vec::new();
    for row in rows {
        let key = row.measurand.as_str();
        let value = match &row.value {
            Value::Word(word) => {
                signs.push(Sign::Seen(key, word));
                continue;
            }
            Value::Number { value, .. } => *value,
            Value::Count { value, .. } => *value as f64,
            Value::AtLeast(_) | Value::Absent(_) => continue,
        };
        signs.push(Sign::Measured(key));
        let broken: Vec<&Judged> =
            row.judged.iter().filter(|judged| !matches!(judged.verdict, RowVerdict::Pass)).collect();
        if broken.iter().any(|judged| judged.lower.is_some_and(|lower| value < lower)) {
            signs.push(Sign::Low(key));
        } else if broken.iter().any(|judged| judged.upper.is_some_and(|upper| value > upper)) {
            signs.push(Sign::High(key));
        } else if broken.is_empty() && !row.judged.is_empty() {
            signs.push(Sign::Normal(key));
        }
        let middle = row.judged.first().and_then(|judged| Some(0.5 * (judged.lower? + judged.upper?)));
        if middle.is_some_and(|middle| (value / (2.0 * middle) - 1.0).abs() < TWICE_WITHIN) {
            signs.push(Sign::Twice(key));
        }
    }
    signs
}

fn words(cause: Cause) -> &'static Phrase {
    match cause {
        Cause::Contamination => &CAUSE_CONTAMINATION,
        Cause::HeliumLost => &CAUSE_HELIUM_LOST,
        Cause::Wear => &CAUSE_WEAR,
        Cause::MirrorWalkedOff => &CAUSE_WALKED_OFF,
        Cause::MirrorSputtered => &CAUSE_SPUTTERED,
        Cause::BrokenBore => &CAUSE_BROKEN_BORE,
        Cause::WindowFilm => &CAUSE_WINDOW_FILM,
        Cause::Bore => &CAUSE_BORE,
        Cause::WrongType => &CAUSE_WRONG_TYPE,
        Cause::PolarizerInTheWay => &CAUSE_POLARIZER,
        Cause::SwapsForLife => &CAUSE_SWAPS,
    }
}
