//! What happens to a tube between its runs: rework, returns, sales; one line each in a file of its own.
//! Must not hold anything measured.
//! Main types: [`LifeEvent`], [`LifeKind`].

use serde::{Deserialize, Serialize};

use super::link::Link;

/// Version of the form of a line. A newer one is refused, an older one stays readable.
pub const LIFE_VERSION: u32 = 1;

/// One line of a tube's life.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LifeEvent {
    /// Number in the file, from 0, without gaps.
    pub seq: u64,
    /// When it was noted, RFC 3339 with offset.
    pub noted_at: String,
    /// Form of the line.
    pub version: u32,
    /// Serial of the tube: the file's name may be shortened.
    pub serial: String,
    /// What happened.
    pub kind: LifeKind,
    /// The day on which it happened, `YYYY-MM-DD`.
    pub date: String,
    /// What was done, in words.
    pub note: String,
    /// Id of the latest finished run when it was noted; empty if there was none.
    pub after: String,
    /// SHA-256 of the line before, hexadecimal; of the empty text for the first.
    pub before: String,
}

/// What happened to a tube.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum LifeKind {
    /// Something was changed on it.
    Rework,
    /// It came back from where it was sold to.
    Return,
    /// It was sold.
    Sold,
}

impl LifeKind {
    /// Every kind.
    pub const ALL: [Self; 3] = [Self::Rework, Self::Return, Self::Sold];

    /// The word that is typed and shown.
    pub fn word(self) -> &'static str {
        match self {
            Self::Rework => "rework",
            Self::Return => "return",
            Self::Sold => "sold",
        }
    }
}

impl LifeEvent {
    /// The tube is not what it was: the next run is of a changed tube, or of one that nobody watched for a while.
    pub fn changes_the_tube(&self) -> bool {
        matches!(self.kind, LifeKind::Rework | LifeKind::Return)
    }

    /// "rework on 2026-03-04: new output mirror".
    pub fn sentence(&self) -> String {
        format!("{} on {}: {}", self.kind.word(), self.date, self.note)
    }
}

impl Link for LifeEvent {
    const NEWEST: u32 = LIFE_VERSION;

    fn seq(&self) -> u64 {
        self.seq
    }

    fn version(&self) -> u32 {
        self.version
    }

    fn before(&self) -> &str {
        &self.before
    }
}
