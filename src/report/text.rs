//! Words for a row: value, uncertainty and unit as people read them, shared by terminal, page and PDF.
//! Must not be used to judge or to store: these are rounded.
//! Main functions: [`value_text`], [`row_line`].

use crate::{
    measurand::{self, Measurand},
    phrase::{Language, figure, name, page},
    record::sheet::{Row, RowVerdict, Value},
    uncertainty::joint,
};

/// A value in words, in the parts a page sets apart.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct ValueText {
    /// `998.7`, `2`, `≥ 5000`, `clean`; empty if there is no value.
    pub value: String,
    /// `± 3.0`, `U < 0.0001`, or `(1 to 2)` for a count in doubt; may be empty.
    pub spread: String,
    /// `MHz`; empty for counts and words.
    pub unit: String,
    /// Why there is no value; else empty.
    pub absent: String,
}

/// Value and expanded uncertainty rounded together, in the unit of the catalogue.
///
/// In a language: figures have its decimal sign.
pub fn value_text(row: &Row, language: Language) -> ValueText {
    let known = measurand::find(&row.measurand);
    let unit = known.map_or("", |m| m.unit().symbol).to_owned();
    let shown = |si: f64| known.map_or(si, |m| m.shown(si));
    match &row.value {
        Value::Number { value, .. } if !shown(*value).is_finite() => {
            ValueText { absent: page::NOT_FINITE.of(language).to_owned(), ..ValueText::default() }
        }
        Value::Number { value, expanded, .. } => {
            let (number, spread) = rounded(shown(*value), shown(*expanded), known.map_or(6, |m| m.decimals));
            let spread = if shown(*expanded).is_finite() { spread_text(&spread, language) } else { String::new() };
            ValueText { value: typeset(&number, language), spread, unit, absent: String::new() }
        }
        Value::Count { value, low, high } => {
            let doubt = || page::IN_DOUBT.with([figure(low), figure(high)]).text(language);
            let spread = if low == high { String::new() } else { doubt() };
            ValueText { value: value.to_string(), spread, ..ValueText::default() }
        }
        Value::AtLeast(least) => {
            ValueText { value: format!("≥ {}", bound_text(known, *least, language)), unit, ..ValueText::default() }
        }
        Value::Word(word) => ValueText { value: word.clone(), ..ValueText::default() },
        Value::Absent(reason) => ValueText { absent: reason.text(language), ..ValueText::default() },
    }
}

/// `± 3.0`; `U < 0.0001` where no more can be said.
pub fn spread_text(expanded: &str, language: Language) -> String {
    if expanded.starts_with('<') {
        format!("U {}", language.figure(expanded))
    } else {
        format!("± {}", typeset(expanded, language))
    }
}

/// Rounded together; in powers of ten where a column of figures could not hold the number.
fn rounded(value: f64, expanded: f64, most: usize) -> (String, String) {
    let plain = |x: f64| x.abs() < 1e7;
    if plain(value) && (plain(expanded) || !expanded.is_finite()) {
        return joint(value, expanded, most);
    }
    (format!("{value:.3e}"), format!("{expanded:.1e}"))
}

/// A bound in the unit of the catalogue, at most six significant digits, without the unit: `979.3`, `0.5`.
pub fn bound_text(known: Option<&Measurand>, si: f64, language: Language) -> String {
    let shown = known.map_or(si, |m| m.shown(si));
    if !shown.is_finite() {
        return "?".to_owned();
    }
    let rounded: f64 = format!("{shown:.5e}").parse().unwrap_or(shown);
    let size = rounded.abs();
    let odd = size >= 1e7 || (size > 0.0 && size < 1e-4);
    typeset(&if odd { format!("{rounded:e}") } else { format!("{}", rounded + 0.0) }, language)
}

/// A probability with three decimals that never claims certainty it has not: `0.748`, `< 0.001`, `> 0.999`.
pub fn probability_text(probability: f64, language: Language) -> String {
    match probability {
        p if !p.is_finite() => String::new(),
        p if p < 0.0005 => language.figure("< 0.001"),
        p if p > 0.9995 => language.figure("> 0.999"),
        p => language.figure(&format!("{p:.3}")),
    }
}

/// One plain line for a row: `Mode spacing: 998.7 ± 3.0 MHz`, or the reason why there is no value.
pub fn row_line(row: &Row, language: Language) -> String {
    let text = value_text(row, language);
    let said = if text.absent.is_empty() {
        [text.value, text.spread, text.unit].into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" ")
    } else {
        page::NO_VALUE_IN_LINE.with([name(text.absent)]).text(language)
    };
    // The last grade tried is the least demanding one.
    let outside = row.judged.last().is_some_and(|judged| judged.verdict == RowVerdict::Fail);
    let mark = match (row.note.is_empty(), outside) {
        (false, _) => format!(" - {}", row.note.text(language)),
        (true, true) => format!(" - {}", page::OUTSIDE.of(language)),
        (true, false) => String::new(),
    };
    format!("{}: {said}{mark}", row.label.text(language))
}

/// A true minus sign, and groups of three from five digits on (SI Brochure, 9th edition, 5.4.4).
fn typeset(number: &str, language: Language) -> String {
    let (sign, digits) = number.strip_prefix('-').map_or(("", number), |rest| ("−", rest));
    let (whole, rest) = digits.split_at(digits.find('.').unwrap_or(digits.len()));
    if whole.len() < 5 || !whole.bytes().all(|b| b.is_ascii_digit()) {
        return language.figure(&format!("{sign}{digits}"));
    }
    let mut grouped = String::new();
    for (i, digit) in whole.chars().enumerate() {
        if i > 0 && (whole.len() - i) % 3 == 0 {
            grouped.push('\u{a0}');
        }
        grouped.push(digit);
    }
    language.figure(&format!("{sign}{grouped}{rest}"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::phrase::Saying;

    fn row(measurand: &str, value: Value) -> Row {
        let label = measurand::find(measurand).map_or(Saying::outside("look"), |m| (&m.name).into());
        let (step, note) = (String::new(), Saying::none());
        Row {
            step,
            measurand: measurand.to_owned(),
            label,
            value,
            budget: vec![],
            judged: vec![],
            deciding: false,
            note,
        }
    }

    fn number(value: f64, expanded: f64) -> Value {
        Value::Number { value, u: expanded / 2.0, expanded, k: 2.0, dof: f64::INFINITY }
    }

    #[test]
    fn lines_of_every_kind_of_value() {
        let line = |m, v| row_line(&row(m, v), Language::English);
        assert_eq!(line("mode_spacing", number(998.73e6, 3.02e6)), "Mode spacing: 998.7 ± 3.0 MHz");
        assert_eq!(line("polarization_azimuth", number(-0.5, 0.01)), "Azimuth: −28.65 ± 0.57 °");
        assert_eq!(line("hop_count", Value::Count { value: 1, low: 0, high: 1 }), "Hops: 1 (0 to 1)");
        assert_eq!(line("extinction", Value::AtLeast(12_345.0)), "Extinction: ≥ 12\u{a0}345");
        assert_eq!(line("visual.mirror", Value::Word("clean".into())), "look: clean");
        assert_eq!(line("power", Value::Absent(Saying::outside("no meter"))), "Power: no value (no meter)");
        assert_eq!(line("power", number(f64::NAN, 1.0)), "Power: no value (not a finite number)");
    }

    #[test]
    fn german_has_a_comma_and_its_own_words() {
        let line = |m, v| row_line(&row(m, v), Language::German);
        assert_eq!(line("mode_spacing", number(998.73e6, 3.02e6)), "Modenabstand: 998,7 ± 3,0 MHz");
        assert_eq!(line("polarization_azimuth", number(-0.5, 0.01)), "Azimut: −28,65 ± 0,57 °");
        assert_eq!(line("hop_count", Value::Count { value: 1, low: 0, high: 1 }), "Modensprünge: 1 (0 bis 1)");
        assert_eq!(line("extinction", Value::AtLeast(12_345.6)), "Polarisationsverhältnis: ≥ 12\u{a0}345,6");
        assert_eq!(line("power", number(f64::NAN, 1.0)), "Leistung: kein Wert (keine endliche Zahl)");
        assert_eq!(probability_text(1.0, Language::German), "> 0,999");
    }

    #[test]
    fn probabilities_claim_no_certainty() {
        assert_eq!(probability_text(0.7479, Language::English), "0.748");
        assert_eq!(probability_text(1.0, Language::English), "> 0.999");
        assert_eq!(probability_text(0.0, Language::English), "< 0.001");
        assert_eq!(probability_text(f64::NAN, Language::English), "");
    }
}
