//! What differs between two runs of a tube by more than the uncertainties allow.
//! Must not judge a tube: a change is no reject.
//! Main type: [`Change`]; main function: [`changes`].

use crate::measurand::{self, Shape};
use crate::report::{ReadRecord, ReadValue};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// A value that is not what it was.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Change {
    pub measurand: String,
    pub before: ReadValue,
    pub after: ReadValue,
    /// Difference and its expanded uncertainty for 95.45 %, SI; none for counts and words.
    pub difference: Option<(f64, f64)>,
}

/// The values that changed from one run to a later one, in the order of the sheet.
///
/// A number changed if the difference is larger than its expanded uncertainty; a count, a word if it is another.
pub(super) fn changes(before: &ReadRecord, after: &ReadRecord) -> Vec<Change> {
    let shared: Vec<&str> =
        before.certificates.iter().filter(|number| after.certificates.contains(number)).map(String::as_str).collect();
    let of = |new: &ReadValue| {
        let old = before.values.iter().find(|old| old.measurand == new.measurand && old.step == new.step)?;
        change(old, new, &shared)
    };
    after.values.iter().filter_map(of).collect()
}

fn change(old: &ReadValue, new: &ReadValue, shared: &[&str]) -> Option<Change> {
    if old.value.is_empty() || new.value.is_empty() {
        return None;
    }
    let found = |difference| {
        Some(Change { measurand: new.measurand.clone(), before: old.clone(), after: new.clone(), difference })
    };
    match measurand::find(&new.measurand).map(|known| known.shape) {
        Some(Shape::Normal | Shape::Positive) => {
            let (difference, expanded) = difference(old, new, shared)?;
            if difference.abs() > expanded { found(Some((difference, expanded))) } else { None }
        }
        _ if old.value != new.value => found(None),
        _ => None,
    }
}

/// Difference of two numbers and its expanded uncertainty, SI; none where one of them is a bound.
///
/// A line that both owe to the same certificate is fully correlated: of it the difference holds only how unlike its two
/// contributions are, c₂ − c₁; all other lines are independent. So u² = Σ c² + Σ (c₂ − c₁)² (JCGM 100:2008, eq. 16 with r = 0
/// and r = 1), and U = t(ν_eff)·u.
fn difference(old: &ReadValue, new: &ReadValue, shared: &[&str]) -> Option<(f64, f64)> {
    let factor = measurand::find(&new.measurand)?.unit().factor;
    let si = |value: &ReadValue| value.value.parse::<f64>().ok().map(|number| number * factor);
    let value = si(new)? - si(old)?;
    let is_shared = |line: &BudgetLine| {
        let of = |number: &&str| {
            line.source_id.strip_prefix(number).is_some_and(|rest| rest.is_empty() || rest.starts_with('/'))
        };
        line.evaluation == Evaluation::TypeB && shared.iter().any(of)
    };
    let (mut budget, mut common): (Vec<BudgetLine>, Vec<BudgetLine>) = (Vec::new(), Vec::new());
    for (sign, line) in lines(old, factor)?.map(|line| (-1.0, line)).chain(lines(new, factor)?.map(|line| (1.0, line)))
    {
        let signed = sign * line.sensitivity * line.standard_uncertainty;
        let line = BudgetLine { sensitivity: signed, standard_uncertainty: 1.0, ..line };
        if !is_shared(&line) {
            budget.push(line);
        } else if let Some(other) = common.iter_mut().find(|other| other.source_id == line.source_id) {
            other.sensitivity += line.sensitivity;
        } else {
            common.push(line);
        }
    }
    budget.append(&mut common);
    Some((value, Measured { value, budget }.expanded()))
}

/// The budget of a value; without one its expanded uncertainty as a single line. None if there is no uncertainty at all.
fn lines(value: &ReadValue, factor: f64) -> Option<impl Iterator<Item = BudgetLine>> {
    let mut lines = value.budget.clone();
    if lines.is_empty() {
        // Which k it was made with is not asked: 2 is that of many degrees of freedom.
        let u = value.expanded? * factor / 2.0;
        lines.push(BudgetLine::direct("", "", Evaluation::TypeB, u, f64::INFINITY));
    }
    value.expanded.map(|_| lines.into_iter())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// A power in mW with a scatter of 1 % and a meter good to 1.5 %.
    fn record(milliwatts: f64, meter: &str, scatter: f64) -> ReadRecord {
        let watts = milliwatts * 1e-3;
        let line = |id: &str, evaluation, u: f64| BudgetLine::direct(id, id, evaluation, u, f64::INFINITY);
        let budget =
            vec![line("scatter", Evaluation::TypeA, scatter * watts), line(meter, Evaluation::TypeB, 0.015 * watts)];
        let value = ReadValue {
            step: "power".into(),
            measurand: "power".into(),
            value: milliwatts.to_string(),
            unit: "mW".into(),
            expanded: Some(0.036 * milliwatts),
            note: String::new(),
            budget,
        };
        ReadRecord { certificates: vec![meter.into()], values: vec![value], ..ReadRecord::default() }
    }

    #[test]
    fn the_meter_does_not_count_twice() {
        // 1.00 and 1.02 mW, scatter 0.2 % each: on one meter u = √(0.002² + 0.00204² + (0.0153 − 0.015)²) mW = 0.00287 mW,
        // U = 0.0057 mW < 0.02 mW; on two meters u = 0.0216 mW, U = 0.043 mW.
        let (old, new) = (record(1.0, "SIM-2", 0.002), record(1.02, "SIM-2", 0.002));
        let (difference, expanded) = changes(&old, &new)[0].difference.unwrap();
        assert!((difference - 2e-5).abs() < 1e-12 && (expanded - 5.74e-6).abs() < 2e-8, "{difference} ± {expanded}");
        assert!(changes(&old, &record(1.02, "SIM-9", 0.002)).is_empty());
        // Scatter is of each run its own, whatever its name.
        assert!(changes(&record(1.0, "SIM-2", 0.01), &record(1.02, "SIM-2", 0.01)).is_empty());
        assert!(changes(&old, &old).is_empty());
    }

    #[test]
    fn words_and_counts_change_and_what_is_missing_does_not() {
        let with = |measurand: &str, value: &str| ReadRecord {
            values: vec![ReadValue { measurand: measurand.into(), value: value.into(), ..ReadValue::default() }],
            ..ReadRecord::default()
        };
        let n = |key: &str, old: &str, new: &str| changes(&with(key, old), &with(key, new)).len();
        assert_eq!((n("hop_count", "0", "2"), n("hop_count", "2", "2")), (1, 0));
        assert_eq!((n("visual.mirror", "clean", "film"), n("visual.mirror", "", "film")), (1, 0));
        // A lower bound has no uncertainty: nothing can be said.
        assert_eq!(n("extinction", "5000", "900"), 0);
    }
}
