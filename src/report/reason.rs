//! The sentence under a pass that gives no reason of its own: how many limits hold, and which is nearest.
//! Must not judge: it counts verdicts that stand in the sheet.
//! Main function: [`of_pass`].

use super::text::{bound_text, value_text};
use crate::{
    measurand,
    phrase::{Language, figure, name, page, within},
    record::sheet::{Judged, Outcome, Row, RowVerdict, Sheet, Value},
};

/// "All 14 limits hold; the nearest is power ripple, 1.04 % of at most 2 %."
///
/// Nothing unless the tube passed and every limit of its grade holds. Nearest in units of the expanded uncertainty;
/// counts and looks have none and are only counted.
pub fn of_pass(sheet: &Sheet, language: Language) -> Option<String> {
    let verdict = &sheet.verdict;
    if verdict.outcome != Outcome::Pass {
        return None;
    }
    let grade = verdict.grade.as_deref().unwrap_or_default();
    let limited: Vec<(&Row, &Judged)> = sheet
        .rows
        .iter()
        .flat_map(|row| row.judged.iter().map(move |judged| (row, judged)))
        .filter(|(_, judged)| judged.grade.is_empty() || judged.grade == grade)
        .filter(|(_, judged)| judged.lower.is_some() || judged.upper.is_some() || !judged.wanted.is_empty())
        .collect();
    if limited.is_empty() || limited.iter().any(|(_, judged)| judged.verdict != RowVerdict::Pass) {
        return None;
    }
    let margins = limited.iter().filter_map(|(row, judged)| Some((row, margin(row, judged)?)));
    let nearest = margins.min_by(|a, b| a.1.in_u.total_cmp(&b.1.in_u));
    Some(match (nearest, limited.len()) {
        (Some((row, margin)), n) => said(row, &margin, n, language),
        (None, 1) => page::ONE_LIMIT_HOLDS.of(language).to_owned(),
        (None, n) => page::LIMITS_HOLD.with([figure(n)]).text(language),
    })
}

/// How far a value lies inside its nearer bound.
struct Margin {
    /// In units of U.
    in_u: f64,
    /// That bound, SI.
    bound: f64,
    /// It is the upper one.
    upper: bool,
}

fn margin(row: &Row, judged: &Judged) -> Option<Margin> {
    let Value::Number { value, expanded, .. } = row.value else { return None };
    let lower = judged.lower.map(|bound| Margin { in_u: (value - bound) / expanded, bound, upper: false });
    let upper = judged.upper.map(|bound| Margin { in_u: (bound - value) / expanded, bound, upper: true });
    lower.into_iter().chain(upper).filter(|m| m.in_u.is_finite()).min_by(|a, b| a.in_u.total_cmp(&b.in_u))
}

/// * `n`: limits that hold.
fn said(row: &Row, margin: &Margin, n: usize, language: Language) -> String {
    let text = value_text(row, language);
    let unit = if text.unit.is_empty() { String::new() } else { format!("\u{a0}{}", text.unit) };
    let bound = bound_text(measurand::find(&row.measurand), margin.bound, language);
    let phrase = match (n, margin.upper) {
        (1, true) => &page::ONE_LIMIT_NEAREST_MOST,
        (1, false) => &page::ONE_LIMIT_NEAREST_LEAST,
        (_, true) => &page::LIMITS_NEAREST_MOST,
        (_, false) => &page::LIMITS_NEAREST_LEAST,
    };
    let (value, bound) = (name(format!("{}{unit}", text.value)), name(format!("{bound}{unit}")));
    phrase.with([within(row.label.clone()), value, bound, figure(n)]).text(language)
}
