//! The measured rows: headings, name, value ± U, unit, scale drawing, probability; the row that decides opened by its note.
//! Must not show a status column or a table of bounds: the drawing carries them.
//! Main function: [`blocks`].

use super::{
    super::{
        scene::{Anchor, DARK, GREY, RULE, Scene, Stroke, Style},
        text::{probability_text, value_text},
        typeface::{SMALLEST, Typeface},
    },
    Density, LEFT, RIGHT, also, counts, scale,
};
use crate::{
    measurand::{self, Group},
    phrase::{Saying, list, name, page, verdict},
    record::sheet::{Judged, Row, RowVerdict, Sheet, Value},
};

/// Right end of the values.
const VALUE_END: f64 = 210.0;
/// Left end of the spreads.
const SPREAD: f64 = 214.0;
/// Left end of the units.
const UNIT: f64 = 251.0;
/// Left end of words that stand in place of a value.
const WORDS: f64 = 163.0;
/// Left end of the probabilities' column.
const CONFORMS: f64 = 525.0;

/// A piece of the table that is never parted.
pub struct Block {
    /// Its height, pt.
    pub height: f64,
    /// A heading, which stays with the block after it.
    pub is_heading: bool,
    /// Drawn from 0 downwards.
    pub scene: Scene,
}

/// What stands above the rows, its baseline at 12.
pub fn table_head(face: &Typeface) -> Scene {
    let mut scene = Scene::default();
    let style = Style::plain(7.0, GREY);
    scene.text(face, (LEFT, 12.0), Anchor::Start, face.word(&page::TABLE), Style::bold(8.0, DARK));
    scene.text(face, (SPREAD + 22.0, 12.0), Anchor::End, face.word(&page::VALUE_U), style);
    scene.text(face, (scale::LEFT_END, 12.0), Anchor::Start, face.word(&page::LIMITS_VALUE), style);
    scene.text(face, (RIGHT, 12.0), Anchor::End, face.word(&page::CONFORMS), style);
    scene
}

/// The limited rows under the headings of their groups, then what was measured for information.
///
/// * `notes`: notes that find no room in their row stand under it; else record.csv alone has them.
pub fn blocks(sheet: &Sheet, face: &Typeface, density: &Density, notes: bool) -> Vec<Block> {
    let mut blocks = Vec::new();
    let mut last = None;
    for row in sheet.rows.iter().filter(|row| !also::is_for_information(row)) {
        let group = group(row);
        if last != Some(group) {
            last = Some(group);
            blocks.push(heading(face.word(group.heading()), face, density));
        }
        blocks.push(row_block(row, face, density, notes));
    }
    blocks.extend(also::blocks(sheet, face, density));
    blocks
}

/// Polarization stands with the optics: a heading of its own would serve two rows at most.
fn group(row: &Row) -> Group {
    match measurand::find(&row.measurand).map_or(Group::Visual, |m| m.group) {
        Group::Polarization => Group::Optics,
        other => other,
    }
}

/// A heading with its rule.
pub fn heading(text: &str, face: &Typeface, density: &Density) -> Block {
    let mut scene = Scene::default();
    let y = density.heading - 3.5;
    let width = scene.text(face, (LEFT, y), Anchor::Start, text, Style::bold(7.0, GREY).spaced(0.5));
    scene.line(vec![(LEFT + width + 8.0, y - 2.3), (RIGHT, y - 2.3)], Stroke::solid(RULE, 0.4));
    Block { height: density.heading, is_heading: true, scene }
}

fn row_block(row: &Row, face: &Typeface, density: &Density, notes: bool) -> Block {
    let mut scene = Scene::default();
    let size = density.size;
    let baseline = density.pitch * 0.5 + size * 0.33;
    let label = Style { bold: row.deciding, ..Style::plain(size, DARK) };
    let label_width =
        scene.fitted(face, (LEFT, baseline), Anchor::Start, &face.say(&row.label), label, WORDS - 5.0 - LEFT);
    let placed = value(&mut scene, face, row, baseline, size);
    let middle = baseline - size * 0.3;
    // Where the drawing of a row ends, if it leaves room behind it.
    let drawn = match &row.value {
        Value::Number { value, .. } if !value.is_finite() => None,
        Value::Absent(_) => None,
        Value::Number { .. } | Value::AtLeast(_) => {
            scale::draw(&mut scene, face, row, middle, density.pitch);
            None
        }
        Value::Count { .. } => counts::draw(&mut scene, face, row, middle, density.pitch),
        Value::Word(word) => wanted(&mut scene, face, row, word, baseline, size),
    };
    let conforms = conforms(&mut scene, face, row, baseline, size);
    let mut end = placed.end;
    let note = Style::plain((size * 0.82).max(6.6), if row.deciding { DARK } else { GREY });
    // Behind the drawing, or between name and value.
    let rooms =
        [(drawn.map_or(conforms, |end| end + 7.0), conforms - 7.0), (LEFT + label_width + 7.0, placed.left - 12.0)];
    let words = face.say(&row.note);
    let width = face.width(&face.printable(&words), note.sized(SMALLEST));
    let room = rooms.into_iter().find(|(from, to)| !row.deciding && width <= to - from);
    if let Some((from, to)) = room {
        scene.fitted(face, (from, baseline), Anchor::Start, &words, note, to - from);
    } else if row.deciding || notes {
        for line in face.wrap(&words, note, RIGHT - LEFT, if row.deciding { 2 } else { 1 }) {
            end += size * 1.1;
            scene.text(face, (LEFT, end), Anchor::Start, &line, note);
        }
    }
    let mut height = density.pitch.max(end + density.pitch - baseline);
    if row.deciding {
        height += 4.5;
        scene = opened(scene, height);
    }
    Block { height, is_heading: false, scene }
}

/// The row that decides stands between two rules with a bar at the margin.
fn opened(scene: Scene, height: f64) -> Scene {
    let mut open = Scene::default();
    open.block((LEFT - 7.0, 0.5), (2.4, height - 1.0), DARK);
    for y in [0.5, height - 0.5] {
        open.line(vec![(LEFT - 7.0, y), (RIGHT, y)], Stroke::solid(GREY, 0.6));
    }
    open.append(scene.lowered(3.0));
    open
}

/// Where a value was written.
struct Placed {
    left: f64,
    /// Last baseline.
    end: f64,
}

/// Value, spread and unit, or in words why there is none.
fn value(scene: &mut Scene, face: &Typeface, row: &Row, baseline: f64, size: f64) -> Placed {
    let text = value_text(row, face.language);
    let small = Style::plain(size * 0.9, GREY);
    if !text.absent.is_empty() {
        let lines = face.wrap(&face.say(&page::NO_VALUE.with([name(text.absent)])), small, CONFORMS - 8.0 - WORDS, 2);
        let mut end = baseline;
        for (i, line) in lines.iter().enumerate() {
            end = baseline + size * 1.1 * i as f64;
            scene.text(face, (WORDS, end), Anchor::Start, line, small);
        }
        return Placed { left: WORDS, end };
    }
    let bold = Style::bold(size * 1.02, DARK);
    // A word too long for the column of values runs on over spread and unit.
    let is_long =
        matches!(row.value, Value::Word(_)) && face.width(&face.printable(&text.value), bold) > VALUE_END - WORDS;
    if is_long {
        let room = scale::LABEL_LEFT - 4.0 - WORDS;
        scene.fitted(face, (WORDS, baseline), Anchor::Start, &text.value, bold, room);
        return Placed { left: WORDS, end: baseline };
    }
    let width = scene.fitted(face, (VALUE_END, baseline), Anchor::End, &text.value, bold, VALUE_END - WORDS);
    scene.fitted(face, (SPREAD, baseline), Anchor::Start, &text.spread, small, UNIT - 2.0 - SPREAD);
    scene.fitted(face, (UNIT, baseline), Anchor::Start, &text.unit, small, scale::LABEL_LEFT - 2.0 - UNIT);
    Placed { left: VALUE_END - width, end: baseline }
}

/// What a look should have said, and whether it did. Returns where the words end.
fn wanted(scene: &mut Scene, face: &Typeface, row: &Row, word: &str, baseline: f64, size: f64) -> Option<f64> {
    let style = Style::plain(size * 0.84, GREY);
    let judged = row.judged.last()?;
    let (x, y) = (scale::LEFT_END + 5.0, baseline - size * 0.3);
    scene.outline(super::super::scene::corners((x - 5.0, y - 3.0), (10.0, 6.0)), Stroke::solid(GREY, 0.6));
    if judged.wanted.iter().any(|wanted| wanted == word) {
        scene.disc((x, y), 2.2, DARK);
    } else {
        scene.cross((x, y), 2.6, scale::CROSS);
    }
    let words = judged.wanted.iter().map(|word| Saying::of(name(word.as_str())));
    let text = face.say(&page::WANTED.with([list(words, &verdict::OR)]));
    let width = scene.fitted(face, (x + 10.0, baseline), Anchor::Start, &text, style, CONFORMS - 8.0 - x - 10.0);
    Some(x + 10.0 + width)
}

/// The judgement that says most: the best grade lost, or the one that decides.
pub fn telling(row: &Row) -> Option<&Judged> {
    let last = row.judged.last()?;
    if last.verdict == RowVerdict::Pass {
        row.judged.iter().find(|judged| judged.verdict != RowVerdict::Pass).or(Some(last))
    } else {
        Some(last)
    }
}

/// The probability, or why there is none. Returns where it begins.
fn conforms(scene: &mut Scene, face: &Typeface, row: &Row, baseline: f64, size: f64) -> f64 {
    let Some(judged) = telling(row) else { return RIGHT };
    let text = match (&row.value, judged.conformance_probability) {
        (Value::Count { .. }, _) => face.word(&page::EXACT).to_owned(),
        (Value::Word(_), _) => face.word(&page::SEEN).to_owned(),
        (_, Some(p)) if p.is_finite() => probability_text(p, face.language),
        _ => "–".to_owned(),
    };
    let style = if row.deciding { Style::bold(size * 0.9, DARK) } else { Style::plain(size * 0.9, GREY) };
    RIGHT - scene.fitted(face, (RIGHT, baseline), Anchor::End, &text, style, RIGHT - CONFORMS)
}
