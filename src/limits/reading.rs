//! Reads a file that a person wrote as a tree with places, and gathers every fault instead of stopping at the first.
//! Must not know what any key means: `limits`, `recipe` and `station` say that.
//! Main types: [`Table`], [`Item`]; main function: [`read`].

use std::cell::RefCell;

use chrono::NaiveDate;
use sha2::{Digest, Sha256};
use toml::{
    Spanned,
    de::{DeTable, DeValue},
};

use super::fault::{Fault, nearest};
use crate::quantity::{Dimension, parse_as};

/// Gathers the faults of one file.
struct Collector<'a> {
    file: &'a str,
    text: &'a str,
    faults: RefCell<Vec<(usize, Fault)>>,
}

impl Collector<'_> {
    fn add(&self, at: usize, message: String, nearest: Option<&str>) {
        let before = self.text.get(..at).unwrap_or(self.text);
        let line = before.matches('\n').count() + 1;
        let column = before.rsplit('\n').next().unwrap_or("").chars().count() + 1;
        let fault = Fault { file: self.file.to_owned(), line, column, message, nearest: nearest.map(str::to_owned) };
        self.faults.borrow_mut().push((at, fault));
    }
}

/// Reads a text with a builder that knows its keys.
///
/// * `file`: its name, for the faults.
/// * `known`: the keys of its top level.
/// * `build`: takes the top level; `None` only after it reported at least one fault.
///
/// Returns what was built, or every fault in the order of the file. Broken syntax is one fault at its place.
pub fn read<T>(
    file: &str,
    text: &str,
    known: &[&'static str],
    build: impl FnOnce(&Table<'_>) -> Option<T>,
) -> Result<T, Vec<Fault>> {
    let collector = Collector { file, text, faults: RefCell::default() };
    let built = match DeTable::parse(text) {
        Ok(tree) => {
            let root = Table::open(tree.get_ref(), 0, "the file".to_owned(), known, &collector);
            build(&root)
        }
        Err(error) => {
            let at = error.span().map_or(text.len(), |span| span.start);
            collector.add(at, format!("broken syntax: {}", error.message()), None);
            None
        }
    };
    let mut faults = collector.faults.into_inner();
    faults.sort_by_key(|(at, _)| *at);
    match built {
        Some(built) if faults.is_empty() => Ok(built),
        _ if faults.is_empty() => Err(vec![Fault::of_file(file, "the file holds nothing that can be used")]),
        _ => Err(faults.into_iter().map(|(_, fault)| fault).collect()),
    }
}

/// The keys of a text's top level, as far as its syntax lets them be seen.
pub fn top_keys(text: &str) -> Vec<String> {
    let (tree, _) = DeTable::parse_recoverable(text);
    tree.get_ref().keys().map(|key| key.get_ref().to_string()).collect()
}

/// SHA-256 of a text, hexadecimal.
pub fn sha256_hex(text: &str) -> String {
    Sha256::digest(text.as_bytes()).iter().map(|byte| format!("{byte:02x}")).collect()
}

/// A table whose unknown keys are already reported.
pub struct Table<'a> {
    entries: &'a DeTable<'a>,
    at: usize,
    what: String,
    collector: &'a Collector<'a>,
    /// Known keys that an unknown one was probably meant to be: not reported as missing as well.
    misspelt: Vec<&'a str>,
}

impl<'a> Table<'a> {
    fn open(
        entries: &'a DeTable<'a>,
        at: usize,
        what: String,
        known: &[&'a str],
        collector: &'a Collector<'a>,
    ) -> Self {
        let mut misspelt = Vec::new();
        for key in entries.keys().filter(|key| !known.contains(&key.get_ref().as_ref())) {
            let free = known.iter().copied().filter(|word| !entries.contains_key(*word));
            let guess = nearest(key.get_ref(), free).or_else(|| nearest(key.get_ref(), known.iter().copied()));
            misspelt.extend(guess);
            let list = known.join(", ");
            let message = format!("unknown key `{}` in {what}; expected one of {list}", key.get_ref());
            collector.add(key.span().start, message, guess);
        }
        Self { entries, at, what, collector, misspelt }
    }

    /// The value of a key, if the key is there.
    pub fn get(&self, key: &str) -> Option<Item<'a>> {
        let (spanned, value) = self.entries.get_key_value(key)?;
        Some(Item { name: key.to_owned(), key_at: spanned.span().start, value, collector: self.collector })
    }

    /// The value of a key; its absence is a fault.
    pub fn need(&self, key: &str) -> Option<Item<'a>> {
        let found = self.get(key);
        if found.is_none() && !self.misspelt.contains(&key) {
            self.fault(format!("{} has no `{key}`; expected one", self.what), None);
        }
        found
    }

    /// Every key with its value, in the order of the file.
    pub fn each(&self) -> Vec<Item<'a>> {
        let mut all: Vec<(usize, Item<'a>)> = self
            .entries
            .iter()
            .map(|(key, value)| {
                let (name, key_at) = (key.get_ref().to_string(), key.span().start);
                (key_at, Item { name, key_at, value, collector: self.collector })
            })
            .collect();
        all.sort_by_key(|(at, _)| *at);
        all.into_iter().map(|(_, item)| item).collect()
    }

    /// Reports a fault of the table as a whole.
    pub fn fault(&self, message: impl Into<String>, nearest: Option<&str>) {
        self.collector.add(self.at, message.into(), nearest);
    }

    /// A list of tables written as `[[key]]`; empty if there are none.
    pub fn list(&self, key: &str) -> Vec<Item<'a>> {
        self.get(key).and_then(|item| item.list()).unwrap_or_default()
    }
}

/// A value with its place.
pub struct Item<'a> {
    /// Key it stands under.
    pub name: String,
    key_at: usize,
    value: &'a Spanned<DeValue<'a>>,
    collector: &'a Collector<'a>,
}

impl<'a> Item<'a> {
    /// Reports a fault at the value.
    pub fn fault(&self, message: impl Into<String>, nearest: Option<&str>) {
        self.collector.add(self.value.span().start, message.into(), nearest);
    }

    /// Reports a fault at the key.
    pub fn key_fault(&self, message: impl Into<String>, nearest: Option<&str>) {
        self.collector.add(self.key_at, message.into(), nearest);
    }

    /// The value as it is written, shortened.
    pub fn written(&self) -> String {
        let text = self.collector.text.get(self.value.span()).unwrap_or("").trim();
        let short: String = text.chars().take(40).collect();
        if short.len() < text.len() { format!("{short}…") } else { short }
    }

    fn wrong<T>(&self, expected: &str) -> Option<T> {
        let found = match self.value.get_ref() {
            DeValue::String(_) => "the text",
            DeValue::Integer(_) | DeValue::Float(_) => "the number",
            DeValue::Boolean(_) => "the switch",
            DeValue::Datetime(_) => "the date",
            DeValue::Array(_) => "the list",
            DeValue::Table(_) => "the table",
        };
        let name = &self.name;
        self.fault(format!("`{name}` is {found} {}; expected {expected}", self.written()), None);
        None
    }

    /// It is a text in quotes.
    pub fn is_text(&self) -> bool {
        self.value.get_ref().is_str()
    }

    /// It is `true` or `false`.
    pub fn is_switch(&self) -> bool {
        self.value.get_ref().is_bool()
    }

    /// It is a table.
    pub fn is_table(&self) -> bool {
        self.value.get_ref().is_table()
    }

    /// A text in quotes, not empty and without control characters.
    pub fn text(&self) -> Option<&'a str> {
        let Some(text) = self.value.get_ref().as_str() else { return self.wrong("text in quotes") };
        if text.trim().is_empty() || text.chars().any(char::is_control) {
            return self.wrong("text of at least one printable character");
        }
        Some(text)
    }

    /// One of some known words.
    pub fn word<T: Clone>(&self, words: &[(&str, T)]) -> Option<T> {
        let text = self.text()?;
        if let Some((_, meaning)) = words.iter().find(|(word, _)| *word == text) {
            return Some(meaning.clone());
        }
        let known = words.iter().map(|(word, _)| *word);
        let list = known.clone().collect::<Vec<_>>().join(", ");
        self.fault(format!("`{}` is `{text}`; expected one of {list}", self.name), nearest(text, known));
        None
    }

    fn plain_number(&self) -> Option<f64> {
        match self.value.get_ref() {
            DeValue::Integer(whole) => i64::from_str_radix(whole.as_str(), whole.radix()).ok().map(|n| n as f64),
            DeValue::Float(float) => float.as_str().parse().ok().filter(|n: &f64| n.is_finite()),
            _ => None,
        }
    }

    /// A whole number, bounds inclusive.
    pub fn whole(&self, lowest: u64, highest: u64) -> Option<u64> {
        let expected = format!("a whole number from {lowest} to {highest}");
        let DeValue::Integer(whole) = self.value.get_ref() else { return self.wrong(&expected) };
        match u64::from_str_radix(whole.as_str(), whole.radix()) {
            Ok(n) if (lowest..=highest).contains(&n) => Some(n),
            _ => self.wrong(&expected),
        }
    }

    /// A number in SI of one dimension: text with its unit, or, for a ratio, a plain number too.
    pub fn quantity(&self, dimension: Dimension) -> Option<f64> {
        let value = if let Some(text) = self.value.get_ref().as_str() {
            match parse_as(text, dimension) {
                Ok(value) => value,
                Err(error) => {
                    self.fault(format!("`{}`: {error}", self.name), None);
                    return None;
                }
            }
        } else if dimension == Dimension::Ratio {
            match self.plain_number() {
                Some(value) => value,
                None => return self.wrong("a finite number"),
            }
        } else if self.plain_number().is_some() {
            let example = crate::quantity::units_of(dimension).next().map_or("", |unit| unit.symbol);
            let name = dimension.name();
            return self.wrong(&format!("{name} in quotes with its unit, such as \"{} {example}\"", self.written()));
        } else {
            return self.wrong(&format!("{} in quotes with its unit", dimension.name()));
        };
        if value.is_finite() { Some(value) } else { self.wrong("a finite number") }
    }

    /// A quantity inside SI bounds, inclusive; `allowed` says them in words.
    pub fn quantity_within(&self, dimension: Dimension, bounds: (f64, f64), allowed: &str) -> Option<f64> {
        let value = self.quantity(dimension)?;
        if (bounds.0..=bounds.1).contains(&value) { Some(value) } else { self.wrong(allowed) }
    }

    /// A quantity above zero.
    pub fn positive(&self, dimension: Dimension) -> Option<f64> {
        self.quantity_within(dimension, (f64::MIN_POSITIVE, f64::MAX), &format!("{} above zero", dimension.name()))
    }

    /// `true` or `false`.
    pub fn switch(&self) -> Option<bool> {
        self.value.get_ref().as_bool().or_else(|| self.wrong("true or false"))
    }

    /// A day, written as TOML has it: `2026-01-12`, no quotes.
    pub fn day(&self) -> Option<NaiveDate> {
        let day = self.value.get_ref().as_datetime().filter(|d| d.time.is_none()).and_then(|d| d.date);
        day.and_then(|d| NaiveDate::from_ymd_opt(i32::from(d.year), u32::from(d.month), u32::from(d.day)))
            .or_else(|| self.wrong("a day such as 2026-01-12, without quotes"))
    }

    /// A list.
    pub fn list(&self) -> Option<Vec<Item<'a>>> {
        let Some(list) = self.value.get_ref().as_array() else { return self.wrong("a list") };
        let item = |value| Item { name: self.name.clone(), key_at: self.key_at, value, collector: self.collector };
        Some(list.iter().map(item).collect())
    }

    /// A list of texts, at least one; no text twice.
    pub fn texts(&self) -> Option<Vec<String>> {
        let list = self.list()?;
        if list.is_empty() {
            return self.wrong("a list of at least one text");
        }
        let mut texts = Vec::new();
        for item in &list {
            let text = item.text()?.to_owned();
            if texts.contains(&text) {
                item.fault(format!("`{text}` stands twice in `{}`; expected it once", self.name), None);
            } else {
                texts.push(text);
            }
        }
        Some(texts)
    }

    /// A table, whose unknown keys are reported at once. `what` names it in sentences: "limit 3".
    pub fn table(&self, what: &str, known: &[&'a str]) -> Option<Table<'a>> {
        let Some(entries) = self.value.get_ref().as_table() else { return self.wrong("a table") };
        Some(Table::open(entries, self.value.span().start, what.to_owned(), known, self.collector))
    }

    /// A table whose keys are names that the writer chose.
    pub fn open_table(&self, what: &str) -> Option<Table<'a>> {
        let Some(entries) = self.value.get_ref().as_table() else { return self.wrong("a table") };
        let at = self.value.span().start;
        Some(Table { entries, at, what: what.to_owned(), collector: self.collector, misspelt: Vec::new() })
    }
}
