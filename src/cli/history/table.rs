//! The past of a tube as a table for people.
//! Must not compare: [`comparisons`] does. English, as the records are that it is read from.
//! Main function: [`text`].

use super::{
    changes::{By, Change, comparisons},
    gather::{Column, Past},
};
use crate::cli::inspect::earlier::ending_words;
use crate::measurand::{self, Shape};
use crate::phrase::{Language, Saying};
use crate::record::sheet::{Row, Value};
use crate::report::{ReadValue, value_text};

/// Runs with what happened between them, the values beside each other, and what changed from run to run.
pub(super) fn text(serial: &str, past: &Past) -> String {
    let mut lines = vec![title(serial, past)];
    for item in in_time(past) {
        lines.extend(item);
    }
    if !past.columns.is_empty() {
        lines.push(String::new());
        lines.extend(values(&past.columns));
    }
    lines.extend(changed(&past.columns));
    if !past.left_out.is_empty() {
        lines.push(format!("\n{} left out, named on standard error", past.left_out.len()));
    }
    lines.join("\n") + "\n"
}

/// What changed, each run beside the last earlier ones that have its values.
fn changed(columns: &[Column]) -> Vec<String> {
    if columns.len() < 2 {
        return Vec::new();
    }
    let compared = comparisons(&columns.iter().map(|column| &column.record).collect::<Vec<_>>());
    let mut lines = vec![
        "\nChanges beyond the uncertainties. Each row is tested at 95.45 %: about one row in twenty changes by chance."
            .to_owned(),
    ];
    for run in 2..=columns.len() {
        let mut beside = compared.iter().filter(|it| it.to == run).peekable();
        if beside.peek().is_none() {
            lines.push(format!("Run {run}: no row that an earlier run has too"));
        }
        for it in beside {
            let rows = if it.rows == 1 { "1 row" } else { &format!("{} rows", it.rows) };
            lines.push(format!("From run {} to run {run}, {rows} compared:", it.from));
            lines.extend(it.changes.iter().map(|change| format!("  {}", sentence(change))));
            if it.changes.is_empty() {
                lines.push("  nothing".to_owned());
            }
        }
    }
    lines
}

fn title(serial: &str, past: &Past) -> String {
    let tube_type = past.columns.last().map_or("unknown", |column| column.identity.tube_type.as_str());
    let n = past.columns.len();
    format!("{serial}, type {tube_type}: {n} run{}", if n == 1 { "" } else { "s" })
}

/// Runs and life in the order in which they happened; on one day what was noted stands behind the run it followed.
fn in_time(past: &Past) -> Vec<Vec<String>> {
    let day = |column: &Column| column.identity.started_at.get(..10).unwrap_or_default().to_owned();
    let place =
        |run_id: &str| past.columns.iter().position(|column| column.identity.run_id == run_id).map_or(0, |at| at + 1);
    let runs =
        past.columns.iter().enumerate().map(|(at, column)| ((day(column), at + 1, 0), run_lines(at, column, past)));
    let life = past.life.iter().enumerate().map(|(at, event)| {
        let line = format!("     {}  {}: {}", event.date, event.kind.word(), event.note);
        ((event.date.clone(), place(&event.after), at + 1), vec![line])
    });
    let mut items: Vec<_> = runs.chain(life).collect();
    items.sort_by(|a, b| a.0.cmp(&b.0));
    items.into_iter().map(|(_, lines)| lines).collect()
}

fn run_lines(at: usize, column: &Column, past: &Past) -> Vec<String> {
    let (who, record) = (&column.identity, &column.record);
    let when = who.started_at.get(..16).unwrap_or(&who.started_at).replace('T', " ");
    let ending = if column.frozen { ending_words(record) } else { "not finished".to_owned() };
    let kind = if who.run_kind.is_product() { "" } else { "reference tube, " };
    let by = if who.technician.is_empty() { "nobody named" } else { &who.technician };
    let (station, limits) = (&record.station, &record.limits_revision);
    let mut lines = vec![format!("{:3}  {when}  {kind}{ending}; {by} at {station}, limits revision {limits}", at + 1)];
    if !record.reason.is_empty() {
        lines.push(format!("     {}", record.reason));
    }
    if let Some(repeat) = &who.repeats {
        let known = past.columns.iter().position(|column| column.identity.run_id == repeat.run_id);
        let run = known.map_or_else(|| repeat.run_id.clone(), |place| (place + 1).to_string());
        lines.push(format!("     repeats run {run} because: {}", repeat.reason));
    }
    lines.push(format!("     {}", column.folder.display()));
    lines
}

/// A row a measurand, a column a run.
fn values(columns: &[Column]) -> Vec<String> {
    let mut keys: Vec<(&str, &str)> = Vec::new();
    for value in columns.iter().flat_map(|column| &column.record.values) {
        if !keys.contains(&(value.measurand.as_str(), value.step.as_str())) {
            keys.push((&value.measurand, &value.step));
        }
    }
    keys.sort_by_key(|(measurand, _)| measurand::rank(measurand));
    let mut rows = vec![
        std::iter::once("Measured".to_owned())
            .chain((1..=columns.len()).map(|run| format!("run {run}")))
            .collect::<Vec<_>>(),
    ];
    for (measurand, step) in keys {
        let cell = |column: &Column| {
            let of = |value: &&ReadValue| value.measurand == measurand && value.step == step;
            column.record.values.iter().find(of).map_or_else(|| "–".to_owned(), shown)
        };
        rows.push(std::iter::once(label(measurand)).chain(columns.iter().map(cell)).collect());
    }
    let width =
        |at: usize| rows.iter().filter_map(|row| row.get(at)).map(|cell| cell.chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..=columns.len()).map(width).collect();
    let line = |row: &Vec<String>| {
        let cells = row.iter().zip(&widths).map(|(cell, width)| format!("{cell:width$}"));
        cells.collect::<Vec<_>>().join("  ").trim_end().to_owned()
    };
    rows.iter().map(line).collect()
}

/// The name on the sheet.
pub(super) fn label(measurand: &str) -> String {
    let look = || measurand.strip_prefix("visual.").unwrap_or(measurand).replace('_', " ");
    measurand::find(measurand).map_or_else(look, |known| known.name.of(Language::English).to_owned())
}

/// Value, expanded uncertainty and unit, rounded as on the sheet; a dash where there is none.
fn shown(value: &ReadValue) -> String {
    let text = value_text(&row_of(value), Language::English);
    if !text.absent.is_empty() {
        return "–".to_owned();
    }
    let parts = [text.value, text.spread, text.unit];
    parts.into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" ")
}

/// A value of a record as the sheet's row it came from, as far as a reader needs it.
fn row_of(value: &ReadValue) -> Row {
    let known = measurand::find(&value.measurand);
    let factor = known.map_or(1.0, |known| known.unit().factor);
    let number = value.value.parse::<f64>().ok();
    let of_record = match (known.map(|known| known.shape), number, value.expanded) {
        _ if value.value.is_empty() => Value::Absent(Saying::outside(&value.note)),
        (Some(Shape::Count), Some(n), _) => Value::Count { value: n as u64, low: n as u64, high: n as u64 },
        (Some(_), Some(n), Some(expanded)) => Value::Number {
            value: n * factor,
            u: expanded * factor / value.coverage_factor.unwrap_or(2.0),
            expanded: expanded * factor,
            k: value.coverage_factor.unwrap_or(2.0),
            dof: f64::INFINITY,
        },
        (Some(_), Some(n), None) => Value::AtLeast(n * factor),
        _ => Value::Word(value.value.clone()),
    };
    Row {
        step: value.step.clone(),
        measurand: value.measurand.clone(),
        label: Saying::outside(&label(&value.measurand)),
        value: of_record,
        budget: Vec::new(),
        judged: Vec::new(),
        deciding: false,
        note: Saying::default(),
    }
}

/// "Power: 0.929 ± 0.028 mW, then 0.851 ± 0.026 mW: by -0.078 ± 0.005 mW"; beside a lower bound "…: a fall of ≥ 4050".
fn sentence(change: &Change) -> String {
    let pair = format!("{}: {}, then {}", label(&change.measurand), shown(&change.before), shown(&change.after));
    let unit = measurand::find(&change.measurand).map_or("", |known| known.unit().symbol);
    let text = |value| value_text(&Row { value, ..row_of(&change.after) }, Language::English);
    let by = match change.by {
        By::Another => return pair,
        By::Difference(value, expanded) => {
            let text = text(Value::Number { value, u: expanded / 2.0, expanded, k: 2.0, dof: f64::INFINITY });
            format!("by {} {}", text.value, text.spread)
        }
        By::AtLeast(least) => {
            let way = if least < 0.0 { "fall" } else { "rise" };
            format!("a {way} of {}", text(Value::AtLeast(least.abs())).value)
        }
    };
    format!("{pair}: {by} {unit}").trim_end().to_owned()
}
