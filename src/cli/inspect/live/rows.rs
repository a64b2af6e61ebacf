//! A finished row as lines of a terminal: name, value ± U, the scale drawing in signs, the verdict in words.
//! Must not judge, and must not let a state rest on ink: word, sign and place say it.
//! Main function: [`row_lines`].

use crate::instruments::{Line, Look, Role};
use crate::phrase::{Saying, list, name, page, terminal, verdict};
use crate::record::sheet::{Row, RowVerdict, Value};
use crate::report::{InBox, RowScale, boxes, row_line, telling, value_text};

use super::block::NARROW;

/// Columns of the sign at the margin.
const MARGIN: usize = 2;
/// From here on there is room for the longest names and words.
const ROOMY: usize = 100;
/// Most columns of a row: a verdict far from its drawing is hard to follow.
const MOST: usize = 124;

/// Columns of the name, of value with spread and unit, and of the verdict.
fn columns(look: &Look) -> (usize, usize, usize) {
    if look.width < ROOMY { (24, 19, 10) } else { (29, 22, 18) }
}

/// The row, with its note on a line of its own.
pub(in crate::cli::inspect) fn row_lines(row: &Row, look: &Look) -> Vec<Line> {
    let (sign, word, role) = state(row, look);
    let margin = Line::of(role, sign).to_column(MARGIN);
    let most = look.width.saturating_sub(1);
    let (name_width, value_width, word_width) = columns(look);
    if look.width < NARROW {
        let word = if word.is_empty() { String::new() } else { format!(" - {word}") };
        let text = format!("{}{word}", row_line(row, look.language));
        return margin.wrapped(&text, Role::Plain, &Line::default().to_column(MARGIN), most);
    }
    let ink = if row.deciding { Role::Strong } else { Role::Plain };
    let line = margin.and(ink, row.label.text(look.language)).to_column(MARGIN + name_width).and(Role::Plain, " ");
    let text = value_text(row, look.language);
    let mut lines = if text.absent.is_empty() {
        let spread = text.spread.replace('±', look.sign("±", "+-"));
        let parts = [spread, text.unit].into_iter().filter(|part| !part.is_empty());
        let spread: String = parts.map(|part| format!(" {part}")).collect();
        let line =
            line.and(Role::Strong, text.value).and(Role::Plain, spread).to_column(MARGIN + name_width + value_width);
        let line = line.and(Role::Plain, "  ");
        let end = most.min(MOST).saturating_sub(1 + word.chars().count().max(word_width));
        let drawn = drawing(row, end.saturating_sub(line.width()), look);
        let line = line.then(drawn);
        let line = if word.is_empty() { line } else { line.to_column(end).and(Role::Plain, " ") };
        vec![line.and(role, word)]
    } else {
        let ends = if word.is_empty() { String::new() } else { format!(" - {word}") };
        let hanging = Line::default().to_column(MARGIN + name_width + 1);
        line.wrapped(
            &format!("{}{ends}", page::NO_VALUE.with([name(text.absent)]).text(look.language)),
            Role::Quiet,
            &hanging,
            most,
        )
    };
    if !row.note.is_empty() {
        let role = if row.deciding { role } else { Role::Quiet };
        let margin = Line::default().to_column(MARGIN + 2);
        lines.extend(margin.clone().wrapped(&row.note.text(look.language), role, &margin, most));
    }
    lines
}

/// Sign at the margin, word, ink.
fn state(row: &Row, look: &Look) -> (&'static str, String, Role) {
    let Some(last) = row.judged.last() else { return ("", String::new(), Role::Plain) };
    match last.verdict {
        RowVerdict::Fail => {
            let fail: Saying = match &last.reject_code {
                Some(code) => terminal::FAIL_CODE.with([name(code.as_str())]),
                None => (&terminal::FAIL).into(),
            };
            (look.sign("×", "x"), fail.text(look.language), Role::Alert)
        }
        RowVerdict::Hold => (look.sign("▒", "#"), terminal::HOLD.of(look.language).to_owned(), Role::Alert),
        RowVerdict::Pass => match row.judged.iter().find(|judged| judged.verdict != RowVerdict::Pass) {
            Some(lost) => (
                look.sign("▽", "v"),
                terminal::PASS_NOT.with([name(lost.grade.as_str())]).text(look.language),
                Role::Strong,
            ),
            None => ("", terminal::PASS.of(look.language).to_owned(), Role::Plain),
        },
        RowVerdict::NotJudged => ("", String::new(), Role::Plain),
    }
}

/// The drawing in so many columns; empty where nothing is limited or there is no room.
fn drawing(row: &Row, width: usize, look: &Look) -> Line {
    match &row.value {
        Value::Count { .. } => counted(row, width, look),
        Value::Word(_) => wanted(row, look).cut(width),
        _ => RowScale::of(row, look.language).map_or_else(Line::default, |scale| scaled(&scale, width, look)),
    }
}

/// Bounds in figures where there is room, then the axis between them.
fn scaled(scale: &RowScale, width: usize, look: &Look) -> Line {
    const FIGURES: usize = 12;
    if width < 12 {
        return Line::default();
    }
    let has_room = width >= 16 + 2 * FIGURES;
    if !has_room {
        return axis(scale, width, look);
    }
    let lower = Line::of(Role::Quiet, format!("{:>FIGURES$} ", scale.lower_text));
    let columns = width.min(64) - 2 * FIGURES - 1;
    lower.then(axis(scale, columns, look)).and(Role::Quiet, format!(" {}", scale.upper_text)).cut(width)
}

/// `··[──━━●━━────]···`: brackets are bounds, the dot is the value, the bar its expanded uncertainty.
fn axis(scale: &RowScale, columns: usize, look: &Look) -> Line {
    let last = columns.saturating_sub(1);
    let cell = |value: f64| ((scale.part(value) * columns as f64) as usize).min(last);
    let inside = |column: usize| scale.bounds.iter().any(|(low, high)| (cell(*low)..=cell(*high)).contains(&column));
    let mut signs: Vec<(Role, &str)> = (0..columns)
        .map(|column| (Role::Quiet, if inside(column) { look.sign("─", "-") } else { look.sign("·", ".") }))
        .collect();
    let ink = if scale.crossed { Role::Alert } else { Role::Strong };
    let mut put = |column: usize, role: Role, sign: &'static str| {
        if let Some(place) = signs.get_mut(column) {
            *place = (role, sign);
        }
    };
    let to = if scale.open { last } else { cell(scale.value + scale.expanded) };
    for column in cell(scale.value - scale.expanded)..=to {
        put(column, ink, look.sign("━", "="));
    }
    for (low, high) in &scale.bounds {
        for (bound, sign) in [(low, "["), (high, "]")] {
            if scale.reaches(*bound) {
                put(cell(*bound), Role::Plain, sign);
            }
        }
    }
    let beyond = !scale.reaches(scale.value);
    match (beyond, scale.crossed, cell(scale.value)) {
        (true, _, 0) => put(0, ink, look.sign("«", "<")),
        (true, _, column) => put(column, ink, look.sign("»", ">")),
        (false, true, column) => put(column, ink, look.sign("×", "x")),
        (false, false, column) => put(column, ink, look.sign("●", "o")),
    }
    if scale.open {
        put(last, ink, look.sign("»", ">"));
    }
    signs.into_iter().fold(Line::default(), |line, (role, sign)| line.and(role, sign))
}

/// `[●0] ┆ 1┆`: a box in brackets is allowed, a dashed one is not; the count stands marked in its own.
fn counted(row: &Row, width: usize, look: &Look) -> Line {
    let mut line = Line::default();
    for boxed in boxes(row).unwrap_or_default() {
        let (open, close) = if boxed.allowed { ("[", "]") } else { (look.sign("┆", ":"), look.sign("┆", ":")) };
        let (sign, role) = match boxed.mark {
            InBox::Nothing => (" ", Role::Quiet),
            InBox::Count => (look.sign("●", "o"), Role::Strong),
            InBox::Outside => (look.sign("×", "x"), Role::Alert),
            InBox::Possible => (look.sign("○", "?"), Role::Plain),
        };
        let gap = if boxed.gap { look.sign(" …", " ~") } else { "" };
        let next = Line::of(Role::Quiet, open).and(role, format!("{sign}{}", boxed.n)).and(Role::Quiet, close);
        let next = next.and(Role::Quiet, format!("{gap} "));
        if line.width() + next.width() > width {
            break;
        }
        line = line.then(next);
    }
    line
}

/// What a look should have said.
fn wanted(row: &Row, look: &Look) -> Line {
    match telling(row) {
        Some(judged) => Line::of(Role::Quiet, wanted_words(&judged.wanted).text(look.language)),
        None => Line::default(),
    }
}

fn wanted_words(wanted: &[String]) -> Saying {
    let words = wanted.iter().map(|word| Saying::of(name(word.as_str())));
    page::WANTED.with([list(words, &verdict::OR)])
}
