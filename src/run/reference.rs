//! A run of a reference tube: judged by its own values, and in words that speak of the bench.
//! Must not judge a tube.
//! Main functions: [`limits`], [`verdict`].

use crate::{
    limits::{Bound, Limit, Limits, Outside, Rule, Severity},
    record::sheet::{Outcome, TubeVerdict},
    station::file::{Reference, ReferenceValue},
};

/// Reject code of a value out of bounds.
const OUT: &str = "out-of-bounds";
/// The one grade there is.
const GRADE: &str = "in bounds";

/// The values of a reference tube with their bounds as limits. The rule is `shared`: bounds are set by hand around what
/// the bench reads, so that its own uncertainty is in them.
pub(super) fn limits(reference: &Reference, station: &str) -> Limits {
    let limit = |value: &ReferenceValue| Limit {
        measurand: value.measurand.clone(),
        lower: Bound::All(value.value - value.within),
        upper: Bound::All(value.value + value.within),
        wanted: Vec::new(),
        rule: None,
        severity: Severity::Major,
        reject: Some(OUT.to_owned()),
        outside: Outside::Fail,
    };
    Limits {
        revision: 0,
        sha256: String::new(),
        title: format!("Reference tube of {station}: judges the bench, not the tube"),
        grades: vec![GRADE.to_owned()],
        rule: Rule::Shared,
        limits: reference.values.iter().map(limit).collect(),
    }
}

/// The verdict in words that fit a bench.
pub(super) fn verdict(judged: TubeVerdict) -> TubeVerdict {
    let sentence = match judged.outcome {
        Outcome::Pass => "reference, the bench reads it in bounds.".to_owned(),
        Outcome::Fail if judged.reject_code.as_deref() == Some(OUT) => {
            "reference, the bench reads it out of bounds.".to_owned()
        }
        _ => judged.sentence,
    };
    TubeVerdict { sentence, ..judged }
}
