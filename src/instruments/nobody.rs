//! What a bench lacks: no person, no instrument, nothing to switch off.
//! Must not pretend: each says why there is nothing.
//! Main types: [`Nobody`], [`NoInstrument`].

use crate::record::question::{Answer, Question};
use crate::station::{
    CaptureRequest, CaptureSource, CapturedBytes, Interlock, Meters, Person, ReadingRequest, Trouble,
};

/// Nobody is at the bench.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Nobody {
    /// Captures alone are looked at: a question is passed over with this reason.
    PassesOver(String),
    /// Somebody should have answered: the sheet stays open, with this hint.
    LeavesOpen(String),
}

impl Person for Nobody {
    fn initials(&self) -> String {
        String::new()
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        match self {
            Self::PassesOver(reason) => Ok(Answer::CannotSay(reason.clone())),
            Self::LeavesOpen(hint) => {
                Err(Trouble::NoAnswer(format!("`steps.{}.{}` was not answered; {hint}", question.step, question.word)))
            }
        }
    }
}

/// No capture source, no meter; nothing that high voltage could be taken from by this program.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NoInstrument {
    /// Why: "captures only: no meter".
    pub reason: String,
}

impl CaptureSource for NoInstrument {
    fn capture(&mut self, _: &CaptureRequest) -> Result<CapturedBytes, Trouble> {
        Err(Trouble::NotHere(self.reason.clone()))
    }
}

impl Meters for NoInstrument {
    fn read(&mut self, _: &ReadingRequest) -> Result<f64, Trouble> {
        Err(Trouble::NotHere(self.reason.clone()))
    }
}

impl Interlock for NoInstrument {
    fn make_safe(&mut self) -> Result<(), Trouble> {
        Err(Trouble::NotHere(self.reason.clone()))
    }
}
