//! Lines of a chained file (`events.jsonl`, the life of a tube) ↔ what they hold: every line holds the hash of the line before.
//! Must not touch the disk: bytes in, events out.
//! Main functions: [`read_chain`], [`read_links`], [`line_of`].

use crate::record::event::{EVENT_VERSION, Event, Happening};
use crate::record::link::Link;
use crate::station::Moment;

use super::{DiskError, name::sha256_hex};

/// What does not fit in the stored events. Lines count from 1.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ChainFault {
    /// A line that is no event.
    #[error("line {line} is not an event: {reason}; the file was changed or the disk is damaged")]
    NotAnEvent {
        /// Which.
        line: usize,
        /// What the reader of JSON said.
        reason: String,
    },
    /// A line of a newer program.
    #[error("line {line} has form {found}; this program reads forms up to {EVENT_VERSION}: use a newer one")]
    Newer {
        /// Which.
        line: usize,
        /// Its form.
        found: u64,
    },
    /// A line does not follow from the one before.
    #[error("line {line} does not follow from the line before it: {what}; a line was changed, added or removed")]
    Broken {
        /// Which.
        line: usize,
        /// The hash or the number.
        what: &'static str,
    },
    /// The first line is no `opened`.
    #[error("line 1 is not the opening of a run")]
    NotOpened,
}

/// The lines of a chained file, and what is needed to go on.
#[derive(Debug, Clone, PartialEq)]
pub struct Chain<T = Event> {
    /// What the lines hold, in order.
    pub events: Vec<T>,
    /// Length of the whole lines, bytes: a torn line begins here.
    pub whole: u64,
    /// Hash of the last whole line.
    pub last: String,
}

/// Reads the stored events of a run: as [`read_links`], and the first line must be the opening.
pub fn read_chain(bytes: &[u8]) -> Result<Chain, ChainFault> {
    let chain = read_links::<Event>(bytes)?;
    match chain.events.first() {
        Some(event) if !matches!(event.what, Happening::Opened(_)) => Err(ChainFault::NotOpened),
        _ => Ok(chain),
    }
}

/// Reads a chained file.
///
/// A last line without its line end is torn: it was never acknowledged and is dropped. Everything before it must fit, else the error names the line.
pub fn read_links<T: Link>(bytes: &[u8]) -> Result<Chain<T>, ChainFault> {
    let mut chain = Chain { events: Vec::new(), whole: 0, last: sha256_hex(b"") };
    for (index, line) in bytes.split_inclusive(|&b| b == b'\n').enumerate() {
        let Some(text) = line.strip_suffix(b"\n") else { break };
        let event: T = read_line(text, index + 1)?;
        if event.seq() != index as u64 {
            return Err(ChainFault::Broken { line: index + 1, what: "its number is not the next one" });
        }
        if event.before() != chain.last {
            return Err(ChainFault::Broken { line: index + 1, what: "the hash is another" });
        }
        chain.events.push(event);
        chain.whole += line.len() as u64;
        chain.last = sha256_hex(text);
    }
    Ok(chain)
}

fn read_line<T: Link>(text: &[u8], line: usize) -> Result<T, ChainFault> {
    let event: Result<T, _> = serde_json::from_slice(text);
    match event {
        Ok(event) if event.version() <= T::NEWEST => Ok(event),
        Ok(event) => Err(ChainFault::Newer { line, found: u64::from(event.version()) }),
        Err(error) => {
            // A newer form may not be readable at all: its version says so better than a missing field.
            let version = serde_json::from_slice::<serde_json::Value>(text)
                .ok()
                .and_then(|value| value.get("version").and_then(serde_json::Value::as_u64));
            match version {
                Some(found) if found > u64::from(T::NEWEST) => Err(ChainFault::Newer { line, found }),
                _ => Err(ChainFault::NotAnEvent { line, reason: error.to_string() }),
            }
        }
    }
}

/// The next event after `before`, and its line with the line end.
///
/// Wall time has milliseconds, elapsed time too.
pub fn line_of(seq: u64, before: &str, at: Moment, what: &Happening) -> Result<(Event, Vec<u8>), DiskError> {
    let event = Event {
        seq,
        at: at.wall.to_rfc3339_opts(chrono::SecondsFormat::Millis, false),
        elapsed_s: at.elapsed_ms as f64 / 1000.0,
        version: EVENT_VERSION,
        what: what.clone(),
        before: before.to_owned(),
    };
    let mut line = serde_json::to_vec(&event).map_err(|error| DiskError::Json(error.to_string()))?;
    line.push(b'\n');
    Ok((event, line))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::record::event::{Identity, Opened};

    fn file() -> Vec<u8> {
        let at = Moment { wall: "2026-01-05T06:00:00+00:00".parse().unwrap(), elapsed_ms: 1500 };
        let opened =
            Opened { identity: Identity::default(), recipe: "r".into(), limits: "l\n".into(), station: "s".into() };
        let mut bytes = Vec::new();
        let mut before = sha256_hex(b"");
        for (seq, what) in
            [Happening::Opened(Box::new(opened)), Happening::Waited, Happening::Stopped { reason: "power cut".into() }]
                .iter()
                .enumerate()
        {
            let (_, line) = line_of(seq as u64, &before, at, what).unwrap();
            before = sha256_hex(&line[..line.len() - 1]);
            bytes.extend(line);
        }
        bytes
    }

    #[test]
    fn every_prefix_of_bytes_reads_as_its_whole_lines() {
        let bytes = file();
        for end in 0..=bytes.len() {
            let chain = read_chain(&bytes[..end]).unwrap();
            let lines = bytes[..end].iter().filter(|&&b| b == b'\n').count();
            assert_eq!(chain.events.len(), lines);
            assert!(chain.whole <= end as u64);
        }
    }

    #[test]
    fn a_changed_removed_or_newer_line_is_named() {
        let text = String::from_utf8(file()).unwrap();
        let changed = text.replace("waited", "made_safe");
        assert!(matches!(read_chain(changed.as_bytes()), Err(ChainFault::Broken { line: 3, .. })));
        let lines: Vec<&str> = text.lines().collect();
        let removed = format!("{}\n{}\n", lines[0], lines[2]);
        assert!(matches!(read_chain(removed.as_bytes()), Err(ChainFault::Broken { line: 2, .. })));
        let newer = text.replace("\"version\":1", "\"version\":9");
        assert_eq!(read_chain(newer.as_bytes()), Err(ChainFault::Newer { line: 1, found: 9 }));
        let garbage = format!("{}\nnot json\n", lines[0]);
        assert!(matches!(read_chain(garbage.as_bytes()), Err(ChainFault::NotAnEvent { line: 2, .. })));
    }
}
