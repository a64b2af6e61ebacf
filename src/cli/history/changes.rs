//! What differs between runs of a tube by more than the uncertainties allow.
//! Must not judge a tube: a change is no reject.
//! Main types: [`Comparison`], [`Change`]; main function: [`comparisons`].

use std::collections::BTreeMap;

use crate::measurand::{self, Shape};
use crate::report::{ReadRecord, ReadValue};
use crate::uncertainty::{BudgetLine, COVERAGE, Evaluation, Measured, coverage_factor};

/// The rows of a run beside those of the earlier run that was the last one to have them.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Comparison {
    /// Numbers of the two runs, from 1.
    pub from: usize,
    pub to: usize,
    /// How many rows were compared.
    pub rows: usize,
    /// Those that changed, in the order of the sheet.
    pub changes: Vec<Change>,
}

/// A value that is not what it was.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Change {
    pub measurand: String,
    pub before: ReadValue,
    pub after: ReadValue,
    pub by: By,
}

/// By how much, after less before.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum By {
    /// Counts and words: another one.
    Another,
    /// Difference and its expanded uncertainty for 95.45 %, SI.
    Difference(f64, f64),
    /// One of the two is a lower bound: the difference has this sign and at least this size, SI.
    AtLeast(f64),
}

/// Each run beside the earlier ones: a row with the last one that has a value there, so that a run that was stopped hides nothing.
///
/// A number changed if the difference is larger than its expanded uncertainty; a count, a word if it is another.
pub(super) fn comparisons(records: &[&ReadRecord]) -> Vec<Comparison> {
    let beside = |to: usize| {
        let mut groups = BTreeMap::new();
        let after = records.get(to)?;
        for new in after.values.iter().filter(|value| !value.value.is_empty()) {
            let earlier = records.iter().take(to).enumerate().rev();
            let Some((from, before, old)) = earlier.filter_map(|(at, it)| Some((at, it, same_row(it, new)?))).next()
            else {
                continue;
            };
            let empty = Comparison { from: from + 1, to: to + 1, rows: 0, changes: Vec::new() };
            let group = groups.entry(from).or_insert(empty);
            group.rows += 1;
            group.changes.extend(change(old, new, &shared(before, after)));
        }
        Some(groups.into_values())
    };
    (1..records.len()).filter_map(beside).flatten().collect()
}

fn same_row<'a>(record: &'a ReadRecord, new: &ReadValue) -> Option<&'a ReadValue> {
    let is = |old: &&ReadValue| old.measurand == new.measurand && old.step == new.step && !old.value.is_empty();
    record.values.iter().find(is)
}

/// Certificates that both stood on.
fn shared<'a>(before: &'a ReadRecord, after: &ReadRecord) -> Vec<&'a str> {
    before.certificates.iter().filter(|number| after.certificates.contains(number)).map(String::as_str).collect()
}

fn change(old: &ReadValue, new: &ReadValue, shared: &[&str]) -> Option<Change> {
    let by = match measurand::find(&new.measurand).map(|known| known.shape) {
        Some(Shape::Normal | Shape::Positive) => match (old.expanded, new.expanded) {
            (Some(_), Some(_)) => {
                let (difference, expanded) = difference(old, new, shared)?;
                (difference.abs() > expanded).then_some(By::Difference(difference, expanded))?
            }
            (None, Some(expanded)) => By::AtLeast(-under(new, expanded, old)?),
            (Some(expanded), None) => By::AtLeast(under(old, expanded, new)?),
            // Two lower bounds: the true values may be anywhere above them.
            (None, None) => return None,
        },
        _ => (old.value != new.value).then_some(By::Another)?,
    };
    Some(Change { measurand: new.measurand.clone(), before: old.clone(), after: new.clone(), by })
}

/// By how much at least a number lies under a lower bound: from the upper end of its coverage interval, SI. None if it may reach it.
///
/// A number without an uncertainty is a lower bound: `record.csv` knows no other.
fn under(value: &ReadValue, expanded: f64, bound: &ReadValue) -> Option<f64> {
    let factor = measurand::find(&value.measurand)?.unit().factor;
    let least = (bound.number()? - value.number()? - expanded) * factor;
    (least > 0.0).then_some(least)
}

/// Difference of two numbers and its expanded uncertainty, SI.
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
    let expanded = value.expanded?;
    let mut lines = value.budget.clone();
    if lines.is_empty() {
        let k = value.coverage_factor.unwrap_or(2.0);
        lines.push(BudgetLine::direct("", "", Evaluation::TypeB, expanded * factor / k, dof_of(k)));
    }
    Some(lines.into_iter())
}

/// The degrees of freedom that a coverage factor for 95.45 % was made with.
fn dof_of(k: f64) -> f64 {
    // Beyond 200 the factor is within 0.7 % of that of a normal distribution.
    let few = (1..=200).map(f64::from).find(|dof| coverage_factor(COVERAGE, *dof) <= k * (1.0 + 1e-9));
    few.unwrap_or(f64::INFINITY)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::panic)]
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
            budget,
            ..ReadValue::default()
        };
        ReadRecord { certificates: vec![meter.into()], values: vec![value], ..ReadRecord::default() }
    }

    fn changes(before: &ReadRecord, after: &ReadRecord) -> Vec<Change> {
        comparisons(&[before, after]).into_iter().flat_map(|group| group.changes).collect()
    }

    /// A record of one value; of no uncertainty where `expanded` is none.
    fn with(measurand: &str, value: &str, expanded: Option<f64>) -> ReadRecord {
        let value = ReadValue { measurand: measurand.into(), value: value.into(), expanded, ..ReadValue::default() };
        ReadRecord { values: vec![value], ..ReadRecord::default() }
    }

    #[test]
    fn the_meter_does_not_count_twice() {
        // 1.00 and 1.02 mW, scatter 0.2 % each: on one meter u = √(0.002² + 0.00204² + (0.0153 − 0.015)²) mW = 0.00287 mW,
        // U = 0.0057 mW < 0.02 mW; on two meters u = 0.0216 mW, U = 0.043 mW.
        let (old, new) = (record(1.0, "SIM-2", 0.002), record(1.02, "SIM-2", 0.002));
        let By::Difference(difference, expanded) = changes(&old, &new)[0].by else { panic!("two numbers") };
        assert!((difference - 2e-5).abs() < 1e-12 && (expanded - 5.74e-6).abs() < 2e-8, "{difference} ± {expanded}");
        assert!(changes(&old, &record(1.02, "SIM-9", 0.002)).is_empty());
        // Scatter is of each run its own, whatever its name.
        assert!(changes(&record(1.0, "SIM-2", 0.01), &record(1.02, "SIM-2", 0.01)).is_empty());
        assert!(changes(&old, &old).is_empty());
    }

    #[test]
    fn words_and_counts_change_and_what_is_missing_does_not() {
        let n = |key: &str, old: &str, new: &str| changes(&with(key, old, None), &with(key, new, None)).len();
        assert_eq!((n("hop_count", "0", "2"), n("hop_count", "2", "2")), (1, 0));
        assert_eq!((n("visual.mirror", "clean", "film"), n("visual.mirror", "", "film")), (1, 0));
    }

    #[test]
    fn a_lower_bound_says_which_way_and_by_how_much_at_least() {
        let by = |old, new| {
            let record = |(value, expanded)| with("extinction", value, expanded);
            changes(&record(old), &record(new)).first().map(|change| change.by)
        };
        let (bound, low, near) = (("5000", None), ("900", Some(50.0)), ("4960", Some(50.0)));
        // 5000 - (900 + 50), down or up.
        assert_eq!((by(bound, low), by(low, bound)), (Some(By::AtLeast(-4050.0)), Some(By::AtLeast(4050.0))));
        // What may reach the bound, or lies above it, may be what it was.
        assert_eq!((by(bound, near), by(near, bound), by(bound, ("9000", Some(50.0)))), (None, None, None));
        // Of two lower bounds both may be the same.
        assert_eq!(by(bound, ("900", None)), None);
    }

    #[test]
    fn a_row_is_compared_with_the_last_run_that_has_it() {
        let (full, stopped) = (record(1.0, "SIM-2", 0.002), with("power", "", None));
        let mut last = record(0.9, "SIM-2", 0.002);
        last.values.extend(with("hop_count", "1", None).values);
        let groups = comparisons(&[&full, &with("hop_count", "1", None), &stopped, &last]);
        let seen: Vec<_> = groups.iter().map(|it| (it.from, it.to, it.rows, it.changes.len())).collect();
        assert_eq!(seen, [(1, 4, 1, 1), (2, 4, 1, 0)]);
    }

    #[test]
    fn without_a_budget_the_stated_coverage_factor_counts() {
        // U = 0.03 mW each. From 2 degrees of freedom k = 4.53 (JCGM 100:2008, table G.2): u = 0.00663 mW, of the difference
        // 0.00937 mW with 4 of them, k = 2.87: U = 0.0269 mW. From k = 2 it were 0.0424 mW.
        let of = |milliwatts: &str, k| {
            let mut record = with("power", milliwatts, Some(0.03));
            record.values[0].coverage_factor = k;
            record
        };
        let by = |k| changes(&of("1", k), &of("1.035", k)).first().map(|change| change.by);
        let Some(By::Difference(_, expanded)) = by(Some(coverage_factor(COVERAGE, 2.0))) else { panic!("a change") };
        assert!((expanded - 2.69e-5).abs() < 2e-7, "{expanded}: the table has two decimals");
        assert_eq!((by(Some(2.0)), by(None)), (None, None));
        assert_eq!((dof_of(coverage_factor(COVERAGE, 5.0)), dof_of(2.0)), (5.0, f64::INFINITY));
    }
}
