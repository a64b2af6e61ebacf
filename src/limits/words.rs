//! Sentences of a verdict, in the units that people see, rounded with their uncertainty.
//! Must not decide: every verdict is read from the judged rows.
//! Main functions: [`fail`], [`hold`], [`pass`], [`note`].

use super::{Limit, Severity, judge::Limited, signs::with_cause};
use crate::{
    measurand::{Measurand, find},
    phrase::{Phrase, Piece, Saying, clause, figure, list, name, opening, said, verdict::*, within},
    record::sheet::{Judged, Row, RowVerdict, Value, Zone},
    uncertainty::joint,
};

/// A note with more words behind it.
pub fn appended(note: &Saying, words: Saying) -> Saying {
    match (note.is_empty(), words.is_empty()) {
        (_, true) => note.clone(),
        (true, _) => words,
        _ => Saying::list([note.clone(), words], &SEMICOLON),
    }
}

/// Why the bench gives hold.
pub fn bench_hold(reasons: &[Saying]) -> Saying {
    Saying::list(reasons.iter().cloned().chain([(&NO_VERDICT).into()]), &SPACE)
}

/// Why a tube fails: the first row's reason with its likely cause, and the other codes. Rows come worst first.
///
/// * `all`: every row of the sheet, judged.
pub fn fail(rows: &[&Limited<'_>], all: &[Row]) -> Saying {
    let Some((first, others)) = rows.split_first() else { return (&NO_GRADE_LEFT).into() };
    let judged = first.entries(RowVerdict::Fail).last();
    let told = |judged| SENTENCE.with([opening(with_cause(why(first.row, judged), first.row, all))]);
    let reason = judged.map_or_else(Saying::none, told);
    let mut codes: Vec<&str> = Vec::new();
    for code in others.iter().filter_map(|row| row.limit.reject.as_deref()) {
        if Some(code) != first.limit.reject.as_deref() && !codes.contains(&code) {
            codes.push(code);
        }
    }
    let also = if codes.is_empty() { Saying::none() } else { ALSO.with([names(&codes, &COMMA)]) };
    Saying::list([reason, also], &SPACE)
}

/// Names one after the other.
fn names(names: &[impl AsRef<str>], joint: &'static Phrase) -> Piece {
    list(names.iter().map(|text| Saying::of(name(text.as_ref()))), joint)
}

/// Why there is no verdict: the first row's reason, and the names of the others.
pub fn hold(rows: &[&Limited<'_>], unfilled: &[&Limit], all: &[Row]) -> Saying {
    let unfilled_name = |limit: &&Limit| match find(&limit.measurand) {
        Some(known) => (&known.name).into(),
        None => Saying::of(name(limit.measurand.as_str())),
    };
    let labels = rows.iter().map(|row| row.row.label.clone()).chain(unfilled.iter().map(unfilled_name));
    let others: Vec<Saying> = labels.skip(1).map(|label| Saying::of(within(label))).collect();
    let first = match (rows.first(), unfilled.first()) {
        (Some(row), _) => hold_reason(row, all),
        (None, Some(limit)) => UNFILLED.with([opening(unfilled_name(limit))]),
        (None, None) => Saying::none(),
    };
    let also = if others.is_empty() { Saying::none() } else { ALSO_HELD.with([list(others, &COMMA)]) };
    Saying::list([first, also, (&NO_VERDICT).into()], &SPACE)
}

fn hold_reason(limited: &Limited<'_>, all: &[Row]) -> Saying {
    let row = limited.row;
    let label = opening(row.label.clone());
    let Some(judged) = limited.entries(RowVerdict::Hold).next() else { return Saying::none() };
    match &row.value {
        Value::Absent(why) if why.is_empty() => NO_VALUE.with([label]),
        Value::Absent(why) => NO_VALUE_WHY.with([label, clause(why.clone())]),
        Value::AtLeast(_) => UNDECIDED.with([label, shown(row), bound_of(row, judged)]),
        Value::Number { .. } if judged.zone.is_none() => NO_FINITE_VALUE.with([label]),
        // The supply's ripple reaches the light through the current: the tube is not to blame (practice).
        Value::Number { .. } if row.measurand == "line_ripple" => POINTS_AT_SUPPLY.with([label, shown(row)]),
        Value::Word(_) if judged.wanted.is_empty() => WORD_FOR_NUMBER.with([label]),
        _ => LIMIT_HOLDS.with([opening(with_cause(why(row, judged), row, all))]),
    }
}

/// Why the better grades were lost, and which rows are marked.
pub fn pass(rows: &[&Limited<'_>], lost: &[&str], all: &[Row]) -> Saying {
    let mut in_order: Vec<&&Limited<'_>> = rows.iter().collect();
    in_order.sort_by_key(|row| row.index);
    let mut sentences = Vec::new();
    for grade in lost {
        let reasons: Vec<Saying> = in_order.iter().filter_map(|limited| why_lost(limited, grade, all)).collect();
        sentences.push(NOT_GRADE.with([name(*grade), list(reasons, &SEMICOLON)]));
    }
    for row in in_order.iter().filter(|row| row.limit.severity == Severity::Minor) {
        if let Some(judged) = row.entries(RowVerdict::Fail).last() {
            sentences.push(MARKED.with([said(why(row.row, judged))]));
        }
    }
    if sentences.is_empty() { Saying::none() } else { Saying::list(sentences, &SPACE) }
}

/// Why a row costs a grade, if it does.
fn why_lost(limited: &Limited<'_>, grade: &str, all: &[Row]) -> Option<Saying> {
    let judged = limited.entries(RowVerdict::Fail).find(|judged| judged.grade == grade)?;
    let reason = || with_cause(why(limited.row, judged), limited.row, all);
    (limited.limit.severity != Severity::Minor).then(reason)
}

/// One line for the row itself; empty where all is well.
pub fn note(row: &Row, limit: &Limit) -> Saying {
    let of = |verdict: RowVerdict| row.judged.iter().filter(move |judged| judged.verdict == verdict);
    if let Some(judged) = of(RowVerdict::Hold).next() {
        return match &row.value {
            Value::Absent(_) => (&NOTE_NO_VALUE).into(),
            Value::AtLeast(_) => NOTE_UNDECIDED.with([shown(row), bound_of(row, judged)]),
            Value::Number { .. } if judged.zone.is_none() => (&NOTE_NOT_FINITE).into(),
            Value::Word(_) if judged.wanted.is_empty() => (&NOTE_WORD).into(),
            _ => NOTE_HOLD.with([broken_bound(row, judged)]),
        };
    }
    let failed: Vec<&Judged> = of(RowVerdict::Fail).collect();
    let Some(last) = failed.last() else { return doubtful_count(row) };
    let code = limit.reject.as_deref().map_or(said(&NOTE_FAILS), name);
    let side = said(place(row, last));
    if limit.severity == Severity::Minor {
        return NOTE_MINOR.with([code, side]);
    }
    match row.judged.iter().find(|judged| judged.verdict == RowVerdict::Pass) {
        Some(kept) if limit.severity == Severity::Major => lost(row, &failed, last, kept),
        _ if last.grade.is_empty() => COLON.with([code, side]),
        Some(_) => BOUND_OF_GRADE.with([code, side, name(last.grade.as_str())]),
        None => LAST_BOUND.with([code, side]),
    }
}

/// "prime lost in doubt; alignment, 0.30 mW, holds".
fn lost(row: &Row, failed: &[&Judged], last: &Judged, kept: &Judged) -> Saying {
    let grades = failed.iter().map(|judged| judged.grade.as_str()).collect::<Vec<_>>();
    let (grades, kept_grade) = (names(&grades, &COMMA), name(kept.grade.as_str()));
    let bound = kept.lower.or(kept.upper).map(|bound| figure(bound_text(row, bound)));
    match (in_doubt(last), bound) {
        (true, Some(bound)) => LOST_IN_DOUBT_BOUND.with([grades, kept_grade, bound]),
        (true, None) => LOST_IN_DOUBT.with([grades, kept_grade]),
        (false, Some(bound)) => LOST_BOUND.with([grades, said(place(row, last)), kept_grade, bound]),
        (false, None) => LOST.with([grades, said(place(row, last)), kept_grade]),
    }
}

/// A count that its interval would carry over the bound.
fn doubtful_count(row: &Row) -> Saying {
    let Value::Count { value, low, high } = row.value else { return Saying::none() };
    let outside = |n: u64, judged: &Judged| {
        judged.lower.is_some_and(|lower| (n as f64) < lower) || judged.upper.is_some_and(|upper| n as f64 > upper)
    };
    let doubtful = row.judged.iter().any(|judged| outside(low.min(value), judged) || outside(high.max(value), judged));
    if doubtful { COUNT_IN_DOUBT.with([figure(low), figure(high)]) } else { Saying::none() }
}

/// It fails although it lies inside: for want of a margin.
fn in_doubt(judged: &Judged) -> bool {
    judged.verdict == RowVerdict::Fail && matches!(judged.zone, Some(Zone::Inside | Zone::InsideByU))
}

/// "power 0.505 mW is above 0.50 mW, but not by its expanded uncertainty 0.015 mW (rule: guarded)".
fn why(row: &Row, judged: &Judged) -> Saying {
    let label = within(row.label.clone());
    match &row.value {
        Value::Word(word) => IS_WORD.with([label, name(word.as_str()), names(&judged.wanted, &OR)]),
        Value::Count { .. } => IS_COUNTED.with([label, shown(row), said(place(row, judged))]),
        Value::Number { expanded, .. } if in_doubt(judged) => {
            let (side, rule) = (said(nearest_bound(row, judged)), said(rule(&judged.rule)));
            if judged.rule == "guarded" {
                IN_DOUBT_BY_U.with([label, shown(row), side, figure(expanded_text(row, *expanded)), rule])
            } else {
                let probability = figure(format!("{:.3}", judged.conformance_probability.unwrap_or(0.0)));
                IN_DOUBT_BY_PROBABILITY.with([label, shown(row), side, probability, rule])
            }
        }
        _ => IS.with([label, shown(row), said(place(row, judged))]),
    }
}

/// Where the value lies: "below 0.30 mW", "above 0.50 mW, but not by U", "wanted clean".
fn place(row: &Row, judged: &Judged) -> Saying {
    if let Value::Word(_) = row.value {
        return WANTED.with([names(&judged.wanted, &OR)]);
    }
    let side = nearest_bound(row, judged);
    match in_doubt(judged) {
        true if judged.rule == "guarded" => NOT_BY_U.with([said(side)]),
        true => NOT_BY_PROBABILITY.with([said(side), figure(&judged.rule)]),
        false => side,
    }
}

fn broken_bound(row: &Row, judged: &Judged) -> Piece {
    if !judged.wanted.is_empty() {
        return names(&judged.wanted, &OR);
    }
    decisive(row, judged).map_or(said(&NO_BOUND), |(_, bound)| figure(bound_text(row, bound)))
}

fn bound_of(row: &Row, judged: &Judged) -> Piece {
    figure(judged.lower.or(judged.upper).map_or(String::new(), |bound| bound_text(row, bound)))
}

/// The value's side of the bound that decides: "above 0.50 mW".
fn nearest_bound(row: &Row, judged: &Judged) -> Saying {
    let Some((above, bound)) = decisive(row, judged) else { return (&INSIDE_NONE).into() };
    let side = if above { &ABOVE } else { &BELOW };
    side.with([figure(bound_text(row, bound))])
}

/// The bound that decides, SI, and whether the value lies above it.
fn decisive(row: &Row, judged: &Judged) -> Option<(bool, f64)> {
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
    nearest.map(|(_, bound)| (value >= bound, bound))
}

/// The value as people see it, with its unit: "0.505 mW".
fn shown(row: &Row) -> Piece {
    let measurand = find(&row.measurand);
    match &row.value {
        Value::Number { value, expanded, .. } => {
            let most = measurand.map_or(6, |m| m.decimals);
            let number = joint(si_to_shown(measurand, *value), si_to_shown(measurand, *expanded), most).0;
            figure(with_unit(measurand, number))
        }
        Value::Count { value, .. } => figure(value),
        Value::AtLeast(value) => said(AT_LEAST.with([figure(bound_text(row, *value))])),
        Value::Word(word) => name(word.as_str()),
        Value::Absent(_) => said(&WITHOUT_VALUE),
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
