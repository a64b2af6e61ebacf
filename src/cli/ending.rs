//! How a command ends, and the exit status that says so.
//! Must not print.
//! Main types: [`Ending`], [`Failure`].

/// How a command ends. 1, 2 and 101 are left to accident, wrong usage and panic, so that no accident reads as a verdict.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ending {
    /// Done, accepted.
    Accepted,
    /// Done, not accepted: a tube or a lot.
    NotAccepted,
    /// Hold: no verdict on the tube.
    Hold,
    /// Stopped or unfinished, kept.
    Unfinished,
    /// Input cannot be used: captures, files, serials, types, faults found by `check`.
    Unusable,
    /// An instrument failed.
    Instrument,
    /// Store, disk, or serial already running.
    Store,
    /// A proof does not fit.
    Proof,
    /// Not allowed.
    NotAllowed,
}

impl Ending {
    /// Exit status.
    pub fn status(self) -> u8 {
        match self {
            Self::Accepted => 0,
            Self::NotAccepted => 20,
            Self::Hold => 21,
            Self::Unfinished => 22,
            Self::Unusable => 30,
            Self::Instrument => 31,
            Self::Store => 32,
            Self::Proof => 33,
            Self::NotAllowed => 34,
        }
    }

    /// Of two endings the one with the higher status: with several files it counts.
    pub fn worse(self, other: Self) -> Self {
        if other.status() > self.status() { other } else { self }
    }
}

/// A command that ended before it was done, and what to say.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Failure {
    /// How it ends.
    pub ending: Ending,
    /// Said on standard error.
    pub message: String,
}

impl Failure {
    /// With a message.
    pub fn new(ending: Ending, message: impl Into<String>) -> Self {
        Self { ending, message: message.into() }
    }

    /// Input that cannot be used.
    pub fn unusable(message: impl Into<String>) -> Self {
        Self::new(Ending::Unusable, message)
    }

    /// The disk, or a serial already running.
    pub fn store(error: &crate::disk::DiskError) -> Self {
        Self::new(Ending::Store, error.to_string())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_highest_status_counts() {
        assert_eq!(Ending::Hold.worse(Ending::Unusable), Ending::Unusable);
        assert_eq!(Ending::Unusable.worse(Ending::Accepted), Ending::Unusable);
    }
}
