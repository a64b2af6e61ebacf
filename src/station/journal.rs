//! Where a run's driver stores what happened, as a trait.
//! Must not do I/O: `disk` implements it with a folder.
//! Main type: [`Journal`].

use super::bench::{CapturedBytes, Moment};
use crate::record::event::{Event, Happening};

/// Why something could not be stored; the run stays as it was stored last.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{0}")]
pub struct JournalError(pub String);

/// How soon an event must survive a power cut.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Durability {
    /// Before the call returns.
    Now,
    /// Within a second: short captures of a dwell.
    Soon,
}

/// Stores events and kept captures.
pub trait Journal {
    /// Appends one event.
    fn append(&mut self, at: Moment, what: &Happening, durability: Durability) -> Result<Event, JournalError>;

    /// Keeps the bytes of a capture; on disk when it returns. Returns the names to be put into its event.
    fn keep(&mut self, number: u64, captured: &CapturedBytes) -> Result<Vec<String>, JournalError>;
}
