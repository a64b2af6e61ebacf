//! A named look: one question, one word.
//! Must not judge the word.
//! Main type: [`Look`].

use super::{Given, Room, Step, Wish};
use crate::{
    phrase::{Saying, name},
    recipe,
    record::{
        question::{Answer, Expects},
        sheet::Value,
    },
    run::{filled::Filled, notebook::Notebook},
};

/// The step.
pub(super) struct Look {
    ask: String,
    choices: Vec<String>,
    filled: Vec<Filled>,
}

impl Look {
    pub fn new(keys: &recipe::Look) -> Self {
        Self { ask: keys.ask.clone(), choices: keys.choices.clone(), filled: Vec::new() }
    }
}

impl Step for Look {
    fn begin(&mut self, _room: &mut Room<'_>) {}

    fn wants(&self) -> Wish {
        if !self.filled.is_empty() {
            return Wish::Nothing;
        }
        let expects = Expects::Choice(self.choices.clone());
        Wish::Ask { word: "choice".into(), text: Saying::of(name(self.ask.clone())), expects, high_voltage: false }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        let key = format!("visual.{}", room.step);
        match given {
            Given::Answer(Answer::Choice(word)) => self.filled.push(Filled::plain(&key, Value::Word(word.clone()))),
            Given::Answer(Answer::CannotSay(reason)) => self.filled.push(Filled::absent(&key, Saying::outside(reason))),
            _ => {}
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        Some(5.0)
    }
}
