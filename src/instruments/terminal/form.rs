//! A question as it stands open on the terminal: the caution above, what is asked, how to answer.
//! Must not read an answer, and must not let a caution rest on ink: its zigzag stands in one place and has one shape.
//! Main functions: [`question_lines`], [`caution_lines`], [`explanation`].

use super::ink::{Line, Look, Role};
use crate::instruments::typed::expected;
use crate::measurand;
use crate::quantity::UNITS;
use crate::record::question::{Expects, Question};

/// Most columns that words take: longer lines are hard to read at arm's length.
const MOST: usize = 96;
/// Said once, at the first question.
const WAYS_OUT: &str = "At any question: `?` explains it, `skip: why` leaves it open on the sheet with the reason, \
    `stop: why` ends the run; what was measured is kept.";

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
        Expects::Done => {}
        other => lines.extend(wrapped(&bar, &expected(other), Role::Plain, look)),
    }
    if first {
        lines.extend(wrapped(&bar, WAYS_OUT, Role::Quiet, look));
    }
    lines
}

/// The line that is typed on, without its end.
pub(super) fn prompt(question: &Question, look: &Look) -> Line {
    let line = Line::of(Role::Strong, look.sign("└▶ ", "+> "));
    line.and(
        Role::Plain,
        match &question.expects {
            Expects::Done => "Enter once it is done: ".to_owned(),
            Expects::Choice(_) => "number or word, then Enter: ".to_owned(),
            Expects::Number { ucum, .. } => format!("in {}: ", symbol(ucum)),
            Expects::Whole { .. } => "a count: ".to_owned(),
        },
    )
}

/// Words on a danger between two zigzags, wherever they stand.
pub fn caution_lines(text: &str, look: &Look) -> Vec<Line> {
    let zigzag = |sign: &str| sign.repeat(width(look) / 2);
    let mut lines = vec![Line::of(Role::Alert, zigzag(look.sign("╱╲", "/\\")))];
    lines.extend(wrapped(&Line::of(Role::Alert, look.sign("▲ ", "! ")), text, Role::Strong, look));
    lines.push(Line::of(Role::Alert, zigzag(look.sign("╲╱", "\\/"))));
    lines
}

fn symbol(ucum: &str) -> &str {
    UNITS.iter().find(|unit| unit.ucum == ucum).map_or("the unit shown", |unit| unit.symbol)
}

/// What `?` says.
pub(super) fn explanation(question: &Question, look: &Look) -> Vec<Line> {
    let bar = Line::of(Role::Quiet, look.sign("│ ", "| "));
    let key = match question.word.as_str() {
        "tries" => "start_tries",
        word => word,
    };
    let meaning = measurand::find(key).map(|known| format!("{}: {}", known.name, known.definition));
    let how = match &question.expects {
        Expects::Number { .. } => {
            "A number alone is in the unit shown; another unit of its kind may follow it. A comma \
            may stand for the point. `-` alone: no instrument for it here."
        }
        Expects::Whole { .. } => "A count, in digits.",
        Expects::Choice(_) => "The digit before a word, or the word, then Enter.",
        Expects::Done => "Enter, once the hands have done it. An Enter that comes with the question is not taken.",
    };
    let parts = meaning.into_iter().chain([how.to_owned(), WAYS_OUT.to_owned()]);
    let key = format!("In a file of answers: `{}` below [steps.{}].", question.word, question.step);
    let parts = parts.chain([key]);
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
