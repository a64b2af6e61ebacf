//! A question as it stands open on the terminal: the caution above, what is asked, how to answer.
//! Must not read an answer, and must not let a caution rest on ink: its zigzag stands in one place and has one shape.
//! Main functions: [`question_lines`], [`caution_lines`], [`explanation`].

use super::ink::{Line, Look, Role};
use crate::instruments::typed::shown;
use crate::measurand;
use crate::phrase::{figure, name, terminal};
use crate::quantity::{UNITS, Unit};
use crate::record::question::{Expects, Question};

/// Most columns that words take: longer lines are hard to read at arm's length.
const MOST: usize = 96;
/// Everything above the line that is typed on.
///
/// * `first`: nobody has been asked yet.
pub(super) fn question_lines(question: &Question, look: &Look, first: bool) -> Vec<Line> {
    let bar = Line::of(Role::Strong, look.sign("│ ", "| "));
    let mut lines = Vec::new();
    if !question.caution.is_empty() {
        lines.extend(caution_lines(&question.caution, look));
    }
    let head = Line::of(Role::Strong, look.sign("┌─", "+-")).and(Role::Strong, format!(" {} ", question.step));
    let rest = width(look).saturating_sub(head.width());
    lines.push(head.and(Role::Strong, look.sign("─", "-").repeat(rest)));
    lines.extend(wrapped(&bar, &question.text, Role::Strong, look));
    match &question.expects {
        Expects::Choice(words) => lines.extend(choices(&bar, words, look)),
        other => lines.extend(range(other, look).iter().flat_map(|range| wrapped(&bar, range, Role::Plain, look))),
    }
    if first {
        lines.extend(wrapped(&bar, terminal::WAYS_OUT.of(look.language), Role::Quiet, look));
    }
    lines
}

/// The line that is typed on, without its end.
pub(super) fn prompt(question: &Question, look: &Look) -> Line {
    let text = match &question.expects {
        Expects::Done => terminal::ENTER_WHEN_DONE.of(look.language).to_owned(),
        Expects::Choice(_) => terminal::CHOOSE.of(look.language).to_owned(),
        Expects::Number { ucum, .. } => format!("in {}", unit(ucum).map_or("?", |unit| unit.symbol)),
        Expects::Whole { .. } => terminal::A_COUNT.of(look.language).to_owned(),
    };
    Line::of(Role::Strong, look.sign("└▶ ", "+> ")).and(Role::Plain, format!("{text}: "))
}

fn unit(ucum: &str) -> Option<&'static Unit> {
    UNITS.iter().find(|unit| unit.ucum == ucum)
}

/// The range of a number; nothing for what has none.
fn range(expects: &Expects, look: &Look) -> Option<String> {
    let (low, high) = match expects {
        Expects::Number { ucum, lowest, highest } => {
            let unit = unit(ucum)?;
            (shown(lowest / unit.factor), format!("{} {}", shown(highest / unit.factor), unit.symbol))
        }
        Expects::Whole { lowest, highest } => (lowest.to_string(), highest.to_string()),
        Expects::Choice(_) | Expects::Done => return None,
    };
    Some(terminal::FROM_TO.with([figure(low), figure(high)]).text(look.language))
}

/// Words on a danger between two zigzags, wherever they stand.
pub fn caution_lines(text: &str, look: &Look) -> Vec<Line> {
    let zigzag = |sign: &str| sign.repeat(width(look) / 2);
    let mut lines = vec![Line::of(Role::Alert, zigzag(look.sign("╱╲", "/\\")))];
    lines.extend(wrapped(&Line::of(Role::Alert, look.sign("▲ ", "! ")), text, Role::Strong, look));
    lines.push(Line::of(Role::Alert, zigzag(look.sign("╲╱", "\\/"))));
    lines
}

/// What `?` says.
pub(super) fn explanation(question: &Question, look: &Look) -> Vec<Line> {
    let bar = Line::of(Role::Quiet, look.sign("│ ", "| "));
    let key = match question.word.as_str() {
        "tries" => "start_tries",
        word => word,
    };
    // The definition is that of the catalogue, which is data: English.
    let meaning = measurand::find(key).map(|known| format!("{}: {}", known.name.of(look.language), known.definition));
    let how = match &question.expects {
        Expects::Number { .. } => &terminal::HOW_NUMBER,
        Expects::Whole { .. } => &terminal::HOW_COUNT,
        Expects::Choice(_) => &terminal::HOW_CHOICE,
        Expects::Done => &terminal::HOW_DONE,
    };
    let said = [how, &terminal::WAYS_OUT].map(|phrase| phrase.of(look.language).to_owned());
    let key = terminal::IN_A_FILE.with([name(question.word.as_str()), name(question.step.as_str())]);
    let parts = meaning.into_iter().chain(said).chain([key.text(look.language)]);
    parts.flat_map(|part| wrapped(&bar, &part, Role::Plain, look)).collect()
}

/// The choices side by side, or below each other where they have no room.
fn choices(bar: &Line, words: &[String], look: &Look) -> Vec<Line> {
    let numbered: Vec<String> = words.iter().enumerate().map(|(i, word)| format!("{} {word}", i + 1)).collect();
    let beside = numbered.join("    ");
    if beside.chars().count() + 2 <= width(look) {
        return vec![bar.clone().and(Role::Strong, beside)];
    }
    numbered.into_iter().map(|choice| bar.clone().and(Role::Strong, choice)).collect()
}

fn width(look: &Look) -> usize {
    look.width.saturating_sub(1).min(MOST)
}

/// Words broken at blanks, each line behind a bar.
pub(super) fn wrapped(bar: &Line, text: &str, role: Role, look: &Look) -> Vec<Line> {
    bar.clone().wrapped(text, role, bar, width(look))
}
