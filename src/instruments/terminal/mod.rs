//! A person at the terminal answers: the question on one stream, the answer typed on the other.
//! Must not print results: those go to standard output, elsewhere.
//! Main type: [`TerminalPerson`].

mod form;
mod hand;
mod ink;
mod screen;

pub use form::caution_lines;
pub use hand::HandInterlock;
pub use ink::{Charset, Line, Look, Role};
pub use screen::{Colour, Screen};

use std::io::{BufRead, Write};
use std::time::{Duration, Instant};

use super::typed::parse_answer;
use crate::phrase::{Phrase, name, outside, said, terminal};
use crate::record::question::{Answer, Expects, Question};
use crate::station::{Person, Trouble};

/// Wrong answers in a row after which asking again helps nobody (a pipe of the wrong text).
const TRIES: usize = 20;
/// An Enter that comes sooner after its question was meant for something else: a second line end of a scanner, a bounced
/// key. Nobody reads a question and acts within this time (simple reactions take 0.2 s; from memory).
const TOO_SOON: Duration = Duration::from_millis(400);

/// Asks a person. `skip: why` leaves a row empty with the reason, `stop: why` ends the run, `?` explains.
pub struct TerminalPerson {
    initials: String,
    input: Box<dyn BufRead>,
    output: Box<dyn Write>,
    screen: Screen,
    has_asked: bool,
}

impl TerminalPerson {
    /// Over two streams, standard input and standard error as a rule.
    pub fn new(initials: String, input: Box<dyn BufRead>, output: Box<dyn Write>, screen: Screen) -> Self {
        Self { initials, input, output, screen, has_asked: false }
    }

    /// Asks for something that is no question of a run: the tube's type, the technician's initials.
    pub fn ask_line(&mut self, prompt: &str) -> Option<String> {
        self.say(&format!("{prompt}: "));
        self.line().map(|line| line.trim().to_owned()).filter(|line| !line.is_empty())
    }

    /// Puts a caution and waits for Enter.
    ///
    /// Errors: the input ended.
    pub fn confirm(&mut self, caution: &Phrase, what: &'static Phrase) -> Result<(), Trouble> {
        let look = self.screen.look();
        self.show(caution_lines(caution.of(look.language), &look), &look);
        self.wait_for(what)
    }

    /// Waits for Enter: what the program cannot see, a person has looked at or done.
    ///
    /// Errors: the input ended.
    pub fn wait_for(&mut self, what: &'static Phrase) -> Result<(), Trouble> {
        let look = self.screen.look();
        for _ in 0..TRIES {
            let asked = Instant::now();
            let prompt = terminal::THEN_ENTER.with([said(what)]).text(look.language);
            self.begin(Line::of(Role::Strong, format!("{prompt}: ")), &look);
            match self.line() {
                None => {
                    return Err(Trouble::NoAnswer("the input ended before the bench was said to be safe".to_owned()));
                }
                Some(line) if line.trim().is_empty() && !self.too_soon(asked) => return Ok(()),
                Some(_) => {}
            }
        }
        Err(Trouble::NoAnswer("the bench was not said to be safe".to_owned()))
    }

    /// Sets the initials, once they are known.
    pub fn set_initials(&mut self, initials: String) {
        self.initials = initials;
    }

    fn say(&mut self, text: &str) {
        // A terminal that is gone shows itself at the next read.
        let _ = write!(self.output, "{text}").and_then(|()| self.output.flush());
    }

    /// Whole lines.
    fn show(&mut self, lines: Vec<Line>, look: &Look) {
        self.screen.step_below();
        let text: String = lines.iter().map(|line| line.coded(look) + "\n").collect();
        self.screen.wrote(lines.iter().map(|line| line.rows(look.width)).sum());
        self.say(&text);
    }

    /// A line that is typed on.
    fn begin(&mut self, prompt: Line, look: &Look) {
        self.screen.step_below();
        self.screen.typed_on(prompt.width());
        self.say(&prompt.coded(look));
    }

    /// One line; none at the end of the input. Bytes that are no text are replaced.
    fn line(&mut self) -> Option<String> {
        let mut line = Vec::new();
        match self.input.read_until(b'\n', &mut line) {
            Ok(0) | Err(_) => None,
            Ok(_) => {
                let line = String::from_utf8_lossy(&line).trim_end_matches(['\n', '\r']).to_owned();
                self.screen.typed(&line);
                Some(line)
            }
        }
    }

    fn too_soon(&self, asked: Instant) -> bool {
        self.screen.is_keyboard() && asked.elapsed() < TOO_SOON
    }

    /// What one typed line comes to; none if it has to be asked again, after `said`.
    fn taken(
        &mut self,
        question: &Question,
        line: &str,
        asked: Instant,
        look: &Look,
    ) -> Option<Result<Answer, Trouble>> {
        let text = line.trim();
        if let Some(reason) = after(text, "skip") {
            return Some(Ok(Answer::CannotSay(self.reason(reason, "skip", look))));
        }
        if let Some(reason) = after(text, "stop") {
            return Some(Err(Trouble::Stopped(self.reason(reason, "stop", look))));
        }
        let why = match (text, &question.expects) {
            ("?", _) => {
                self.show(form::explanation(question, look), look);
                return None;
            }
            ("", Expects::Done) if self.too_soon(asked) => terminal::TOO_SOON.of(look.language).to_owned(),
            ("", Expects::Done) => return Some(Ok(Answer::Done)),
            ("-", Expects::Number { .. }) => return Some(Ok(Answer::CannotSay(outside::NO_INSTRUMENT.en.to_owned()))),
            ("", _) => terminal::NOTHING_TYPED.of(look.language).to_owned(),
            _ => match parse_answer(question, &hand::as_meant(question, text), true) {
                Ok(answer) => return Some(Ok(answer)),
                Err(why) => terminal::NOT_TAKEN.with([name(why)]).text(look.language),
            },
        };
        let bar = Line::of(Role::Alert, look.sign("│ × ", "| x "));
        self.show(form::wrapped(&bar, &why, Role::Plain, look), look);
        None
    }

    /// The reason behind `skip` or `stop`, asked for if it was left out.
    fn reason(&mut self, given: &str, word: &str, look: &Look) -> String {
        let given = if given.is_empty() {
            let prompt = terminal::AND_WHY.with([name(word)]).text(look.language);
            self.begin(Line::of(Role::Strong, format!("{prompt}: ")), look);
            self.line().unwrap_or_default().trim().to_owned()
        } else {
            given.to_owned()
        };
        if given.is_empty() { outside::NO_REASON.en.to_owned() } else { given }
    }
}

impl Person for TerminalPerson {
    fn initials(&self) -> String {
        self.initials.clone()
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        let look = self.screen.look();
        let is_first = !std::mem::replace(&mut self.has_asked, true);
        self.show(form::question_lines(question, &look, is_first), &look);
        let key = format!("steps.{}.{}", question.step, question.word);
        for _ in 0..TRIES {
            self.begin(form::prompt(question, &look), &look);
            let asked = Instant::now();
            let Some(line) = self.line() else {
                return Err(Trouble::NoAnswer(format!("`{key}` was not answered: the input ended")));
            };
            if let Some(taken) = self.taken(question, &line, asked, &look) {
                return taken;
            }
        }
        Err(Trouble::NoAnswer(format!("`{key}` was not answered: {TRIES} answers could not be used")))
    }
}

/// What follows `skip` or `stop`, if the line begins with it: `stop`, `stop: why`, `stop why`.
fn after<'a>(line: &'a str, word: &str) -> Option<&'a str> {
    let rest = line.get(..word.len()).filter(|start| start.eq_ignore_ascii_case(word)).and(line.get(word.len()..))?;
    (rest.is_empty() || rest.starts_with([':', ' '])).then(|| rest.trim_start_matches([':', ' ']).trim_end())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn person(typed: &'static str) -> TerminalPerson {
        TerminalPerson::new("KT".into(), Box::new(typed.as_bytes()), Box::new(std::io::sink()), Screen::plain())
    }

    fn question() -> Question {
        Question {
            step: "supply".into(),
            word: "run_current".into(),
            text: "Run current".into(),
            caution: String::new(),
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
