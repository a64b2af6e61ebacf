//! Rows and endings as JSON objects, one a line.
//! Must not round: values are SI, as stored.
//! Main functions: [`row_json`], [`ended_json`].

use serde_json::{Value as Json, json};

use crate::measurand;
use crate::record::sheet::{Row, Sheet, Value};

/// A row as JSON: the value in SI under the measurand's key with the unit's suffix, unknown null.
pub(super) fn row_json(row: &Row) -> String {
    let known = measurand::find(&row.measurand);
    let key = known.map_or_else(|| row.measurand.clone(), measurand::Measurand::json_key);
    let (value, u, absent) = match &row.value {
        Value::Number { value, u, .. } => (json!(value), json!(u), Json::Null),
        Value::Count { value, .. } => (json!(value), Json::Null, Json::Null),
        Value::AtLeast(least) => (json!(least), Json::Null, Json::Null),
        Value::Word(word) => (json!(word), Json::Null, Json::Null),
        Value::Absent(reason) => (Json::Null, Json::Null, json!(reason.english())),
    };
    let mut fields = vec![("step", json!(row.step)), ("measurand", json!(row.measurand)), (key.as_str(), value)];
    let u_key = known.map(|m| format!("{}_u{}", m.key, m.unit().dimension.suffix()));
    if let Some(u_key) = &u_key {
        fields.push((u_key, u));
    }
    let verdicts = row.judged.iter().map(|judged| json!({ "grade": judged.grade, "verdict": judged.verdict.word() }));
    fields.push(("is_lower_bound", json!(matches!(row.value, Value::AtLeast(_)))));
    fields.push(("absent", absent));
    fields.push(("judged", verdicts.collect()));
    fields.push(("note", json!(row.note.english())));
    object(&fields)
}

/// A JSON object whose fields stay in the order given.
fn object(fields: &[(&str, Json)]) -> String {
    let fields: Vec<String> = fields.iter().map(|(key, value)| format!("{}:{value}", json!(key))).collect();
    format!("{{{}}}", fields.join(","))
}

/// How a run ended, and where its record is.
pub(super) fn ended_json(sheet: &Sheet, folder: &std::path::Path) -> String {
    let verdict = &sheet.verdict;
    object(&[
        ("run_id", json!(sheet.identity.run_id)),
        ("serial", json!(sheet.identity.serial)),
        ("verdict", json!(verdict.outcome.word())),
        ("grade", json!(verdict.grade)),
        ("reject_code", json!(verdict.reject_code)),
        ("sentence", json!(verdict.sentence.english())),
        ("reason", json!(verdict.reason.english())),
        ("record_csv", json!(folder.join("record.csv").to_string_lossy())),
        ("record_pdf", json!(folder.join("record.pdf").to_string_lossy())),
    ])
}
