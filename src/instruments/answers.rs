//! Answers from a file stand for a person.
//! Must not guess: what the file does not say is not answered.
//! Main type: [`FilePerson`].

use crate::record::question::{Answer, Question};
use crate::station::{Person, Trouble, answers::Answers};

/// Answers from a file.
#[derive(Debug, Clone, PartialEq)]
pub struct FilePerson {
    answers: Answers,
    /// A question the file does not answer is passed over with this reason instead of leaving the sheet open.
    pass_over: Option<String>,
}

impl FilePerson {
    /// Over a file that was read.
    ///
    /// * `pass_over`: where only captures are looked at, why the file need not answer everything.
    pub fn new(answers: Answers, pass_over: Option<String>) -> Self {
        Self { answers, pass_over }
    }
}

impl Person for FilePerson {
    fn initials(&self) -> String {
        self.answers.technician.clone().unwrap_or_default()
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        match &self.pass_over {
            Some(reason) if self.answers.get(&question.step, &question.word).is_none() => {
                Ok(Answer::CannotSay(reason.clone()))
            }
            _ => self.answers.answer(question).map_err(|error| Trouble::NoAnswer(error.to_string())),
        }
    }
}
