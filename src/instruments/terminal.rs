//! A person at the terminal answers: the question on one stream, the answer typed on the other.
//! Must not print results: those go to standard output, elsewhere.
//! Main type: [`TerminalPerson`].

use std::io::{BufRead, Write};

use super::typed::{expected, parse_answer};
use crate::record::question::{Answer, Expects, Question};
use crate::station::{Person, Trouble};

/// Wrong answers in a row after which asking again helps nobody (a pipe of the wrong text).
const TRIES: usize = 20;

/// Asks a person. `skip: why` leaves a row empty with the reason, `stop: why` ends the run.
pub struct TerminalPerson {
    initials: String,
    input: Box<dyn BufRead>,
    output: Box<dyn Write>,
}

impl TerminalPerson {
    /// Over two streams, standard input and standard error as a rule.
    pub fn new(initials: String, input: Box<dyn BufRead>, output: Box<dyn Write>) -> Self {
        Self { initials, input, output }
    }

    /// Asks for something that is no question of a run: the tube's type, the technician's initials.
    pub fn ask_line(&mut self, prompt: &str) -> Option<String> {
        self.say(&format!("{prompt}: "));
        self.line().map(|line| line.trim().to_owned()).filter(|line| !line.is_empty())
    }

    /// Sets the initials, once they are known.
    pub fn set_initials(&mut self, initials: String) {
        self.initials = initials;
    }

    fn say(&mut self, text: &str) {
        // A terminal that is gone shows itself at the next read.
        let _ = write!(self.output, "{text}").and_then(|()| self.output.flush());
    }

    /// One line; none at the end of the input. Bytes that are no text are replaced.
    fn line(&mut self) -> Option<String> {
        let mut line = Vec::new();
        match self.input.read_until(b'\n', &mut line) {
            Ok(0) | Err(_) => None,
            Ok(_) => Some(String::from_utf8_lossy(&line).trim_end_matches(['\n', '\r']).to_owned()),
        }
    }
}

impl Person for TerminalPerson {
    fn initials(&self) -> String {
        self.initials.clone()
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        let prompt = match &question.expects {
            Expects::Done => format!("{} [Enter when done]: ", question.text),
            other => format!("{} ({}): ", question.text, expected(other)),
        };
        let key = format!("steps.{}.{}", question.step, question.word);
        for _ in 0..TRIES {
            self.say(&prompt);
            let Some(line) = self.line() else {
                return Err(Trouble::NoAnswer(format!("`{key}` was not answered: the input ended")));
            };
            if let Some(reason) = after(&line, "skip") {
                return Ok(Answer::CannotSay(reason));
            }
            if let Some(reason) = after(&line, "stop") {
                return Err(Trouble::Stopped(reason));
            }
            match parse_answer(question, &line, true) {
                Ok(answer) => return Ok(answer),
                Err(why) => self.say(&format!("{why}\n(`skip: why` leaves it open, `stop: why` ends the run)\n")),
            }
        }
        Err(Trouble::NoAnswer(format!("`{key}` was not answered: {TRIES} answers could not be used")))
    }
}

/// The reason after `skip` or `stop`.
fn after(line: &str, word: &str) -> Option<String> {
    let rest = line.trim().strip_prefix(word)?;
    let reason = match rest.strip_prefix(':') {
        Some(reason) => reason.trim(),
        None if rest.is_empty() => "",
        None => return None,
    };
    Some(if reason.is_empty() { "no reason given".to_owned() } else { reason.to_owned() })
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn person(typed: &'static str) -> TerminalPerson {
        TerminalPerson::new("KT".into(), Box::new(typed.as_bytes()), Box::new(std::io::sink()))
    }

    fn question() -> Question {
        Question {
            step: "supply".into(),
            word: "run_current".into(),
            text: "Run current".into(),
            expects: Expects::Number { ucum: "mA".into(), lowest: 0.0, highest: 0.02 },
            high_voltage: false,
        }
    }

    #[test]
    fn asks_again_until_it_can_be_used() {
        assert_eq!(person("much\n4 kV\n4.0\n").answer(&question()), Ok(Answer::Number(0.004)));
    }

    #[test]
    fn skips_stops_and_ends() {
        assert_eq!(person("skip: no meter\n").answer(&question()), Ok(Answer::CannotSay("no meter".into())));
        assert_eq!(person("stop\n").answer(&question()), Err(Trouble::Stopped("no reason given".into())));
        let error = person("\u{fffd}\n").answer(&question()).unwrap_err().to_string();
        assert!(error.contains("`steps.supply.run_current`"), "{error}");
    }
}
