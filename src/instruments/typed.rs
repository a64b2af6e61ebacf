//! From the text somebody typed to an answer, checked against what the question expects.
//! Must not ask.
//! Main functions: [`parse_answer`], [`expected`], [`said`].

use crate::quantity::{UNITS, Unit, parse_as};
use crate::record::question::{Answer, Expects, Question};

fn unit_of(ucum: &str) -> Option<&'static Unit> {
    UNITS.iter().find(|unit| unit.ucum == ucum)
}

/// What would do as an answer, in words: "a voltage from 0 kV to 12 kV".
pub fn expected(expects: &Expects) -> String {
    match expects {
        Expects::Number { ucum, lowest, highest } => match unit_of(ucum) {
            Some(unit) => {
                let (low, high) = (shown(*lowest / unit.factor), shown(*highest / unit.factor));
                let symbol = unit.symbol;
                format!("{} from {low} {symbol} to {high} {symbol}", unit.dimension.name())
            }
            None => format!("a number from {} to {}", shown(*lowest), shown(*highest)),
        },
        Expects::Whole { lowest, highest } => format!("a whole number from {lowest} to {highest}"),
        Expects::Choice(words) => format!("one of {}", words.join(", ")),
        Expects::Done => "`done`, once it is done".to_owned(),
    }
}

/// An answer in words, in the unit of the question: `0.98 kV`, `clean`.
pub fn said(question: &Question, answer: &Answer) -> String {
    match answer {
        Answer::Number(value) => {
            let ucum = if let Expects::Number { ucum, .. } = &question.expects { ucum.as_str() } else { "" };
            match unit_of(ucum) {
                Some(unit) => format!("{} {}", shown(value / unit.factor), unit.symbol),
                None => shown(*value),
            }
        }
        Answer::Whole(count) => count.to_string(),
        Answer::Choice(word) => word.clone(),
        Answer::Done => "done".to_owned(),
        Answer::CannotSay(reason) => format!("left open: {reason}"),
    }
}

/// Six significant digits are more than a bound of what is possible has.
pub(super) fn shown(value: f64) -> String {
    let rounded: f64 = format!("{value:.5e}").parse().unwrap_or(value);
    format!("{}", rounded + 0.0)
}

/// Reads an answer.
///
/// * `text`: as typed, blanks around it do not count. A number may stand without its unit if `unit_shown`: then it is in
///   the unit the question shows.
///
/// Errors say what was found and what is expected.
pub fn parse_answer(question: &Question, text: &str, unit_shown: bool) -> Result<Answer, String> {
    let text = text.trim();
    let wrong = |why: String| format!("{why}; expected {}", expected(&question.expects));
    match &question.expects {
        Expects::Number { ucum, lowest, highest } => {
            let value = number(text, unit_of(ucum), unit_shown).map_err(wrong)?;
            // A bound is meant as it is shown: the last binary digit of a conversion must not refuse it.
            let slack = 1e-12 * (lowest.abs() + highest.abs());
            if value < lowest - slack || value > highest + slack {
                return Err(wrong(format!("`{text}` is outside what is possible")));
            }
            Ok(Answer::Number(value))
        }
        Expects::Whole { lowest, highest } => match text.parse::<u64>() {
            Ok(count) if (*lowest..=*highest).contains(&count) => Ok(Answer::Whole(count)),
            _ => Err(wrong(format!("found `{text}`"))),
        },
        Expects::Choice(words) => match words.iter().find(|word| word.eq_ignore_ascii_case(text)) {
            Some(word) => Ok(Answer::Choice(word.clone())),
            None => Err(wrong(format!("found `{text}`"))),
        },
        Expects::Done if ["", "done", "yes", "true"].contains(&text) => Ok(Answer::Done),
        Expects::Done => Err(wrong(format!("found `{text}`"))),
    }
}

fn number(text: &str, unit: Option<&'static Unit>, unit_shown: bool) -> Result<f64, String> {
    let bare = text.parse::<f64>().ok().filter(|value| value.is_finite());
    match (unit, bare) {
        (Some(unit), Some(value)) if unit_shown => Ok(value * unit.factor),
        (Some(unit), _) => parse_as(text, unit.dimension).map_err(|error| {
            // What is expected follows anyway, more narrowly.
            let error = error.to_string();
            error.split("; expected").next().unwrap_or_default().to_owned()
        }),
        (None, Some(value)) => Ok(value),
        (None, None) => Err(format!("`{text}` is no number")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn question(expects: Expects) -> Question {
        Question {
            step: "supply".into(),
            word: "w".into(),
            text: "?".into(),
            caution: String::new(),
            expects,
            high_voltage: false,
        }
    }

    #[test]
    fn numbers_are_read_with_their_unit_and_bounded() {
        let voltage = question(Expects::Number { ucum: "kV".into(), lowest: 0.0, highest: 12e3 });
        assert_eq!(parse_answer(&voltage, " 0.98 kV ", false), Ok(Answer::Number(980.0)));
        assert_eq!(parse_answer(&voltage, "980 V", false), Ok(Answer::Number(980.0)));
        assert_eq!(parse_answer(&voltage, "0.98", true), Ok(Answer::Number(980.0)));
        for (text, why) in [
            ("0.98", "no unit"),
            ("13 kV", "outside what is possible; expected a voltage from 0 kV to 12 kV"),
            ("-1 V", "outside"),
            ("4 mA", "not a unit of a voltage"),
            ("much", "does not start with a number"),
            ("NaN", "does not start with a number"),
        ] {
            let error = parse_answer(&voltage, text, false).err().unwrap_or_default();
            assert!(error.contains(why), "{text}: {error}");
        }
    }

    #[test]
    fn words_and_counts() {
        let tries = question(Expects::Whole { lowest: 1, highest: 3 });
        assert_eq!(parse_answer(&tries, "2", false), Ok(Answer::Whole(2)));
        assert!(parse_answer(&tries, "4", false).is_err_and(|e| e.contains("from 1 to 3")));
        let look = question(Expects::Choice(vec!["clean".into(), "film".into()]));
        assert_eq!(parse_answer(&look, "Clean", false), Ok(Answer::Choice("clean".into())));
        assert!(parse_answer(&look, "dirty", false).is_err_and(|e| e.contains("one of clean, film")));
        assert_eq!(parse_answer(&question(Expects::Done), "", false), Ok(Answer::Done));
        assert!(parse_answer(&question(Expects::Done), "later", false).is_err());
    }
}
