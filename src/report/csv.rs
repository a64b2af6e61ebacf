//! record.csv and budget.csv: RFC 4180, UTF-8, fixed columns; English with a decimal point, whatever the sheet speaks.
//! Must not round what a reader could judge with: ten significant digits, so that every platform writes the same.
//! Main functions: [`record_csv`], [`budget_csv`].

use super::escape::neutralise;
use crate::{
    measurand::{self, Group},
    phrase::{Saying, page::SIMULATED},
    record::sheet::{Judged, Row, RowVerdict, Sheet, Value},
    uncertainty::Evaluation,
};

/// Columns of record.csv, in their order.
pub const RECORD_COLUMNS: [&str; 25] = [
    "run_id",
    "serial",
    "tube_type",
    "grade",
    "lot",
    "station",
    "technician",
    "started_at",
    "step",
    "measurand",
    "value",
    "unit",
    "expanded_uncertainty",
    "coverage_factor",
    "lower",
    "upper",
    "wanted",
    "rule",
    "conformance_probability",
    "verdict",
    "reject_code",
    "recipe_revision",
    "limits_revision",
    "program_version",
    "note",
];

/// Columns of budget.csv, in their order.
pub const BUDGET_COLUMNS: [&str; 8] =
    ["measurand", "source_id", "line", "type", "standard_uncertainty", "dof", "sensitivity", "note"];

/// What differs from line to line of record.csv; the rest is the run's.
#[derive(Default)]
struct Cells {
    grade: String,
    step: String,
    measurand: String,
    value: String,
    unit: String,
    expanded: String,
    coverage: String,
    lower: String,
    upper: String,
    wanted: String,
    rule: String,
    probability: String,
    verdict: &'static str,
    reject: String,
    note: String,
}

/// record.csv: a line for the tube, then one for each measurand and grade tried.
///
/// Values stand in the unit of the catalogue, named by its UCUM code; absent is empty, with the reason in `note`.
pub fn record_csv(sheet: &Sheet) -> Vec<u8> {
    let mut lines = Lines::headed(&RECORD_COLUMNS);
    lines.push(&record_line(sheet, tube_cells(sheet)));
    for row in &sheet.rows {
        if row.judged.is_empty() {
            lines.push(&record_line(sheet, row_cells(sheet, row, None)));
        }
        for judged in &row.judged {
            lines.push(&record_line(sheet, row_cells(sheet, row, Some(judged))));
        }
    }
    lines.bytes
}

/// budget.csv: every line of every row's budget, in SI; unlimited degrees of freedom are empty.
pub fn budget_csv(sheet: &Sheet) -> Vec<u8> {
    let mut lines = Lines::headed(&BUDGET_COLUMNS);
    for row in &sheet.rows {
        for line in &row.budget {
            let kind = match line.evaluation {
                Evaluation::TypeA => "A",
                Evaluation::TypeB => "B",
            };
            lines.push(&[
                neutralise(&row.measurand),
                neutralise(&line.source_id),
                neutralise(&line.line),
                kind.to_owned(),
                number(line.standard_uncertainty),
                number(line.dof),
                number(line.sensitivity),
                neutralise(&line.note),
            ]);
        }
    }
    lines.bytes
}

fn tube_cells(sheet: &Sheet) -> Cells {
    let verdict = &sheet.verdict;
    let simulated = if sheet.identity.simulated { SIMULATED.en } else { "" };
    let mut said = vec![simulated.to_owned(), verdict.reason.english()];
    said.extend(super::remarks(sheet).map(Saying::english));
    Cells {
        grade: neutralise(verdict.grade.as_deref().unwrap_or_default()),
        measurand: "tube".to_owned(),
        rule: neutralise(&sheet.rule),
        verdict: verdict.outcome.word(),
        reject: neutralise(verdict.reject_code.as_deref().unwrap_or_default()),
        note: neutralise(&joined(&said)),
        ..Cells::default()
    }
}

fn row_cells(sheet: &Sheet, row: &Row, judged: Option<&Judged>) -> Cells {
    let known = measurand::find(&row.measurand);
    let shown = |si: f64| number(known.map_or(si, |m| m.shown(si)));
    let unit = known.map_or("", |m| m.ucum).to_owned();
    let mut cells = Cells { step: neutralise(&row.step), measurand: neutralise(&row.measurand), ..Cells::default() };
    let mut said = String::new();
    match &row.value {
        Value::Number { value, expanded, k, .. } => {
            cells.value = shown(*value);
            cells.expanded = shown(*expanded);
            cells.coverage = number(*k);
            cells.unit = unit;
            if cells.value.is_empty() {
                said = "not a finite number".to_owned();
            }
        }
        Value::Count { value, low, high } => {
            cells.value = value.to_string();
            cells.unit = "1".to_owned();
            if low != high {
                said = format!("may be {low} to {high}");
            }
        }
        Value::AtLeast(least) => {
            cells.value = shown(*least);
            cells.unit = unit;
            said = "a lower bound: at least this".to_owned();
        }
        Value::Word(word) => cells.value = neutralise(word),
        Value::Absent(reason) => {
            cells.unit = unit;
            said = format!("absent: {}", reason.english());
        }
    }
    cells.note = neutralise(&joined(&[said, row.note.english(), at_current(sheet, row)]));
    cells.verdict = RowVerdict::NotJudged.word();
    if let Some(judged) = judged {
        cells.grade = neutralise(&judged.grade);
        cells.lower = judged.lower.map(shown).unwrap_or_default();
        cells.upper = judged.upper.map(shown).unwrap_or_default();
        cells.wanted = neutralise(&judged.wanted.join("|"));
        cells.rule = neutralise(&judged.rule);
        cells.probability = judged.conformance_probability.map(number).unwrap_or_default();
        cells.verdict = judged.verdict.word();
        cells.reject = neutralise(judged.reject_code.as_deref().unwrap_or_default());
    }
    cells
}

fn record_line(sheet: &Sheet, cells: Cells) -> [String; 25] {
    let who = &sheet.identity;
    let started = sheet.started_at.map(|at| at.to_rfc3339()).unwrap_or_default();
    [
        neutralise(&who.run_id),
        neutralise(&who.serial),
        neutralise(&who.tube_type),
        cells.grade,
        neutralise(&who.lot),
        neutralise(&sheet.station),
        neutralise(&who.technician),
        if who.started_at.is_empty() { started } else { neutralise(&who.started_at) },
        cells.step,
        cells.measurand,
        cells.value,
        cells.unit,
        cells.expanded,
        cells.coverage,
        cells.lower,
        cells.upper,
        cells.wanted,
        cells.rule,
        cells.probability,
        cells.verdict.to_owned(),
        cells.reject,
        sheet.recipe.revision.to_string(),
        sheet.limits.revision.to_string(),
        neutralise(&who.program_version),
        cells.note,
    ]
}

/// The parts that say something, one after the other.
/// "at 4.00 mA": every optical row that has a value states the tube current (`measurand::Group`).
fn at_current(sheet: &Sheet, row: &Row) -> String {
    let optical = |group| matches!(group, Group::Optics | Group::Polarization | Group::Power);
    let known = measurand::find(&row.measurand).is_some_and(|known| optical(known.group));
    match sheet.run_current {
        Some(current) if known && !matches!(row.value, Value::Absent(_)) => format!("at {:.2} mA", current * 1e3),
        _ => String::new(),
    }
}

fn joined(parts: &[String]) -> String {
    parts.iter().filter(|part| !part.is_empty()).map(String::as_str).collect::<Vec<_>>().join("; ")
}

/// Shortest text of a number rounded to ten significant digits; empty if it is not finite.
///
/// Ten digits are far below any uncertainty and above the last bits in which platforms' logarithms differ.
pub(super) fn number(value: f64) -> String {
    if !value.is_finite() {
        return String::new();
    }
    let rounded: f64 = format!("{value:.9e}").parse().unwrap_or(value);
    // Adding zero turns −0 into 0.
    let rounded = rounded + 0.0;
    let size = rounded.abs();
    if size != 0.0 && !(1e-7..1e15).contains(&size) { format!("{rounded:e}") } else { format!("{rounded}") }
}

/// Lines of a CSV file as they grow.
struct Lines {
    bytes: Vec<u8>,
}

impl Lines {
    fn headed(columns: &[&str]) -> Self {
        let mut lines = Self { bytes: Vec::new() };
        lines.push(&columns.iter().map(|&column| column.to_owned()).collect::<Vec<_>>());
        lines
    }

    /// Adds a line: quoted where RFC 4180, section 2, asks for it; ended by CR LF.
    fn push(&mut self, cells: &[String]) {
        for (i, cell) in cells.iter().enumerate() {
            if i > 0 {
                self.bytes.push(b',');
            }
            if cell.contains([',', '"', '\r', '\n']) {
                self.bytes.extend(format!("\"{}\"", cell.replace('"', "\"\"")).bytes());
            } else {
                self.bytes.extend(cell.bytes());
            }
        }
        self.bytes.extend(b"\r\n");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_short_finite_and_the_same_everywhere() {
        assert_eq!(number(998.7), "998.7");
        assert_eq!(number(0.1 + 0.2), "0.3");
        assert_eq!(number(999.3 * (1.0 + f64::EPSILON)), "999.3");
        assert_eq!(number(-0.0), "0");
        assert_eq!(number(3.2e-17), "3.2e-17");
        assert_eq!(number(1.0 / 3.0), "0.3333333333");
        for odd in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            assert_eq!(number(odd), "");
        }
    }

    #[test]
    fn quotes_what_must_be_quoted() {
        let mut lines = Lines { bytes: Vec::new() };
        lines.push(&["a,b".into(), "say \"no\"".into(), "x\r\ny".into(), "plain".into()]);
        assert_eq!(lines.bytes, b"\"a,b\",\"say \"\"no\"\"\",\"x\r\ny\",plain\r\n");
    }
}
