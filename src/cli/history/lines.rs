//! The past of a tube for programs: JSON lines, and CSV with a line a value.
//! Must not round: values stand as they were frozen.
//! Main functions: [`json`], [`csv`].

use serde_json::{Value as Json, json};

use super::{
    changes::{By, Change, Comparison, comparisons},
    gather::{Column, Past},
};
use crate::cli::{Ending, Failure};
use crate::measurand;
use crate::report::{ReadValue, neutralise};

/// One object a line: `run`, `life`, `change` or `left_out` says what it is.
pub(super) fn json(past: &Past) -> String {
    let mut lines: Vec<Json> = past.columns.iter().enumerate().map(|(at, column)| run(at + 1, column)).collect();
    lines.extend(past.life.iter().map(|event| {
        json!({ "life": event.kind.word(), "date": event.date, "note": event.note, "noted_at": event.noted_at,
                "after_run_id": event.after })
    }));
    let compared = comparisons(&past.columns.iter().map(|column| &column.record).collect::<Vec<_>>());
    lines.extend(compared.iter().flat_map(|it| it.changes.iter().map(move |change| changed_line(it, change))));
    lines.extend(past.left_out.iter().map(|why| json!({ "left_out": why })));
    lines.iter().map(|line| line.to_string() + "\n").collect()
}

fn run(number: usize, column: &Column) -> Json {
    let (who, record) = (&column.identity, &column.record);
    let or_null = |text: &str| if text.is_empty() { Json::Null } else { json!(text) };
    let values: serde_json::Map<String, Json> = record.values.iter().flat_map(fields).collect();
    json!({
        "run": number,
        "run_id": who.run_id,
        "serial": who.serial,
        "tube_type": who.tube_type,
        "started_at": who.started_at,
        "ended_at": or_null(&record.ended_at),
        "kind": if who.run_kind.is_product() { "product" } else { "reference" },
        "frozen": column.frozen,
        "verdict": or_null(&record.outcome),
        "grade": or_null(&record.grade),
        "reject_code": or_null(&record.reject_code),
        "reason": record.reason,
        "technician": or_null(&who.technician),
        "station": record.station,
        "limits_revision": record.limits_revision.parse::<u64>().ok(),
        "repeats_run_id": who.repeats.as_ref().map(|repeat| &repeat.run_id),
        "repeat_reason": who.repeats.as_ref().map(|repeat| &repeat.reason),
        "folder": column.folder.to_string_lossy(),
        "values": values,
    })
}

/// Value and standard uncertainty in SI under the measurand's keys, words as they are; unknown is null.
fn fields(value: &ReadValue) -> Vec<(String, Json)> {
    let Some(known) = measurand::find(&value.measurand) else {
        return vec![(value.measurand.clone(), if value.value.is_empty() { Json::Null } else { json!(value.value) })];
    };
    let factor = known.unit().factor;
    let number = value.value.parse::<f64>().ok().map(|number| number * factor);
    let u_key = format!("{}_u{}", known.key, known.unit().dimension.suffix());
    let u = value.expanded.map(|_| value.budget.iter().map(|line| line.contribution().powi(2)).sum::<f64>().sqrt());
    let mut fields = vec![(known.json_key(), json!(number))];
    fields.extend(u.filter(|u| *u > 0.0).map(|u| (u_key, json!(u))));
    fields
}

/// A difference beside a lower bound is no number: `difference_at_least_si` is the least one, with its sign.
fn changed_line(runs: &Comparison, change: &Change) -> Json {
    let key =
        measurand::find(&change.measurand).map_or_else(|| change.measurand.clone(), measurand::Measurand::json_key);
    let (difference, expanded, at_least) = match change.by {
        By::Another => (None, None, None),
        By::Difference(difference, expanded) => (Some(difference), Some(expanded), None),
        By::AtLeast(least) => (None, None, Some(least)),
    };
    json!({
        "change": key,
        "from_run": runs.from,
        "to_run": runs.to,
        "before": change.before.value,
        "after": change.after.value,
        "unit": change.after.unit,
        "difference_si": difference,
        "difference_expanded_si": expanded,
        "difference_at_least_si": at_least,
    })
}

const COLUMNS: [&str; 16] = [
    "run",
    "run_id",
    "serial",
    "tube_type",
    "started_at",
    "kind",
    "verdict",
    "grade",
    "reject_code",
    "technician",
    "station",
    "measurand",
    "value",
    "unit",
    "expanded_uncertainty",
    "note",
];

/// One line a value, each with its run; absent is empty with the reason in `note`.
pub(super) fn csv(past: &Past) -> Result<String, Failure> {
    let mut writer = csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).from_writer(Vec::new());
    let wrong = |error: String| Failure::new(Ending::Store, format!("failed to write the table: {error}"));
    writer.write_record(COLUMNS).map_err(|error| wrong(error.to_string()))?;
    for (at, column) in past.columns.iter().enumerate() {
        let (who, record) = (&column.identity, &column.record);
        let kind = if who.run_kind.is_product() { "product" } else { "reference" };
        for value in &record.values {
            let expanded = value.expanded.map(|number| number.to_string()).unwrap_or_default();
            // A number is never touched; a word is made harmless as in record.csv.
            let shown = if value.value.parse::<f64>().is_ok() { value.value.clone() } else { neutralise(&value.value) };
            let text = [&who.run_id, &who.serial, &who.tube_type, &who.started_at].map(|text| neutralise(text));
            let rest = [
                &record.outcome,
                &record.grade,
                &record.reject_code,
                &who.technician,
                &record.station,
                &value.measurand,
            ];
            let cells = std::iter::once((at + 1).to_string()).chain(text).chain([kind.to_owned()]);
            let cells = cells.chain(rest.map(|text| neutralise(text)));
            let cells = cells.chain([shown, value.unit.clone(), expanded, neutralise(&value.note)]);
            writer.write_record(cells).map_err(|error| wrong(error.to_string()))?;
        }
    }
    let bytes = writer.into_inner().map_err(|error| wrong(error.to_string()))?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}
