//! A phrase with its pieces, put into words only when the language is known.
//! Must not hold words of its own: they stand in the tables.
//! Main types: [`Saying`], [`Piece`].

use std::fmt::Display;

use chrono::{NaiveDate, NaiveDateTime};

use super::{Language, Phrase, recognise};

static NOTHING: Phrase = Phrase::new("", "");
static AS_IT_IS: Phrase = Phrase::new("{0}", "{0}");

/// Something said: a phrase of the table and what fills its places.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Saying {
    phrase: &'static Phrase,
    pieces: Vec<Piece>,
}

/// What fills a place of a phrase.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Piece {
    /// A name, a key, a serial, a word of a recipe: the same in every language.
    Name(String),
    /// A figure with a decimal point, perhaps with its unit.
    Figure(String),
    /// A day.
    Day(NaiveDate),
    /// A day and a time of day, in the station's zone.
    Minute(NaiveDateTime),
    /// Something said in turn.
    Said(Saying),
    /// A row's label inside a sentence: English writes it small, unless it is an abbreviation; German nouns stay large.
    Within(Saying),
    /// Opens a sentence: its first letter is large.
    Opening(Saying),
    /// Words that go on inside a sentence: no full stop of their own.
    Clause(Saying),
    /// Several in a row, what is empty left out.
    List(Vec<Saying>, &'static Phrase),
}

/// A name, a key, a serial, a word of a recipe: the same in every language. Not for sentences.
pub fn name(text: impl Into<String>) -> Piece {
    Piece::Name(text.into())
}

/// A figure as English writes it, perhaps with its unit: `0.505 mW`.
pub fn figure(number: impl Display) -> Piece {
    Piece::Figure(number.to_string())
}

/// A day.
pub fn day(day: NaiveDate) -> Piece {
    Piece::Day(day)
}

/// A day and a time of day to the minute, in the station's zone.
pub fn minute(at: NaiveDateTime) -> Piece {
    Piece::Minute(at)
}

/// Something said in turn.
pub fn said(saying: impl Into<Saying>) -> Piece {
    Piece::Said(saying.into())
}

/// A row's label inside a sentence.
pub fn within(label: impl Into<Saying>) -> Piece {
    Piece::Within(label.into())
}

/// What opens a sentence.
pub fn opening(saying: impl Into<Saying>) -> Piece {
    Piece::Opening(saying.into())
}

/// Words inside a sentence, without a full stop of their own.
pub fn clause(saying: impl Into<Saying>) -> Piece {
    Piece::Clause(saying.into())
}

/// Several in a row; `joint` stands between them.
pub fn list(sayings: impl IntoIterator<Item = Saying>, joint: &'static Phrase) -> Piece {
    Piece::List(sayings.into_iter().collect(), joint)
}

impl Saying {
    pub(super) fn new(phrase: &'static Phrase, pieces: Vec<Piece>) -> Self {
        Self { phrase, pieces }
    }

    /// Nothing is said.
    pub fn none() -> Self {
        Self::new(&NOTHING, Vec::new())
    }

    /// One piece alone.
    pub fn of(piece: Piece) -> Self {
        Self::new(&AS_IT_IS, vec![piece])
    }

    /// Words that came from outside (an instrument, a person, a stored event): in another language where the table of
    /// such words knows them, else as they came. Not for sentences of the program.
    pub fn outside(text: &str) -> Self {
        if text.is_empty() {
            return Self::none();
        }
        recognise::known(text).unwrap_or_else(|| Self::of(name(text)))
    }

    /// Several in a row; `joint` stands between them, what is empty is left out.
    pub fn list(sayings: impl IntoIterator<Item = Self>, joint: &'static Phrase) -> Self {
        Self::of(list(sayings, joint))
    }

    /// Nothing would be written.
    pub fn is_empty(&self) -> bool {
        *self.phrase == NOTHING || self.english().is_empty()
    }

    /// In English: what CSV and JSON hold.
    pub fn english(&self) -> String {
        self.text(Language::English)
    }

    /// In a language. A place without a piece stays empty.
    pub fn text(&self, language: Language) -> String {
        let mut written = String::new();
        let mut rest = self.phrase.of(language);
        while let Some((before, place)) = rest.split_once('{') {
            written.push_str(before);
            let (number, after) = place.split_once('}').unwrap_or((place, ""));
            if let Some(piece) = number.parse().ok().and_then(|n: usize| self.pieces.get(n)) {
                written.push_str(&piece.text(language));
            }
            rest = after;
        }
        written.push_str(rest);
        written
    }
}

impl Default for Saying {
    fn default() -> Self {
        Self::none()
    }
}

impl From<&'static Phrase> for Saying {
    fn from(phrase: &'static Phrase) -> Self {
        Self::new(phrase, Vec::new())
    }
}

impl Piece {
    fn text(&self, language: Language) -> String {
        match self {
            Self::Name(text) => text.clone(),
            Self::Figure(english) => language.figure(english),
            Self::Day(day) => language.day(*day),
            Self::Minute(at) => format!("{} {}", language.day(at.date()), at.format("%H:%M")),
            Self::Said(saying) => saying.text(language),
            Self::Within(saying) if language == Language::English => small(&saying.text(language)),
            Self::Within(saying) => saying.text(language),
            Self::Opening(saying) => large(&saying.text(language)),
            Self::Clause(saying) => saying.text(language).trim().trim_end_matches('.').to_owned(),
            Self::List(sayings, joint) => {
                let texts = sayings.iter().map(|saying| saying.text(language)).filter(|text| !text.is_empty());
                texts.collect::<Vec<_>>().join(joint.of(language))
            }
        }
    }
}

fn large(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

/// First letter small, unless the second is large too (an abbreviation).
fn small(text: &str) -> String {
    let mut letters = text.chars();
    match (letters.next(), letters.clone().next()) {
        (Some(_), Some(second)) if second.is_uppercase() => text.to_owned(),
        (Some(first), _) => first.to_lowercase().chain(letters).collect(),
        (None, _) => String::new(),
    }
}
