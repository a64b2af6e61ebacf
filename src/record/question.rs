//! A question to the technician and its answer, as they are stored.
//! Must not decide what to ask.
//! Main types: [`Question`], [`Answer`].

use serde::{Deserialize, Serialize};

/// A question as it stands open on the sheet.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Question {
    /// Name of the step that asks.
    pub step: String,
    /// The question's word in an answer file: `run_voltage`, `choice`, `done`.
    pub word: String,
    /// What the technician reads: "Run voltage at the supply".
    pub text: String,
    /// What endangers whoever does it, and what to do against that; empty where nothing does.
    #[serde(default, skip_serializing_if = "String::is_empty")]
    pub caution: String,
    /// What counts as an answer.
    pub expects: Expects,
    /// The answer switches high voltage on: stored as asked before anybody may act.
    pub high_voltage: bool,
}

/// What counts as an answer.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Expects {
    /// A number with its unit, SI bounds inclusive.
    Number {
        /// UCUM code of the unit people answer in.
        ucum: String,
        /// Lowest value that is physically possible, SI.
        lowest: f64,
        /// Highest, SI.
        highest: f64,
    },
    /// A whole number, bounds inclusive.
    Whole {
        /// Lowest.
        lowest: u64,
        /// Highest.
        highest: u64,
    },
    /// One of these words.
    Choice(Vec<String>),
    /// Enter, once it is done.
    Done,
}

/// An answer.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Answer {
    /// SI value.
    Number(f64),
    /// A count.
    Whole(u64),
    /// The chosen word.
    Choice(String),
    /// It is done.
    Done,
    /// It cannot be said on this bench, and why ("no high-voltage probe").
    CannotSay(String),
}
