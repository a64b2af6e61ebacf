//! The languages of a sheet, and how each writes numbers and days.
//! Must not round: figures come in as text, with a decimal point.
//! Main type: [`Language`].

use chrono::{DateTime, FixedOffset, NaiveDate};

/// A language in which a sheet can be written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Language {
    /// English; the language of everything that is data.
    #[default]
    English,
    /// German.
    German,
}

impl Language {
    /// Every language with its code (ISO 639-1), as the station file and `--language` have it.
    pub const CODES: [(&'static str, Self); 2] = [("en", Self::English), ("de", Self::German)];

    /// The language with a code.
    pub fn of_code(code: &str) -> Option<Self> {
        Self::CODES.iter().find(|(known, _)| *known == code).map(|(_, language)| *language)
    }

    /// The language of a stored record: empty is English, and so is one that a later program knows and this does not.
    pub fn of_record(stored: &str) -> Self {
        Self::of_code(stored).unwrap_or_default()
    }

    /// How a record stores it: English, the language of every old record, is empty.
    pub fn stored(self) -> String {
        if self == Self::English { String::new() } else { self.code().to_owned() }
    }

    /// Its code.
    pub fn code(self) -> &'static str {
        match self {
            Self::English => "en",
            Self::German => "de",
        }
    }

    /// A figure, which may have its unit with it, with this language's decimal sign (German: a comma, DIN 1333).
    pub fn figure(self, english: &str) -> String {
        if self == Self::English {
            return english.to_owned();
        }
        let letters: Vec<char> = english.chars().collect();
        let digit = |i: Option<usize>| i.and_then(|i| letters.get(i)).is_some_and(char::is_ascii_digit);
        let signed = letters.iter().enumerate().map(|(i, c)| {
            let decimal = *c == '.' && digit(i.checked_sub(1)) && digit(Some(i + 1));
            if decimal { ',' } else { *c }
        });
        signed.collect()
    }

    /// A day: `2026-01-12`, or `12.01.2026` in German (DIN 5008).
    pub fn day(self, day: NaiveDate) -> String {
        day.format(self.day_format()).to_string()
    }

    /// A day that comes as text, such as a date of receipt; anything else stays as it is.
    pub fn day_text(self, text: &str) -> String {
        text.parse().map_or_else(|_| text.to_owned(), |day| self.day(day))
    }

    /// A moment to the second, with its offset.
    pub fn moment(self, at: DateTime<FixedOffset>) -> String {
        format!("{} {}", at.format(self.day_format()), at.format("%H:%M:%S %:z"))
    }

    fn day_format(self) -> &'static str {
        match self {
            Self::English => "%Y-%m-%d",
            Self::German => "%d.%m.%Y",
        }
    }
}
