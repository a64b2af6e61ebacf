//! A run of a reference tube: judged by its own values, and in words that speak of the bench.
//! Must not judge a tube.
//! Main functions: [`limits`], [`title`], [`verdict`].

use super::Run;
use crate::{
    limits::{Bound, Limit, Limits, Outside, Rule, Severity},
    phrase::{Saying, name, verdict as phrases},
    record::sheet::{Outcome, TubeVerdict},
    station::file::{Reference, ReferenceValue},
};

/// Reject code of a value out of bounds.
const OUT: &str = "out-of-bounds";
/// The one grade there is.
const GRADE: &str = "in bounds";

/// The values of a reference tube with their bounds as limits. The rule is `shared`: bounds are set by hand around what
/// the bench reads, so that its own uncertainty is in them.
pub(super) fn limits(reference: &Reference) -> Limits {
    let limit = |value: &ReferenceValue| Limit {
        measurand: value.measurand.clone(),
        lower: Bound::All(value.value - value.within),
        upper: Bound::All(value.value + value.within),
        wanted: Vec::new(),
        rule: None,
        severity: Severity::Major,
        reject: Some(OUT.to_owned()),
        outside: Outside::Fail,
        rack_skips: false,
    };
    Limits {
        revision: 0,
        sha256: String::new(),
        title: String::new(),
        grades: vec![GRADE.to_owned()],
        rule: Rule::Shared,
        limits: reference.values.iter().map(limit).collect(),
    }
}

/// What stands in the head where a tube has its type's title; none for a tube that is judged.
pub(super) fn title(run: &Run) -> Option<Saying> {
    let station = name(run.plan.station.station.clone());
    (!run.identity.run_kind.is_product()).then(|| phrases::REFERENCE_TITLE.with([station]))
}

/// The verdict in words that fit a bench.
pub(super) fn verdict(judged: TubeVerdict) -> TubeVerdict {
    let sentence = match judged.outcome {
        Outcome::Pass => (&phrases::REFERENCE_IN).into(),
        Outcome::Fail if judged.reject_code.as_deref() == Some(OUT) => (&phrases::REFERENCE_OUT).into(),
        _ => judged.sentence,
    };
    TubeVerdict { sentence, ..judged }
}
