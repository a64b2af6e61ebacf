//! A file of answers: what a technician would say, by step and word.
//! Must not ask anybody.
//! Main types: [`Answers`], [`AnswerTrouble`].

use std::collections::BTreeMap;

use crate::{
    limits::{
        Fault, nearest,
        reading::{Item, read},
    },
    quantity::{Dimension, UNITS, parse_as},
    record::question::{Answer, Expects, Question},
};

/// An answer file.
#[derive(Debug, Clone, PartialEq)]
pub struct Answers {
    /// Initials of the technician.
    pub technician: Option<String>,
    /// Tube type.
    pub tube_type: Option<String>,
    /// Why a finished run is repeated, where the file says so.
    pub retest: Option<String>,
    /// Since when the tube burns already in a rack, as `--lit-since` has it.
    pub lit_since: Option<String>,
    /// Bench time that an answer takes, s.
    pub time_to_answer_s: f64,
    name: String,
    /// step → word → what is written.
    steps: BTreeMap<String, BTreeMap<String, Written>>,
}

/// An answer as it is written.
#[derive(Debug, Clone, PartialEq)]
pub enum Written {
    /// Text: a word, or a number with its unit.
    Text(String),
    /// A whole number.
    Whole(u64),
    /// `true`: it is done.
    Done,
    /// `{ cannot_say = "why" }`.
    CannotSay(String),
}

/// Why a question has no answer in the file.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum AnswerTrouble {
    /// The line is missing.
    #[error("{file} has no answer to `{text}`; expected `{line}` below [steps.{step}]{hint}")]
    Missing {
        /// The answer file.
        file: String,
        /// The question.
        text: String,
        /// Step that asks.
        step: String,
        /// The line wanted: `run_voltage = …`, `"turn_45.0" = true`.
        line: String,
        /// The nearest word written there, or empty.
        hint: String,
    },
    /// It is no answer to the question.
    #[error("{file}: `{word} = {found}` below [steps.{step}] is no answer; expected {expected}")]
    Wrong {
        /// The answer file.
        file: String,
        /// Step that asks.
        step: String,
        /// The question's word.
        word: String,
        /// What is written.
        found: String,
        /// What would do.
        expected: String,
    },
}

const TOP: &[&str] = &["technician", "tube_type", "retest", "time_to_answer", "lit_since", "steps"];

impl Answers {
    /// Reads an answer file.
    ///
    /// * `name`: name of the file, for the faults.
    ///
    /// Errors: every fault, in the order of the file.
    pub fn parse(name: &str, text: &str) -> Result<Self, Vec<Fault>> {
        read(name, text, TOP, |root| {
            let word = |key| root.get(key).map_or(Some(None), |item| item.text().map(|text| Some(text.to_owned())));
            let technician = word("technician");
            let tube_type = word("tube_type");
            let retest = word("retest");
            let lit_since = word("lit_since");
            let allowed = "a time from 0 s to 1 h";
            let time = root.get("time_to_answer");
            let time = time.map_or(Some(4.0), |item| item.quantity_within(Dimension::Time, (0.0, 3600.0), allowed));
            let steps = root.get("steps").map_or(Some(BTreeMap::new()), |item| steps(&item));
            Some(Self {
                technician: technician?,
                tube_type: tube_type?,
                retest: retest?,
                lit_since: lit_since?,
                time_to_answer_s: time?,
                name: name.to_owned(),
                steps: steps?,
            })
        })
    }

    /// What is written for a step's word.
    pub fn get(&self, step: &str, word: &str) -> Option<&Written> {
        self.steps.get(step)?.get(word)
    }

    /// Every (step, word) of the file, so that a line nobody asked for can be told.
    pub fn keys(&self) -> impl Iterator<Item = (&str, &str)> {
        self.steps.iter().flat_map(|(step, words)| words.keys().map(move |word| (step.as_str(), word.as_str())))
    }

    /// The answer to a question, checked for unit, bounds and choice.
    pub fn answer(&self, question: &Question) -> Result<Answer, AnswerTrouble> {
        let (step, word) = (&question.step, &question.word);
        let Some(written) = self.get(step, word) else { return Err(self.missing(question)) };
        let answer = match (written, &question.expects) {
            (Written::CannotSay(why), _) => Some(Answer::CannotSay(why.clone())),
            (Written::Done, Expects::Done) => Some(Answer::Done),
            (Written::Whole(n), Expects::Whole { lowest, highest }) => {
                (lowest..=highest).contains(&n).then_some(Answer::Whole(*n))
            }
            (Written::Text(text), Expects::Choice(choices)) => {
                choices.contains(text).then(|| Answer::Choice(text.clone()))
            }
            (Written::Text(text), Expects::Number { ucum, lowest, highest }) => {
                let unit = UNITS.iter().find(|unit| unit.ucum == ucum);
                let value = unit.and_then(|unit| parse_as(text, unit.dimension).ok());
                value.filter(|value| (lowest..=highest).contains(&value)).map(Answer::Number)
            }
            _ => None,
        };
        answer.ok_or_else(|| AnswerTrouble::Wrong {
            file: self.name.clone(),
            step: step.clone(),
            word: word.clone(),
            found: written.to_string(),
            expected: expected(&question.expects),
        })
    }

    fn missing(&self, question: &Question) -> AnswerTrouble {
        let words = self.steps.get(&question.step);
        let near = words.and_then(|words| nearest(&question.word, words.keys().map(String::as_str)));
        let value = if question.expects == Expects::Done { "true" } else { "…" };
        AnswerTrouble::Missing {
            file: self.name.clone(),
            text: question.text.clone(),
            step: question.step.clone(),
            line: format!("{} = {value}", as_key(&question.word)),
            hint: near.map_or(String::new(), |word| format!(" (nearest word there: {word})")),
        }
    }
}

/// A word as it must be written before the `=`: `turn_45.0` holds a point and needs quotes.
fn as_key(word: &str) -> String {
    let bare = word.chars().all(|c| c.is_ascii_alphanumeric() || c == '_' || c == '-');
    if bare { word.to_owned() } else { format!("\"{word}\"") }
}

impl std::fmt::Display for Written {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Text(text) => write!(f, "\"{text}\""),
            Self::Whole(n) => write!(f, "{n}"),
            Self::Done => f.write_str("true"),
            Self::CannotSay(why) => write!(f, "{{ cannot_say = \"{why}\" }}"),
        }
    }
}

/// What counts as an answer, in words.
fn expected(expects: &Expects) -> String {
    match expects {
        Expects::Number { ucum, lowest, highest } => {
            let unit = UNITS.iter().find(|unit| unit.ucum == ucum);
            let (symbol, factor) = unit.map_or(("", 1.0), |unit| (unit.symbol, unit.factor));
            format!("a number in quotes from {} to {} {symbol}", lowest / factor, highest / factor)
        }
        Expects::Whole { lowest, highest } => format!("a whole number from {lowest} to {highest}"),
        Expects::Choice(choices) => format!("one of {}", choices.join(", ")),
        Expects::Done => "true".to_owned(),
    }
}

fn steps(item: &Item<'_>) -> Option<BTreeMap<String, BTreeMap<String, Written>>> {
    let mut steps = BTreeMap::new();
    let mut whole = true;
    for step in item.open_table("[steps]")?.each() {
        let Some(table) = step.open_table(&format!("[steps.{}]", step.name)) else {
            whole = false;
            continue;
        };
        let mut words = BTreeMap::new();
        for line in table.each() {
            match written(&line) {
                Some(written) => drop(words.insert(line.name.clone(), written)),
                None => whole = false,
            }
        }
        steps.insert(step.name.clone(), words);
    }
    whole.then_some(steps)
}

fn written(item: &Item<'_>) -> Option<Written> {
    if item.is_text() {
        return item.text().map(|text| Written::Text(text.to_owned()));
    }
    if item.is_table() {
        let table = item.table(&format!("`{}`", item.name), &["cannot_say"])?;
        return table.need("cannot_say")?.text().map(|why| Written::CannotSay(why.to_owned()));
    }
    if item.is_switch() {
        let done = item.switch()?;
        if !done {
            item.fault(format!("`{}` is false; expected true, or no line at all", item.name), None);
        }
        return done.then_some(Written::Done);
    }
    item.whole(0, u64::from(u32::MAX)).map(Written::Whole)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    const TEXT: &str = r#"
technician = "KT"
tube_type = "twin-150"
time_to_answer = "4 s"
[steps.strike]
start_delay = "0.6 s"
tries = 1
start_voltage = { cannot_say = "no high-voltage probe" }
done = true
[steps.output_mirror]
choise = "clean"
"#;

    fn ask(step: &str, word: &str, expects: Expects) -> Result<Answer, String> {
        let question = Question {
            step: step.to_owned(),
            word: word.to_owned(),
            text: "What is it".to_owned(),
            caution: String::new(),
            expects,
            high_voltage: false,
        };
        Answers::parse("answers.toml", TEXT).unwrap().answer(&question).map_err(|trouble| trouble.to_string())
    }

    fn time(highest: f64) -> Expects {
        Expects::Number { ucum: "s".to_owned(), lowest: 0.0, highest }
    }

    #[test]
    fn answers_what_is_asked() {
        let answers = Answers::parse("answers.toml", TEXT).unwrap();
        assert_eq!((answers.technician.as_deref(), answers.time_to_answer_s), (Some("KT"), 4.0));
        assert_eq!(answers.keys().count(), 5);
        assert_eq!(ask("strike", "start_delay", time(10.0)), Ok(Answer::Number(0.6)));
        assert_eq!(ask("strike", "tries", Expects::Whole { lowest: 1, highest: 3 }), Ok(Answer::Whole(1)));
        assert_eq!(ask("strike", "done", Expects::Done), Ok(Answer::Done));
        let volts = Expects::Number { ucum: "kV".to_owned(), lowest: 0.0, highest: 2e4 };
        let cannot = Answer::CannotSay("no high-voltage probe".to_owned());
        assert_eq!(ask("strike", "start_voltage", volts), Ok(cannot));
    }

    #[test]
    fn says_which_line_is_missing_or_wrong() {
        let choice = Expects::Choice(vec!["clean".to_owned(), "film".to_owned()]);
        assert_eq!(
            ask("output_mirror", "choice", choice).unwrap_err(),
            "answers.toml has no answer to `What is it`; expected `choice = …` below [steps.output_mirror] \
             (nearest word there: choise)"
        );
        assert_eq!(
            ask("strike", "start_delay", time(0.5)).unwrap_err(),
            "answers.toml: `start_delay = \"0.6 s\"` below [steps.strike] is no answer; \
             expected a number in quotes from 0 to 0.5 s"
        );
        assert!(ask("strike", "tries", Expects::Done).is_err());
        assert!(ask("nowhere", "done", Expects::Done).is_err());
    }
}
