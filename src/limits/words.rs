//! Sentences of a verdict, in the units that people see, rounded with their uncertainty.
//! Must not decide: every verdict is read from the judged rows.
//! Main functions: [`fail`], [`hold`], [`pass`], [`note`].

use super::{Limit, Severity, judge::Limited};
use crate::{
    measurand::{Measurand, find},
    record::sheet::{Judged, Row, RowVerdict, Value, Zone},
    tube::{Sign, likely_cause},
    uncertainty::joint,
};

/// Closes every reason for a hold.
const NO_VERDICT: &str = "No verdict on the tube is given.";

/// A value within this of twice the middle of its limits counts as twice it: a spacing's limits are 2 % wide.
const TWICE_WITHIN: f64 = 0.05;

/// Adds words to a note that may hold some already.
pub fn append(note: &mut String, words: String) {
    if !words.is_empty() {
        if !note.is_empty() {
            note.push_str("; ");
        }
        note.push_str(&words);
    }
}

/// Why the bench gives hold.
pub fn bench_hold(reasons: &[String]) -> String {
    format!("{} {NO_VERDICT}", reasons.join(" "))
}

/// What the rows show, for the likely cause: sides of limits, and words.
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

/// A reason with its likely cause, where one stands out. Always "likely": a verdict rests on the limits alone.
fn with_cause(reason: String, row: &Row, all: &[Row]) -> String {
    match likely_cause(&signs(all), &row.measurand) {
        Some(cause) => format!("{reason}; likely cause: {}", cause.words()),
        None => reason,
    }
}

/// Why a tube fails: the first row's reason with its likely cause, and the other codes. Rows come worst first.
///
/// * `all`: every row of the sheet, judged.
pub fn fail(rows: &[&Limited<'_>], all: &[Row]) -> String {
    let Some((first, others)) = rows.split_first() else { return "No grade is left.".to_owned() };
    let judged = first.entries(RowVerdict::Fail).last();
    let reason =
        judged.map_or(String::new(), |judged| with_cause(capital(&why(first.row, judged)), first.row, all) + ".");
    let mut codes: Vec<&str> = others.iter().filter_map(|row| row.limit.reject.as_deref()).collect();
    codes.dedup();
    if codes.is_empty() { reason } else { format!("{reason} Also: {}.", codes.join(", ")) }
}

/// Why there is no verdict: the first row's reason, and the names of the others.
pub fn hold(rows: &[&Limited<'_>], unfilled: &[&Limit], all: &[Row]) -> String {
    let unfilled_name = |limit: &&Limit| find(&limit.measurand).map_or(limit.measurand.clone(), |m| m.name.to_owned());
    let mut names: Vec<String> = rows.iter().map(|row| lower_case(&row.row.label)).collect();
    names.extend(unfilled.iter().map(|limit| lower_case(&unfilled_name(limit))));
    let first = match (rows.first(), unfilled.first()) {
        (Some(row), _) => hold_reason(row, all),
        (None, Some(limit)) => format!("{} is limited, but no step filled it.", capital(&unfilled_name(limit))),
        (None, None) => String::new(),
    };
    let also =
        if names.len() > 1 { format!(" Also without a verdict: {}.", names[1..].join(", ")) } else { String::new() };
    format!("{first}{also} {NO_VERDICT}")
}

fn hold_reason(limited: &Limited<'_>, all: &[Row]) -> String {
    let row = limited.row;
    let label = capital(&row.label);
    let Some(judged) = limited.entries(RowVerdict::Hold).next() else { return String::new() };
    match &row.value {
        Value::Absent(why) if why.trim().is_empty() => format!("{label} has no value."),
        Value::Absent(why) => format!("{label} has no value: {}.", why.trim().trim_end_matches('.')),
        Value::AtLeast(_) => format!("{} {}: undecided.", label, undecided(row, judged)),
        Value::Number { .. } if judged.zone.is_none() => format!("{label} has no finite value."),
        // The supply's ripple reaches the light through the current: the tube is not to blame (practice).
        Value::Number { .. } if row.measurand == "line_ripple" => {
            format!("{label} {} points at the supply, not at the tube: repeat on another supply.", shown(row))
        }
        Value::Word(_) if judged.wanted.is_empty() => format!("{label} holds a word where a number is due."),
        _ => {
            let reason = format!("{}, a limit that gives hold, not fail", capital(&why(row, judged)));
            with_cause(reason, row, all) + "."
        }
    }
}

/// Why the better grades were lost, and which rows are marked.
pub fn pass(rows: &[&Limited<'_>], lost: &[&str], all: &[Row]) -> String {
    let mut in_order: Vec<&&Limited<'_>> = rows.iter().collect();
    in_order.sort_by_key(|row| row.index);
    let mut sentences = Vec::new();
    for grade in lost {
        let reasons: Vec<String> = in_order.iter().filter_map(|limited| why_lost(limited, grade, all)).collect();
        sentences.push(format!("Not {grade}: {}.", reasons.join("; ")));
    }
    for row in in_order.iter().filter(|row| row.limit.severity == Severity::Minor) {
        if let Some(judged) = row.entries(RowVerdict::Fail).last() {
            sentences.push(format!("Marked: {} (minor).", why(row.row, judged)));
        }
    }
    sentences.join(" ")
}

/// Why a row costs a grade, if it does.
fn why_lost(limited: &Limited<'_>, grade: &str, all: &[Row]) -> Option<String> {
    let judged = limited.entries(RowVerdict::Fail).find(|judged| judged.grade == grade)?;
    let reason = || with_cause(why(limited.row, judged), limited.row, all);
    (limited.limit.severity != Severity::Minor).then(reason)
}

/// One line for the row itself; empty where all is well.
pub fn note(row: &Row, limit: &Limit) -> String {
    let of = |verdict: RowVerdict| row.judged.iter().filter(move |judged| judged.verdict == verdict);
    if let Some(judged) = of(RowVerdict::Hold).next() {
        return match &row.value {
            Value::Absent(_) => "limited, without a value: gives hold".to_owned(),
            Value::AtLeast(_) => format!("{}: undecided, gives hold", undecided(row, judged)),
            Value::Number { .. } if judged.zone.is_none() => "no finite value: gives hold".to_owned(),
            Value::Word(_) if judged.wanted.is_empty() => "a word where a number is due: gives hold".to_owned(),
            _ => format!("outside {}: gives hold, not fail", broken_bound(row, judged)),
        };
    }
    let failed: Vec<&Judged> = of(RowVerdict::Fail).collect();
    let Some(last) = failed.last() else { return doubtful_count(row) };
    let code = limit.reject.as_deref().unwrap_or("fails");
    let side = place(row, last);
    if limit.severity == Severity::Minor {
        return format!("{code}: {side}; minor, the grade stays");
    }
    let kept = row.judged.iter().find(|judged| judged.verdict == RowVerdict::Pass);
    match kept {
        Some(kept) if limit.severity == Severity::Major => {
            let names = failed.iter().map(|judged| judged.grade.as_str()).collect::<Vec<_>>().join(", ");
            let how = if in_doubt(last) { " in doubt".to_owned() } else { format!(": {side}") };
            let bound = kept.lower.or(kept.upper).map(|bound| format!(", {},", bound_text(row, bound)));
            format!("{names} lost{how}; {}{} holds", kept.grade, bound.unwrap_or_default())
        }
        _ if last.grade.is_empty() => format!("{code}: {side}"),
        Some(_) => format!("{code}: {side}, the bound of grade {}", last.grade),
        None => format!("{code}: {side}, the last grade's bound"),
    }
}

/// A count that its interval would carry over the bound.
fn doubtful_count(row: &Row) -> String {
    let Value::Count { value, low, high } = row.value else { return String::new() };
    let outside = |n: u64, judged: &Judged| {
        judged.lower.is_some_and(|lower| (n as f64) < lower) || judged.upper.is_some_and(|upper| n as f64 > upper)
    };
    let doubtful = row.judged.iter().any(|judged| outside(low.min(value), judged) || outside(high.max(value), judged));
    if doubtful { format!("in doubt: may be {low} to {high}") } else { String::new() }
}

/// It fails although it lies inside: for want of a margin.
fn in_doubt(judged: &Judged) -> bool {
    judged.verdict == RowVerdict::Fail && matches!(judged.zone, Some(Zone::Inside | Zone::InsideByU))
}

/// "power 0.505 mW is above 0.50 mW, but not by its expanded uncertainty 0.015 mW (rule: guarded)".
fn why(row: &Row, judged: &Judged) -> String {
    let label = lower_case(&row.label);
    match &row.value {
        Value::Word(word) => format!("{label} {word}, wanted {}", judged.wanted.join(" or ")),
        Value::Count { value, .. } => format!("{label}: {value}, {}", place(row, judged)),
        Value::Number { expanded, .. } if in_doubt(judged) => {
            let (_, side, bound) = nearest_bound(row, judged);
            let but = if judged.rule == "guarded" {
                format!("not by its expanded uncertainty {}", expanded_text(row, *expanded))
            } else {
                format!("with probability {:.3} only", judged.conformance_probability.unwrap_or(0.0))
            };
            format!("{label} {} is {side} {bound}, but {but} (rule: {})", shown(row), judged.rule)
        }
        _ => format!("{label} {} is {}", shown(row), place(row, judged)),
    }
}

/// Where the value lies: "below 0.30 mW", "above 0.50 mW, but not by U", "wanted clean".
fn place(row: &Row, judged: &Judged) -> String {
    if let Value::Word(_) = row.value {
        return format!("wanted {}", judged.wanted.join(" or "));
    }
    let (_, side, bound) = nearest_bound(row, judged);
    match in_doubt(judged) {
        true if judged.rule == "guarded" => format!("{side} {bound}, but not by U"),
        true => format!("{side} {bound}, but with less than {}", judged.rule),
        false => format!("{side} {bound}"),
    }
}

fn broken_bound(row: &Row, judged: &Judged) -> String {
    if judged.wanted.is_empty() { nearest_bound(row, judged).2 } else { judged.wanted.join(" or ") }
}

fn undecided(row: &Row, judged: &Judged) -> String {
    let bound = judged.lower.or(judged.upper).map_or(String::new(), |bound| bound_text(row, bound));
    format!("is known only to be {}, the bound is {bound}", shown(row))
}

/// The bound that decides: (its distance inward from the value, the value's side of it, its text).
fn nearest_bound(row: &Row, judged: &Judged) -> (f64, &'static str, String) {
    let value = match row.value {
        Value::Number { value, .. } | Value::AtLeast(value) => value,
        Value::Count { value, .. } => value as f64,
        Value::Word(_) | Value::Absent(_) => f64::NAN,
    };
    let lower = judged.lower.map(|bound| (value - bound, bound));
    let upper = judged.upper.map(|bound| (bound - value, bound));
    let nearest = match (lower, upper) {
        (Some(lower), Some(upper)) if upper.0 < lower.0 => Some(upper),
        (lower, upper) => lower.or(upper),
    };
    let Some((distance, bound)) = nearest else { return (f64::INFINITY, "inside", "no bound".to_owned()) };
    let side = if value >= bound { "above" } else { "below" };
    (distance, side, bound_text(row, bound))
}

/// The value as people see it, with its unit: "0.505 mW".
fn shown(row: &Row) -> String {
    let measurand = find(&row.measurand);
    match &row.value {
        Value::Number { value, expanded, .. } => {
            let most = measurand.map_or(6, |m| m.decimals);
            with_unit(measurand, joint(si_to_shown(measurand, *value), si_to_shown(measurand, *expanded), most).0)
        }
        Value::Count { value, .. } => value.to_string(),
        Value::AtLeast(value) => format!("at least {}", bound_text(row, *value)),
        Value::Word(word) => word.clone(),
        Value::Absent(_) => "no value".to_owned(),
    }
}

fn expanded_text(row: &Row, expanded: f64) -> String {
    let measurand = find(&row.measurand);
    let expanded = si_to_shown(measurand, expanded);
    with_unit(measurand, joint(0.0, expanded, measurand.map_or(6, |m| m.decimals)).1)
}

/// A bound in the unit that people see: whole from 1 on, else at least two significant digits, at most nine.
pub fn bound_text(row: &Row, si: f64) -> String {
    let measurand = find(&row.measurand);
    let value = si_to_shown(measurand, si);
    let shortest = format!("{value:.8e}").parse::<f64>().unwrap_or(value).to_string();
    let decimals = shortest.split_once('.').map_or(0, |(_, decimals)| decimals.len());
    let least = match value.abs() {
        v if v >= 1.0 || v == 0.0 => 0,
        // 0.5 → 2, 0.05 → 3; the logarithm of a value in (0, 1) is finite and at most 0.
        v => (1.0 - v.log10().floor()).clamp(0.0, 12.0) as usize,
    };
    with_unit(measurand, if decimals < least { format!("{value:.least$}") } else { shortest })
}

fn si_to_shown(measurand: Option<&Measurand>, si: f64) -> f64 {
    measurand.map_or(si, |measurand| measurand.shown(si))
}

fn with_unit(measurand: Option<&Measurand>, number: String) -> String {
    match measurand.map_or("", |measurand| measurand.unit().symbol) {
        "" => number,
        "°" => format!("{number}°"),
        symbol => format!("{number} {symbol}"),
    }
}

fn capital(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or(String::new(), |first| first.to_uppercase().chain(chars).collect())
}

/// First letter small, unless the second is a capital too (an abbreviation).
fn lower_case(text: &str) -> String {
    let mut chars = text.chars();
    match (chars.next(), chars.clone().next()) {
        (Some(_), Some(second)) if second.is_uppercase() => text.to_owned(),
        (Some(first), _) => first.to_lowercase().chain(chars).collect(),
        (None, _) => String::new(),
    }
}
