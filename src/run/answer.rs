//! Whether an answer fits its question.
//! Must not ask.
//! Main function: [`check_answer`].

use crate::{
    quantity::UNITS,
    record::question::{Answer, Expects},
};

/// Whether an answer fits what a question expects; `CannotSay` always does.
///
/// # Errors
/// What was found and what was expected, as a lower-case fragment.
pub fn check_answer(expects: &Expects, answer: &Answer) -> Result<(), String> {
    match (expects, answer) {
        (_, Answer::CannotSay(_)) | (Expects::Done, Answer::Done) => Ok(()),
        (Expects::Number { ucum, lowest, highest }, Answer::Number(value)) => {
            // NaN fails the comparison too.
            if value >= lowest && value <= highest { Ok(()) } else { Err(outside(*value, *lowest, *highest, ucum)) }
        }
        (Expects::Whole { lowest, highest }, Answer::Whole(value)) => {
            if (lowest..=highest).contains(&value) {
                Ok(())
            } else {
                Err(format!("found {value}, expected {lowest} to {highest}"))
            }
        }
        (Expects::Choice(words), Answer::Choice(word)) => {
            if words.contains(word) {
                Ok(())
            } else {
                Err(format!("found `{word}`, expected one of {}", words.join(", ")))
            }
        }
        (expects, _) => Err(format!("found another kind of answer, expected {}", kind(expects))),
    }
}

fn outside(value: f64, lowest: f64, highest: f64, ucum: &str) -> String {
    let factor = UNITS.iter().find(|unit| unit.ucum == ucum).map_or(1.0, |unit| unit.factor);
    format!("found {} {ucum}, expected {} to {} {ucum}", value / factor, lowest / factor, highest / factor)
}

fn kind(expects: &Expects) -> String {
    match expects {
        Expects::Number { ucum, .. } => format!("a number in {ucum}"),
        Expects::Whole { .. } => "a whole number".into(),
        Expects::Choice(words) => format!("one of {}", words.join(", ")),
        Expects::Done => "that it is done".into(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_are_inclusive_and_nan_never_fits() {
        let seconds = Expects::Number { ucum: "s".into(), lowest: 0.0, highest: 600.0 };
        assert_eq!(check_answer(&seconds, &Answer::Number(600.0)), Ok(()));
        assert!(check_answer(&seconds, &Answer::Number(600.1)).is_err());
        assert!(check_answer(&seconds, &Answer::Number(f64::NAN)).is_err());
        assert!(check_answer(&seconds, &Answer::Done).is_err());
        assert_eq!(check_answer(&seconds, &Answer::CannotSay("no watch".into())), Ok(()));
    }
}
