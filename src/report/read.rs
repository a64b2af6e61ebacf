//! record.csv, budget.csv and their metadata read back: what stands in a frozen record, as it was written.
//! Must not open a file, measure or judge again: a frozen record is never worked out anew.
//! Main type: [`ReadRecord`]; main function: [`read_record`].

use serde_json::Value as Json;

use super::escape::restore;
use crate::uncertainty::{BudgetLine, Evaluation};

/// What a frozen record says.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ReadRecord {
    /// Id of the run.
    pub run_id: String,
    /// Station.
    pub station: String,
    /// Initials, or empty.
    pub technician: String,
    /// Start of the run, RFC 3339.
    pub started_at: String,
    /// End of the run, RFC 3339, or empty.
    pub ended_at: String,
    /// Revision of the limits.
    pub limits_revision: String,
    /// How the tube ended: the word of [`crate::record::sheet::Outcome`].
    pub outcome: String,
    /// Best grade left, or empty.
    pub grade: String,
    /// Reject code, or empty.
    pub reject_code: String,
    /// The verdict as the sheet says it.
    pub sentence: String,
    /// The reason beneath it, or empty.
    pub reason: String,
    /// Numbers of the certificates that the bench's instruments stood on.
    pub certificates: Vec<String>,
    /// The values, in the order of the sheet, each once.
    pub values: Vec<ReadValue>,
}

/// One value of a record.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ReadValue {
    /// Step that filled it.
    pub step: String,
    /// Measurand's key, or `visual.<step>`.
    pub measurand: String,
    /// Number or word as written; empty where there is none.
    pub value: String,
    /// UCUM code of value and uncertainty; empty for words.
    pub unit: String,
    /// Expanded uncertainty for 95.45 %, in that unit, where there is one.
    pub expanded: Option<f64>,
    /// Expanded over standard uncertainty, where there is one.
    pub coverage_factor: Option<f64>,
    /// Remarks; the reason of an absent value.
    pub note: String,
    /// Its budget, in SI.
    pub budget: Vec<BudgetLine>,
}

impl ReadValue {
    /// The value as a number, in its unit; none where it is empty or a word.
    pub fn number(&self) -> Option<f64> {
        self.value.parse().ok().filter(|number: &f64| number.is_finite())
    }
}

/// Reads a record back.
///
/// * `record_csv`, `budget_csv`, `metadata_json`: the bytes of the three files.
///
/// Errors: what does not fit, in words that follow the folder's name; a file that is not the one its metadata was made for too.
pub fn read_record(record_csv: &[u8], budget_csv: &[u8], metadata_json: &[u8]) -> Result<ReadRecord, String> {
    let metadata: Json = serde_json::from_slice(metadata_json)
        .map_err(|error| format!("record.csv-metadata.json cannot be read: {error}"))?;
    let notes = metadata.pointer("/notes/0").ok_or("record.csv-metadata.json has no notes of the run")?;
    let said = |path: &str| notes.pointer(path).and_then(Json::as_str).unwrap_or_default().to_owned();
    let mut record = ReadRecord {
        ended_at: said("/ended_at"),
        sentence: said("/verdict/sentence"),
        reason: said("/verdict/reason"),
        certificates: certificates(notes),
        ..ReadRecord::default()
    };
    for row in Rows::of("record.csv", record_csv)?.rows {
        match row.text("measurand").as_str() {
            "tube" => head(&mut record, &row),
            key if record.values.iter().any(|value| value.measurand == key && value.step == row.text("step")) => {}
            _ => record.values.push(value(&row)),
        }
    }
    if record.outcome.is_empty() {
        return Err("record.csv has no line for the tube itself".to_owned());
    }
    for row in Rows::of("budget.csv", budget_csv)?.rows {
        let (key, line) = (row.text("measurand"), budget_line(&row));
        // The budget names no step: of two rows of one measurand nobody could tell whose line it is.
        let mut values = record.values.iter_mut().filter(|value| value.measurand == key);
        if let (Some(value), None) = (values.next(), values.next()) {
            value.budget.push(line);
        }
    }
    Ok(record)
}

/// The hashes of record.csv and budget.csv that the metadata were made for, in this order.
pub fn hashes_in(metadata_json: &[u8]) -> [Option<String>; 2] {
    let metadata: Json = serde_json::from_slice(metadata_json).unwrap_or_default();
    [0, 1].map(|table| metadata.pointer(&format!("/tables/{table}/notes/0/sha256"))?.as_str().map(str::to_owned))
}

fn certificates(notes: &Json) -> Vec<String> {
    let instruments = notes.get("instruments").and_then(Json::as_array).map_or(&[][..], Vec::as_slice);
    let numbers = instruments.iter().filter_map(|instrument| instrument.get("certificate")?.as_str());
    numbers.filter(|number| !number.is_empty()).map(str::to_owned).collect()
}

fn head(record: &mut ReadRecord, row: &Row) {
    record.run_id = row.text("run_id");
    record.station = row.text("station");
    record.technician = row.text("technician");
    record.started_at = row.text("started_at");
    record.limits_revision = row.text("limits_revision");
    record.outcome = row.text("verdict");
    record.grade = row.text("grade");
    record.reject_code = row.text("reject_code");
}

fn value(row: &Row) -> ReadValue {
    ReadValue {
        step: row.text("step"),
        measurand: row.text("measurand"),
        value: row.text("value"),
        unit: row.text("unit"),
        expanded: row.number("expanded_uncertainty"),
        coverage_factor: row.number("coverage_factor").filter(|k| *k > 0.0),
        note: row.text("note"),
        budget: Vec::new(),
    }
}

fn budget_line(row: &Row) -> BudgetLine {
    BudgetLine {
        source_id: row.text("source_id"),
        line: row.text("line"),
        evaluation: if row.text("type") == "A" { Evaluation::TypeA } else { Evaluation::TypeB },
        standard_uncertainty: row.number("standard_uncertainty").unwrap_or(0.0),
        // Empty: nothing is known against it.
        dof: row.number("dof").unwrap_or(f64::INFINITY),
        sensitivity: row.number("sensitivity").unwrap_or(0.0),
        note: row.text("note"),
    }
}

/// The lines of a CSV file, each with the names of its columns.
struct Rows {
    rows: Vec<Row>,
}

struct Row {
    names: csv::StringRecord,
    cells: csv::StringRecord,
}

impl Rows {
    fn of(name: &str, bytes: &[u8]) -> Result<Self, String> {
        let unreadable = |error: csv::Error| format!("{name} cannot be read: {error}");
        let mut reader = csv::Reader::from_reader(bytes);
        let names = reader.headers().map_err(unreadable)?.clone();
        if !names.iter().any(|column| column == "measurand") {
            return Err(format!("{name} has no column `measurand`"));
        }
        let rows = reader.records().map(|cells| Ok(Row { names: names.clone(), cells: cells.map_err(unreadable)? }));
        Ok(Self { rows: rows.collect::<Result<_, String>>()? })
    }
}

impl Row {
    fn cell(&self, column: &str) -> &str {
        let index = self.names.iter().position(|name| name == column);
        index.and_then(|index| self.cells.get(index)).unwrap_or_default()
    }

    fn text(&self, column: &str) -> String {
        restore(self.cell(column)).to_owned()
    }

    fn number(&self, column: &str) -> Option<f64> {
        self.cell(column).parse().ok().filter(|number: &f64| number.is_finite())
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    const BUDGET: &[u8] = b"measurand,source_id,line,type,standard_uncertainty,dof,sensitivity,note\r\n\
        power,scatter,scatter,A,1e-6,9,1.02,\r\npower,C-1,meter,B,0.015,,0.0009,\r\n";
    const METADATA: &[u8] =
        b"{\"notes\":[{\"ended_at\":\"2026-03-02T09:00:00+00:00\",\"verdict\":{\"reason\":\"dim\"},\
        \"instruments\":[{\"certificate\":\"C-1\"},{\"certificate\":\"\"}]}],\
        \"tables\":[{\"notes\":[{\"sha256\":\"ab\"}]},{}]}";

    #[test]
    fn numbers_words_and_what_is_no_record() {
        let text = b"run_id,step,measurand,value,expanded_uncertainty,coverage_factor,verdict,grade,note\r\n\
            r,,tube,,,,pass,prime,\r\nr,p,power,0.91,0.02,2.1,pass,prime,\r\nr,p,power,0.91,0.02,2.1,pass,alignment,\r\n\
            r,g,visual.getter,bright,,,pass,,'=1\r\n";
        let record = read_record(text, BUDGET, METADATA).unwrap();
        assert_eq!((record.outcome.as_str(), record.grade.as_str(), record.reason.as_str()), ("pass", "prime", "dim"));
        let values: Vec<_> = record.values.iter().map(|value| (value.measurand.as_str(), value.number())).collect();
        assert_eq!(values, [("power", Some(0.91)), ("visual.getter", None)], "a row of two grades is one value");
        assert_eq!((record.values[0].expanded, record.values[0].coverage_factor), (Some(0.02), Some(2.1)));
        assert_eq!((record.values[1].value.as_str(), record.values[1].note.as_str()), ("bright", "=1"));
        let dofs: Vec<f64> = record.values[0].budget.iter().map(|line| line.dof).collect();
        assert_eq!((dofs, record.certificates), (vec![9.0, f64::INFINITY], vec!["C-1".to_owned()]));
        assert_eq!(hashes_in(METADATA), [Some("ab".into()), None]);
        assert!(read_record(b"a,b\n1,2\n", BUDGET, METADATA).unwrap_err().contains("no column `measurand`"));
        assert!(
            read_record(b"measurand,value\npower,1\n", BUDGET, METADATA).unwrap_err().contains("no line for the tube")
        );
        assert!(read_record(b"measurand,value\n1\n", BUDGET, METADATA).is_err(), "a torn line");
        assert!(read_record(text, BUDGET, b"{").is_err());
    }
}
