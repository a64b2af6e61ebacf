//! The only loop: asks what the run wants, does it through the bench, measures, stores what happened, feeds it back.
//! Must not decide anything about a tube, and never shows anything itself.
//! Main types: [`Driver`], [`Interrupted`], [`Watcher`].

mod drive;
mod engine;
mod finding;
#[cfg(test)]
mod tests;

pub use drive::{Driver, Watcher, fold, resume};
pub use engine::{Engine, Measured};
pub use finding::finding_of;

use crate::station::{JournalError, Trouble};

/// Why the loop ended before the run was finished. What was stored stays; the same command goes on from there.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Interrupted {
    /// A person's answer is missing.
    #[error("{0}")]
    NoAnswer(String),
    /// An instrument failed again and again.
    #[error("{0}")]
    Instrument(String),
    /// Something could not be stored.
    #[error("{0}")]
    Journal(#[from] JournalError),
    /// The same thing was wanted again and again without end.
    #[error("the run asked for the same thing {times} times without going on: {want}")]
    Stuck {
        /// How often.
        times: u32,
        /// What it wanted.
        want: String,
    },
}

impl From<Trouble> for Interrupted {
    fn from(trouble: Trouble) -> Self {
        match trouble {
            Trouble::NoAnswer(what) | Trouble::Stopped(what) => Self::NoAnswer(what),
            Trouble::NotHere(what) | Trouble::Instrument(what) => Self::Instrument(what),
        }
    }
}
