//! Reads tables of a TOML text value by value and collects every fault with its place.
//! Must not know what a scenario holds.
//! Main types: [`Reader`], [`ScenarioFault`].

use std::ops::Range;

use toml::{
    Spanned,
    de::{DeTable, DeValue},
};

use crate::quantity::{Dimension, parse_as};

/// One thing wrong in a scenario file.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct ScenarioFault {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// What was found and what was expected.
    pub message: String,
}

/// A key that holds a number with its unit.
pub(super) struct Key<T> {
    /// The key.
    pub word: &'static str,
    /// What it measures.
    pub dimension: Dimension,
    /// Bounds of what can be simulated, SI, inclusive.
    pub bounds: (f64, f64),
    /// Where it goes.
    pub set: fn(&mut T, f64),
}

/// A text and the faults found in it so far.
pub(super) struct Reader<'t> {
    text: &'t str,
    pub faults: Vec<ScenarioFault>,
}

impl<'t> Reader<'t> {
    pub fn new(text: &'t str) -> Self {
        Self { text, faults: Vec::new() }
    }

    /// Notes a fault at a place.
    pub fn fault(&mut self, span: Range<usize>, message: impl Into<String>) {
        let before = self.text.get(..span.start).unwrap_or(self.text);
        let line = before.matches('\n').count() + 1;
        let column = before.rsplit('\n').next().unwrap_or("").chars().count() + 1;
        self.faults.push(ScenarioFault { line, column, message: message.into() });
    }

    /// A table, or a fault.
    pub fn table<'a, 'i>(&mut self, value: &'a Spanned<DeValue<'i>>) -> Option<&'a DeTable<'i>> {
        if let DeValue::Table(table) = value.get_ref() {
            return Some(table);
        }
        self.fault(value.span(), "expected a table here");
        None
    }

    /// A text, or a fault.
    pub fn text<'a>(&mut self, word: &str, value: &'a Spanned<DeValue<'_>>) -> Option<&'a str> {
        if let DeValue::String(text) = value.get_ref() {
            return Some(text.as_ref());
        }
        self.fault(value.span(), format!("`{word}` must be a text in quotes"));
        None
    }

    /// A whole number from 0, or a fault.
    pub fn whole(&mut self, word: &str, value: &Spanned<DeValue<'_>>) -> Option<u64> {
        let number = match value.get_ref() {
            DeValue::Integer(number) if number.radix() == 10 => number.as_str().parse().ok(),
            _ => None,
        };
        if number.is_none() {
            self.fault(value.span(), format!("`{word}` must be a whole number from 0"));
        }
        number
    }

    /// A number with its unit (a plain number for a ratio), in SI, within bounds; or a fault.
    pub fn number(
        &mut self,
        word: &str,
        value: &Spanned<DeValue<'_>>,
        dimension: Dimension,
        (lowest, highest): (f64, f64),
    ) -> Option<f64> {
        let text = match value.get_ref() {
            DeValue::String(text) => text.as_ref(),
            DeValue::Integer(number) => number.as_str(),
            DeValue::Float(number) => number.as_str(),
            _ => "",
        };
        match parse_as(text, dimension) {
            Ok(number) if number >= lowest && number <= highest => Some(number),
            Ok(_) => {
                let bounds = format!("{lowest:e} to {highest:e} in SI units, both inclusive");
                self.fault(value.span(), format!("`{word}` is {text}; expected {bounds}"));
                None
            }
            Err(error) => {
                self.fault(value.span(), format!("`{word}`: {error}"));
                None
            }
        }
    }

    /// Sets what a key of a list names. Returns whether the list has the word.
    pub fn keyed<T>(&mut self, keys: &[Key<T>], into: &mut T, word: &str, value: &Spanned<DeValue<'_>>) -> bool {
        let Some(key) = keys.iter().find(|key| key.word == word) else { return false };
        if let Some(number) = self.number(word, value, key.dimension, key.bounds) {
            (key.set)(into, number);
        }
        true
    }

    /// Notes an unknown key with the nearest known one.
    pub fn unknown<'k>(&mut self, word: &Spanned<std::borrow::Cow<'_, str>>, known: impl Iterator<Item = &'k str>) {
        let given = word.get_ref().as_ref();
        let nearest = nearest_word(given, known);
        let hint = nearest.map(|nearest| format!("; the nearest known key is `{nearest}`")).unwrap_or_default();
        self.fault(word.span(), format!("`{given}` is not a key of this table{hint}"));
    }
}

/// The known word nearest to a given one.
pub(in crate::phantom) fn nearest_word<'k>(given: &str, known: impl Iterator<Item = &'k str>) -> Option<&'k str> {
    known.min_by_key(|known| distance(given, known))
}

/// Letters to insert, delete or change from one word to another (Levenshtein).
fn distance(from: &str, to: &str) -> usize {
    let to: Vec<char> = to.chars().collect();
    let mut row: Vec<usize> = (0..=to.len()).collect();
    for (i, a) in from.chars().enumerate() {
        let mut corner = i;
        row[0] = i + 1;
        for (j, &b) in to.iter().enumerate() {
            let changed = corner + usize::from(a != b);
            corner = row[j + 1];
            row[j + 1] = changed.min(row[j] + 1).min(corner + 1);
        }
    }
    row[to.len()]
}
