//! What stands around the samples: key cells with their values, names and units of columns, our own head lines.
//! Must not read samples or decide what a channel is.
//! Main type: [`Surroundings`].

use super::{
    layout::Layout,
    text::{Cell, Dialect, Line, Lines, Separator, TOO_LARGE, number},
    units::{ColumnUnit, unit, unit_in_name},
};

/// Lines of samples that may carry keys beside them.
const BESIDE: usize = 64;
/// Lines of a header looked at; the longest found in real exports has 30.
const HEADER: usize = 400;

/// A key cell and its value: the cell to its right, or below it.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Key {
    /// Lower case, letters and digits only.
    pub key: String,
    pub value: String,
    /// The cell after the value.
    after: String,
    /// Column of the key, from 0.
    column: usize,
}

/// Name and unit of one column of numbers.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Label {
    /// Lower case; empty if unknown.
    pub name: String,
    pub unit: Option<ColumnUnit>,
}

/// Everything in an export that is no sample.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Surroundings {
    pub keys: Vec<Key>,
    /// One for each column of [`Layout::columns`].
    pub labels: Vec<Label>,
    /// Key and value of lines `# key = value` before the samples.
    pub head: Vec<(String, String)>,
    /// Numbers are written with a comma.
    decimal_comma: bool,
}

/// Reads keys, labels and head lines.
pub(super) fn read(bytes: &[u8], layout: &Layout) -> Surroundings {
    // A file of integers does not show its decimal mark; where the separator allows it, the header may use a comma.
    let decimal_comma = layout.dialect.separator != Separator::Byte(b',');
    let mut found = Surroundings { decimal_comma, ..Surroundings::default() };
    let mut rows: Vec<Vec<String>> = Vec::new();
    let mut below: Vec<String> = Vec::new();
    let last = layout.first_line + BESIDE;
    for line in Lines::new(bytes).filter(|line| near_samples(line, layout)).take_while(|line| line.number < last) {
        let is_data = line.number >= layout.first_line;
        let comment = line.text.trim_ascii_start().strip_prefix(b"#");
        if let Some(comment) = comment.filter(|_| !is_data) {
            read_comment(&decoded(comment), &mut found);
        }
        let text = comment.unwrap_or(line.text);
        let row: Vec<String> = cells_around(text, layout, is_data);
        collect_keys(&row, &below, layout.dialect, decimal_comma, &mut found.keys);
        if !is_data && !row.iter().all(String::is_empty) {
            rows.push(row.clone());
        }
        below = row;
    }
    found.labels = labels(&rows, layout);
    found
}

/// In the header's last lines, or among the first samples.
fn near_samples(line: &Line<'_>, layout: &Layout) -> bool {
    line.number + HEADER >= layout.first_line || line.number < HEADER
}

/// The cells of a line as text, those of the samples left empty.
fn cells_around(text: &[u8], layout: &Layout, is_data: bool) -> Vec<String> {
    let cell = |(column, cell): (usize, &[u8])| {
        if is_data && layout.columns.binary_search(&column).is_ok() { String::new() } else { decoded(cell) }
    };
    layout.dialect.cells(text).take(256).enumerate().map(cell).collect()
}

/// UTF-8, else Latin-1, where every byte is a character.
fn decoded(bytes: &[u8]) -> String {
    match std::str::from_utf8(bytes) {
        Ok(text) => text.trim().to_owned(),
        Err(_) => bytes.iter().map(|&b| char::from(b)).collect::<String>().trim().to_owned(),
    }
}

fn read_comment(comment: &str, found: &mut Surroundings) {
    if let Some((key, value)) = comment.split_once('=') {
        found.head.push((key.trim().to_owned(), value.trim().to_owned()));
    }
    if let Some((key, value)) = comment.split_once([':', '=']) {
        let (key, value) = (normal(key), value.trim().to_owned());
        found.keys.push(Key { key, value, after: String::new(), column: 0 });
    }
}

/// Lower case, letters and digits only.
fn normal(text: &str) -> String {
    text.chars().filter(|c| c.is_alphanumeric()).flat_map(char::to_lowercase).collect()
}

/// Pairs of a text cell and the cell to its right, and of a text cell and a number below it.
fn collect_keys(row: &[String], above: &[String], dialect: Dialect, comma: bool, keys: &mut Vec<Key>) {
    let is_text = |cell: &String| dialect.classify(cell.as_bytes()) == Cell::Text;
    for (column, cell) in row.iter().enumerate() {
        let right = row.get(column + 1).filter(|value| !value.is_empty());
        if let Some(value) = right.filter(|_| is_text(cell)) {
            let after = row.get(column + 2).cloned().unwrap_or_default();
            keys.push(Key { key: normal(cell), value: value.clone(), after, column });
        }
        if let Some(key) = above.get(column).filter(|key| is_text(key))
            && number(cell.as_bytes(), comma).or(number(cell.as_bytes(), false)).is_some()
        {
            keys.push(Key { key: normal(key), value: cell.clone(), after: String::new(), column });
        }
    }
}

/// Names and units from the last lines before the samples: one of names, one of units, in any order.
fn labels(rows: &[Vec<String>], layout: &Layout) -> Vec<Label> {
    let mut labels = vec![Label::default(); layout.columns.len()];
    let (mut named, mut has_units) = (false, false);
    for row in rows.iter().rev().take(4) {
        let cells: Vec<&str> = layout.columns.iter().map(|&c| row.get(c).map_or("", |cell| cell.as_str())).collect();
        if cells.iter().all(|cell| cell.is_empty() || layout.dialect.classify(cell.as_bytes()) != Cell::Text) {
            continue;
        }
        let is_unit = |cell: &&str| cell.is_empty() || unit(cell).is_some() || is_index_word(cell);
        if cells.iter().all(is_unit) && cells.iter().any(|cell| unit(cell).is_some()) && !has_units {
            has_units = true;
            for (label, cell) in labels.iter_mut().zip(&cells) {
                label.unit = unit(cell).or(label.unit.take());
                if is_index_word(cell) {
                    label.name = cell.to_lowercase();
                }
            }
        } else if !named {
            named = true;
            for (label, cell) in labels.iter_mut().zip(&cells) {
                label.unit = label.unit.take().or_else(|| unit_in_name(cell)).or_else(|| unit(cell));
                if label.name.is_empty() {
                    label.name = cell.to_lowercase();
                }
            }
        }
    }
    labels
}

/// A column of running numbers is called so.
pub(super) fn is_index_word(name: &str) -> bool {
    ["sequence", "index", "point", "points", "sample", "samples", "no", "no.", "n", "nr", "#"]
        .iter()
        .any(|word| name.eq_ignore_ascii_case(word))
}

impl Surroundings {
    /// The keys called one of `names`, in order of nearness to `column`: the last one left of it first, as every record
    /// of several side by side has its keys on its left.
    fn near(&self, names: &[&str], column: usize) -> Vec<&Key> {
        let mut keys: Vec<&Key> = self.keys.iter().filter(|key| names.contains(&key.key.as_str())).collect();
        keys.sort_by_key(|key| if key.column < column { (false, column - key.column) } else { (true, key.column) });
        keys
    }

    /// The value of the key nearest to `column` that is called one of `names`.
    pub fn text(&self, names: &[&str], column: usize) -> Option<&str> {
        self.near(names, column).first().map(|key| key.value.as_str())
    }

    /// The same as a number, with the factor of a unit in the cell after it or behind it.
    pub fn number(&self, names: &[&str], column: usize) -> Option<f64> {
        self.near(names, column).into_iter().find_map(|key| self.number_of(key))
    }

    fn number_of(&self, key: &Key) -> Option<f64> {
        let value = key.value.trim();
        let split = value.find(|c: char| !(c.is_ascii_digit() || "+-.,eE".contains(c))).unwrap_or(value.len());
        let (digits, behind) = value.split_at(split);
        let plain = number(digits.as_bytes(), false);
        let number = if self.decimal_comma { number(digits.as_bytes(), true).or(plain) } else { plain }?;
        let factor = match unit(behind).or_else(|| unit(&key.after)) {
            Some(ColumnUnit::Time(factor) | ColumnUnit::Voltage(factor)) => factor,
            _ => 1.0,
        };
        Some(number * factor).filter(|value| value.abs() < TOO_LARGE)
    }

    /// Seconds between samples, where the header says so.
    pub fn step(&self, column: usize) -> Option<f64> {
        const PERIOD: &[&str] = &[
            "sampleinterval",
            "samplinginterval",
            "samplingperiod",
            "sampleperiod",
            "increment",
            "xincrement",
            "xinc",
            "timeincrement",
            "timestep",
            "deltat",
            "dt",
        ];
        let rate = || self.rate(column).map(|rate| 1.0 / rate);
        self.number(PERIOD, column).or_else(rate).filter(|step| step.is_finite() && *step > 0.0)
    }

    fn rate(&self, column: usize) -> Option<f64> {
        let text = self.text(&["samplerate", "samplingrate", "samplingfrequency", "samplefrequency"], column)?;
        let (value, unit) = crate::quantity::parse_with_unit(text)?;
        let plain = crate::quantity::Dimension::Ratio;
        let wanted = unit.dimension == crate::quantity::Dimension::Frequency || unit.dimension == plain;
        (wanted && value > 0.0).then_some(value)
    }

    /// Time of the first sample, where the header says so, seconds.
    pub fn start(&self, column: usize, step: f64) -> Option<f64> {
        let origin = self.number(&["start", "starttime", "xorigin", "xzero"], column)?;
        Some(origin - self.number(&["xreference"], column).unwrap_or(0.0) * step)
    }

    /// How many samples the header promises.
    pub fn count(&self, column: usize) -> Option<usize> {
        let names = ["recordlength", "memorylength", "samples", "points", "segmentsize", "numberofpoints"];
        self.number(&names, column).filter(|n| (1.0..1e15).contains(n)).map(|n| n as usize)
    }
}
