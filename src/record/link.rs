//! A line of a file whose every line holds the hash of the line before.
//! Must not read or write such a file: `disk` does.
//! Main type: [`Link`].

use serde::{Serialize, de::DeserializeOwned};

use super::event::{EVENT_VERSION, Event};

/// One line of a chained file, with what the chain is checked by.
pub trait Link: Serialize + DeserializeOwned {
    /// Newest form that this program reads.
    const NEWEST: u32;

    /// Number in the file, from 0, without gaps.
    fn seq(&self) -> u64;

    /// Form of the line.
    fn version(&self) -> u32;

    /// SHA-256 of the line before, hexadecimal; of the empty text for the first.
    fn before(&self) -> &str;
}

impl Link for Event {
    const NEWEST: u32 = EVENT_VERSION;

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
