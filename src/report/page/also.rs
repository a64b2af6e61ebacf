//! What was measured for information: three columns of names and values under the limited rows.
//! Must not show what is limited, nor leave anything out.
//! Main function: [`blocks`].

use super::{
    super::{
        scene::{Anchor, DARK, GREY, Scene, Style},
        text::value_text,
        typeface::Typeface,
    },
    Density, LEFT, RIGHT,
    rows::{Block, heading},
};
use crate::{
    phrase::{figure, page},
    record::sheet::{Row, Sheet, Value},
};

const COLUMNS: usize = 3;
const GAP: f64 = 12.0;
const COLUMN: f64 = (RIGHT - LEFT - GAP * (COLUMNS as f64 - 1.0)) / COLUMNS as f64;
/// Right end of the values, from the left end of their column.
const VALUE_END: f64 = 104.0;
/// Left end of the spreads.
const SPREAD: f64 = 107.0;
/// Left end of the units.
const UNIT: f64 = 138.0;
/// Longest reason for an absent value, in characters; record.csv has it whole.
const REASON: usize = 90;

/// Whether a row stands in this block.
pub fn is_for_information(row: &Row) -> bool {
    row.judged.is_empty() && !row.deciding
}

/// A heading, lines of three entries each, filled column by column, and what has no value; nothing if there is none.
pub fn blocks(sheet: &Sheet, face: &Typeface, density: &Density) -> Vec<Block> {
    let rows: Vec<&Row> = sheet.rows.iter().filter(|row| is_for_information(row)).collect();
    if rows.is_empty() {
        return vec![];
    }
    let air = Block { height: 3.0, is_heading: true, scene: Scene::default() };
    let mut blocks = vec![air, heading(face.word(&page::ALSO), face, density)];
    let entries = entries(&rows, face);
    let lines = entries.len().div_ceil(COLUMNS);
    for line in 0..lines {
        let mut scene = Scene::default();
        for (column, entry) in entries.iter().skip(line).step_by(lines).enumerate() {
            draw(&mut scene, face, entry, LEFT + (COLUMN + GAP) * column as f64, density);
        }
        blocks.push(Block { height: pitch(density), is_heading: false, scene });
    }
    blocks.extend(absent(&rows, face, density));
    blocks
}

fn pitch(density: &Density) -> f64 {
    (density.pitch * 0.93).max(11.5)
}

/// One entry of the block.
struct Entry {
    name: String,
    value: String,
    spread: String,
    unit: String,
}

/// Every row with a value; fewest and most modes share one entry.
fn entries(rows: &[&Row], face: &Typeface) -> Vec<Entry> {
    let count = |key: &str| rows.iter().find(|row| row.measurand == key).and_then(|row| certain(row));
    let modes = count("mode_count_min").zip(count("mode_count_max"));
    let mut entries = Vec::new();
    for row in rows {
        let text = value_text(row, face.language);
        match (row.measurand.as_str(), modes) {
            ("mode_count_min", Some((fewest, most))) => entries.push(Entry {
                name: face.word(&page::MODES).to_owned(),
                value: if fewest == most {
                    most.to_string()
                } else {
                    face.say(&page::TO.with([figure(fewest), figure(most)]))
                },
                spread: String::new(),
                unit: String::new(),
            }),
            ("mode_count_max", Some(_)) => {}
            _ if !text.absent.is_empty() => {}
            _ => {
                let name = face.say(&row.label);
                entries.push(Entry { name, value: text.value, spread: text.spread, unit: text.unit });
            }
        }
    }
    entries
}

/// A count that is not in doubt.
fn certain(row: &Row) -> Option<u64> {
    match row.value {
        Value::Count { value, low, high } if low == high => Some(value),
        _ => None,
    }
}

fn draw(scene: &mut Scene, face: &Typeface, entry: &Entry, left: f64, density: &Density) {
    let baseline = pitch(density) * 0.5 + density.size * 0.3;
    let size = (density.size * 0.94).max(7.0);
    let bold = Style::bold(size, DARK);
    let at = |x: f64| (left + x, baseline);
    // A word that needs the room of spread and unit takes it.
    let is_long = face.width(&face.printable(&entry.value), bold) > VALUE_END * 0.5 && entry.spread.is_empty();
    let end = if is_long { COLUMN } else { VALUE_END };
    // The name is written first: who copies the text gets it in reading order.
    let (value, bold) = face.fit(&entry.value, bold, end * 0.5);
    let room = end - face.width(&value, bold) - 5.0;
    scene.fitted(face, at(0.0), Anchor::Start, &entry.name, Style::plain(size, DARK), room);
    scene.text(face, at(end), Anchor::End, &value, bold);
    let small = Style::plain((size * 0.92).max(6.6), GREY);
    let spread_room = if entry.unit.is_empty() { COLUMN - SPREAD } else { UNIT - 1.5 - SPREAD };
    let spread_end = SPREAD + scene.fitted(face, at(SPREAD), Anchor::Start, &entry.spread, small, spread_room);
    // A long unit begins a little before its place, but never within the spread.
    let unit = (COLUMN - face.width(&face.printable(&entry.unit), small)).min(UNIT).max(spread_end + 2.0);
    scene.fitted(face, at(unit), Anchor::Start, &entry.unit, small, COLUMN - unit);
}

/// One paragraph on the rows without a value, rows of one reason together.
fn absent(rows: &[&Row], face: &Typeface, density: &Density) -> Option<Block> {
    let mut reasons: Vec<(String, Vec<String>)> = Vec::new();
    for row in rows {
        let reason = value_text(row, face.language).absent;
        match reasons.iter_mut().find(|(known, _)| *known == reason) {
            _ if reason.is_empty() => {}
            Some((_, names)) => names.push(face.say(&row.label)),
            None => reasons.push((reason, vec![face.say(&row.label)])),
        }
    }
    let said = |(reason, names): &(String, Vec<String>)| format!("{} ({})", names.join(", "), shortened(reason));
    let text = reasons.iter().map(said).collect::<Vec<_>>().join("; ");
    let style = Style::plain((density.size * 0.86).max(6.8), GREY);
    let mut scene = Scene::default();
    let leading = style.size * 1.3;
    let mut baseline = pitch(density) * 0.5 + style.size * 0.35;
    let no_value = face.word(&page::WITHOUT_VALUE);
    let lead = face.width(no_value, style) + face.width(" ", style);
    let lines = face.wrap(&text, style, RIGHT - LEFT - lead, 4);
    if lines.is_empty() {
        return None;
    }
    scene.text(face, (LEFT, baseline), Anchor::Start, no_value, style);
    for (i, line) in lines.iter().enumerate() {
        baseline += if i > 0 { leading } else { 0.0 };
        scene.text(face, (LEFT + lead, baseline), Anchor::Start, line, style);
    }
    let height = pitch(density) + leading * (lines.len() as f64 - 1.0);
    Some(Block { height, is_heading: false, scene })
}

fn shortened(reason: &str) -> String {
    match reason.char_indices().nth(REASON) {
        Some((cut, _)) => format!("{}…", reason[..cut].trim_end()),
        None => reason.to_owned(),
    }
}
