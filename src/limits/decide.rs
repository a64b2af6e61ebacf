//! One row against one limit, for every grade: zone, probability, verdict.
//! Must not know the tube's other rows.
//! Main function: [`judge_row`].

use super::{
    Bound, Limit, Limits, Outside, Rule,
    conformance::{conformance_probability, zone},
};
use crate::{
    measurand::{Shape, find},
    record::sheet::{Judged, Row, RowVerdict, Value, Zone},
};

/// What a value gives for one grade, before `outside` has its say.
struct Decision {
    verdict: RowVerdict,
    zone: Option<Zone>,
    probability: Option<f64>,
}

impl Decision {
    fn plain(verdict: RowVerdict) -> Self {
        Self { verdict, zone: None, probability: None }
    }

    fn of(passes: bool) -> Self {
        Self::plain(if passes { RowVerdict::Pass } else { RowVerdict::Fail })
    }
}

/// Judges a row by its limit.
///
/// * `finished`: a row without a value gives hold; while the run is open it is only not judged yet.
///
/// Returns one entry for each grade, best first; one with an empty grade where all share the bounds.
/// A grade without a bound passes whatever the value is, but not without one.
pub fn judge_row(row: &Row, limit: &Limit, limits: &Limits, finished: bool) -> Vec<Judged> {
    let shared_bounds = [&limit.lower, &limit.upper].iter().all(|bound| !matches!(bound, Bound::PerGrade(_)));
    let grades = if shared_bounds { vec![String::new()] } else { limits.grades.clone() };
    let counted = find(&limit.measurand).is_some_and(|measurand| measurand.shape == Shape::Count);
    let exact = counted || !limit.wanted.is_empty() || matches!(row.value, Value::Count { .. } | Value::Word(_));
    let rule = if exact { Rule::Shared } else { limit.rule.unwrap_or(limits.rule) };
    let judge = |grade: String| {
        let (lower, upper) = (limit.lower.of(&grade), limit.upper.of(&grade));
        let decision = decide(row, limit, (lower, upper), rule, finished);
        let verdict = match (decision.verdict, limit.outside) {
            (RowVerdict::Fail, Outside::Hold) => RowVerdict::Hold,
            (verdict, _) => verdict,
        };
        Judged {
            grade,
            lower,
            upper,
            wanted: limit.wanted.clone(),
            rule: rule.to_string(),
            conformance_probability: decision.probability,
            zone: decision.zone,
            verdict,
            reject_code: if verdict == RowVerdict::Fail { limit.reject.clone() } else { None },
        }
    };
    grades.into_iter().map(judge).collect()
}

fn decide(row: &Row, limit: &Limit, bounds: (Option<f64>, Option<f64>), rule: Rule, finished: bool) -> Decision {
    let inside =
        |value: f64| bounds.0.is_none_or(|lower| value >= lower) && bounds.1.is_none_or(|upper| value <= upper);
    let about_words = !limit.wanted.is_empty();
    match &row.value {
        Value::Absent(_) if !finished => Decision::plain(RowVerdict::NotJudged),
        Value::Word(word) if about_words => Decision::of(limit.wanted.contains(word)),
        Value::Count { value, .. } if !about_words => Decision::of(inside(*value as f64)),
        Value::AtLeast(least) if !about_words && least.is_finite() => at_least(*least, bounds),
        Value::Number { value, u, expanded, dof, .. }
            if !about_words && value.is_finite() && u.is_finite() && expanded.is_finite() && *expanded >= 0.0 =>
        {
            let shape = find(&row.measurand).map_or(Shape::Normal, |measurand| measurand.shape);
            let zone = zone(*value, *expanded, bounds.0, bounds.1);
            let key = (row.measurand.as_str(), shape);
            let probability = conformance_probability(key, (*value, *u, *dof), bounds.0, bounds.1);
            let passes = match (zone, rule) {
                (None, _) => true,
                (Some(zone), Rule::Guarded) => zone == Zone::InsideByU,
                (Some(_), Rule::Probability(wanted)) => probability.is_some_and(|probability| probability >= wanted),
                (Some(zone), Rule::Shared) => matches!(zone, Zone::InsideByU | Zone::Inside),
            };
            Decision { zone, probability, ..Decision::of(passes) }
        }
        // Absent, not finite, or of another kind than the limit: nothing that could be judged.
        _ => Decision::plain(RowVerdict::Hold),
    }
}

/// A lower bound of a value (its far end drowned in noise). It shows what it reaches, never what it does not:
/// at or above a lower bound it passes, above an upper bound it fails, anything else is undecided and gives hold.
fn at_least(least: f64, (lower, upper): (Option<f64>, Option<f64>)) -> Decision {
    Decision::plain(match (lower, upper) {
        (_, Some(upper)) if least > upper => RowVerdict::Fail,
        (_, Some(_)) => RowVerdict::Hold,
        (Some(lower), None) if least < lower => RowVerdict::Hold,
        _ => RowVerdict::Pass,
    })
}
