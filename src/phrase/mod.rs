//! Every sentence that can stand on a sheet, in one table: English and German side by side, and how they are put together.
//! Must not decide what is said, and must not speak for data: CSV and JSON are English with a decimal point.
//! Main types: [`Phrase`], [`Saying`], [`Language`]; the table: [`verdict`], [`reasons`], [`questions`], [`page`], [`terminal`], [`outside`].

mod language;
pub mod outside;
pub mod page;
pub mod questions;
pub mod reasons;
mod recognise;
mod saying;
pub mod terminal;
pub mod verdict;

#[cfg(test)]
mod tests;

pub use language::Language;
pub use saying::{Piece, Saying, clause, day, figure, list, minute, name, opening, said, within};

/// One sentence, or part of one, in every language. `{0}`, `{1}` … are filled by the pieces of a [`Saying`], in any order.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Phrase {
    /// English; it is also what CSV and JSON hold.
    pub en: &'static str,
    /// German.
    pub de: &'static str,
}

impl Phrase {
    /// A phrase of the table.
    pub const fn new(en: &'static str, de: &'static str) -> Self {
        Self { en, de }
    }

    /// Its words in a language.
    pub fn of(&self, language: Language) -> &'static str {
        match language {
            Language::English => self.en,
            Language::German => self.de,
        }
    }

    /// The phrase with its places filled: `{0}` by the first piece.
    pub fn with(&'static self, pieces: impl IntoIterator<Item = Piece>) -> Saying {
        Saying::new(self, pieces.into_iter().collect())
    }
}

/// Writes a table: a constant a line, and `ALL`, by which a test looks at every one. A list written by hand beside the
/// constants would sooner or later lack one.
macro_rules! table {
    ($($name:ident = $en:literal, $de:literal;)*) => {
        $(#[doc = concat!("In English: \"", $en, "\".")]
        pub static $name: $crate::phrase::Phrase = $crate::phrase::Phrase::new($en, $de);)*
        /// Every phrase of this table with its name.
        pub static ALL: &[(&str, &$crate::phrase::Phrase)] = &[$((stringify!($name), &$name)),*];
    };
}
use table;

/// Every phrase of every table, with its name.
pub fn all() -> impl Iterator<Item = (&'static str, &'static Phrase)> {
    [verdict::ALL, reasons::ALL, questions::ALL, page::ALL, outside::ALL, terminal::ALL].into_iter().flatten().copied()
}
