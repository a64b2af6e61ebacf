//! What hands type and do: gloved answers made into words, and high voltage taken off by a person.
//! Must not guess: what can be read two ways stays as it was typed, and is refused.
//! Main items: [`as_meant`], [`HandInterlock`].

use super::TerminalPerson;
use crate::phrase::terminal;
use crate::record::question::{Expects, Question};
use crate::station::{Interlock, Trouble};

/// A typed answer with the digit of a choice made its word, and a decimal comma a point.
///
/// `1,281` could also be 1281: as a decimal it is taken only if 1281 in the same unit lies outside what the question
/// takes for possible; else it stays as it is, and no number is read in it.
pub(super) fn as_meant(question: &Question, text: &str) -> String {
    match &question.expects {
        Expects::Choice(words) => choice(words, text).unwrap_or(text).to_owned(),
        Expects::Number { .. } => decimal(question, text).unwrap_or_else(|| text.to_owned()),
        _ => text.to_owned(),
    }
}

fn choice<'a>(words: &'a [String], text: &str) -> Option<&'a str> {
    if words.iter().any(|word| word == text) {
        return None;
    }
    let index: usize = text.parse().ok()?;
    words.get(index.checked_sub(1)?).map(String::as_str)
}

fn decimal(question: &Question, text: &str) -> Option<String> {
    let (whole, rest) = text.split_once(',')?;
    let digits = rest.bytes().take_while(u8::is_ascii_digit).count();
    let is_number = whole.trim_start_matches(['-', '+']).bytes().all(|byte| byte.is_ascii_digit());
    if !is_number || digits == 0 || rest.contains([',', '.']) {
        return None;
    }
    let might_group = digits == 3 && !whole.trim_start_matches(['-', '+', '0']).is_empty();
    let grouped = super::parse_answer(question, &format!("{whole}{rest}"), true);
    (!might_group || grouped.is_err()).then(|| format!("{whole}.{rest}"))
}

/// A person takes the high voltage off, and says so: the program sees no supply.
pub struct HandInterlock {
    person: TerminalPerson,
}

impl HandInterlock {
    /// Asks this person.
    pub fn new(person: TerminalPerson) -> Self {
        Self { person }
    }
}

impl Interlock for HandInterlock {
    fn make_safe(&mut self) -> Result<(), Trouble> {
        self.person.confirm(&terminal::TAKE_OFF, &terminal::IS_OFF)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn asked(expects: Expects) -> Question {
        Question {
            step: "supply".into(),
            word: "run_voltage".into(),
            text: "Run voltage".into(),
            caution: String::new(),
            expects,
            high_voltage: false,
        }
    }

    #[test]
    fn a_comma_is_a_point_where_it_can_be_nothing_else() {
        let volts = asked(Expects::Number { ucum: "V".into(), lowest: 0.0, highest: 20e3 });
        let kilovolts = asked(Expects::Number { ucum: "kV".into(), lowest: 0.0, highest: 20e3 });
        for (question, typed, meant) in [
            (&kilovolts, "0,98", "0.98"),
            (&kilovolts, "0,600 kV", "0.600 kV"),
            (&kilovolts, "1,281", "1.281"),
            (&kilovolts, "1,281 V", "1,281 V"),
            (&volts, "1,281", "1,281"),
            (&volts, "1,281.0", "1,281.0"),
            (&volts, "1,2,3", "1,2,3"),
            (&volts, "980,5 V", "980.5 V"),
            (&volts, "much, too much", "much, too much"),
        ] {
            assert_eq!(as_meant(question, typed), meant, "{typed}");
        }
    }

    #[test]
    fn a_digit_is_a_choice() {
        let look = asked(Expects::Choice(vec!["clean".into(), "film".into()]));
        assert_eq!(
            ["1", "2", "3", "0", "film"].map(|typed| as_meant(&look, typed)),
            ["clean", "film", "3", "0", "film"]
        );
    }
}
