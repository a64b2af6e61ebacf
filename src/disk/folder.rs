//! The folder of one run: `events.jsonl`, `captures/`, and the four files of a frozen record.
//! Must not know what an event means.
//! Main types: [`RunFolder`], [`Frozen`].

use std::fs::{File, OpenOptions};
use std::io::Write as _;
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use super::{
    DiskError,
    atomic::{create_folder, sync_folder_of, write_atomic},
    chain::{line_of, read_chain},
    name::{folder_name, sha256_hex},
};
use crate::record::event::{Event, Happening};
use crate::station::{CapturedBytes, Durability, Journal, JournalError, Moment};

/// Name of the file of events.
pub(super) const EVENTS: &str = "events.jsonl";
/// Name of the file whose presence says that a record is frozen whole.
pub(super) const RECORD: &str = "record.csv";
/// Dwell captures share one fsync in this time.
const SYNC_EVERY: Duration = Duration::from_secs(1);

/// A run folder open for appending. Hold the serial's lock meanwhile.
#[derive(Debug)]
pub struct RunFolder {
    path: PathBuf,
    events: File,
    next: u64,
    last: String,
    whole: u64,
    synced: Instant,
}

/// The bytes of a frozen record.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Frozen {
    /// `record.csv`.
    pub record_csv: Vec<u8>,
    /// `budget.csv`.
    pub budget_csv: Vec<u8>,
    /// `record.csv-metadata.json`.
    pub metadata_json: Vec<u8>,
    /// `record.pdf`.
    pub record_pdf: Vec<u8>,
}

impl RunFolder {
    /// Makes the folder of a new run with its first event; what an earlier try left there without one is overwritten.
    ///
    /// * `path`: the run folder, not there yet or without a whole event.
    /// * `opened`: the first event, [`Happening::Opened`].
    pub fn create(path: &Path, at: Moment, opened: &Happening) -> Result<(Self, Event), DiskError> {
        create_folder(path)?;
        let file = path.join(EVENTS);
        let events = File::create(&file).map_err(DiskError::io("create", &file))?;
        let mut folder = Self::over(path, events, 0, sha256_hex(b""), 0);
        let event = folder.push(at, opened, Durability::Now)?;
        sync_folder_of(&file)?;
        Ok((folder, event))
    }

    /// Opens the folder of a run to go on with it; a torn last line is cut off.
    pub fn reopen(path: &Path) -> Result<(Self, Vec<Event>), DiskError> {
        let file = path.join(EVENTS);
        let bytes = std::fs::read(&file).map_err(DiskError::io("read", &file))?;
        let chain = read_chain(&bytes).map_err(|fault| DiskError::Chain { path: file.clone(), fault })?;
        let events = OpenOptions::new().append(true).open(&file).map_err(DiskError::io("open", &file))?;
        events.set_len(chain.whole).map_err(DiskError::io("cut the torn last line of", &file))?;
        let folder = Self::over(path, events, chain.events.len() as u64, chain.last, chain.whole);
        Ok((folder, chain.events))
    }

    fn over(path: &Path, events: File, next: u64, last: String, whole: u64) -> Self {
        Self { path: path.to_owned(), events, next, last, whole, synced: Instant::now() }
    }

    /// Where it is.
    pub fn path(&self) -> &Path {
        &self.path
    }

    fn push(&mut self, at: Moment, what: &Happening, durability: Durability) -> Result<Event, DiskError> {
        let file = self.path.join(EVENTS);
        let (event, line) = line_of(self.next, &self.last, at, what)?;
        if let Err(error) = self.write(&line, durability) {
            // Best effort: a torn line would be dropped by the reader all the same.
            let _ = self.events.set_len(self.whole);
            return Err(DiskError::io("write", &file)(error));
        }
        self.next += 1;
        self.last = sha256_hex(line.strip_suffix(b"\n").unwrap_or(&line));
        self.whole += line.len() as u64;
        Ok(event)
    }

    fn write(&mut self, line: &[u8], durability: Durability) -> std::io::Result<()> {
        self.events.write_all(line)?;
        if durability == Durability::Now || self.synced.elapsed() >= SYNC_EVERY {
            self.events.sync_data()?;
            self.synced = Instant::now();
        }
        Ok(())
    }

    /// Writes the four files of the record, each whole or not at all; `record.csv` last, so that its presence says that all are there.
    pub fn freeze(&mut self, frozen: &Frozen) -> Result<(), DiskError> {
        let file = self.path.join(EVENTS);
        self.events.sync_all().map_err(DiskError::io("sync", &file))?;
        write_atomic(&self.path.join("budget.csv"), &frozen.budget_csv)?;
        write_atomic(&self.path.join("record.csv-metadata.json"), &frozen.metadata_json)?;
        write_atomic(&self.path.join("record.pdf"), &frozen.record_pdf)?;
        write_atomic(&self.path.join(RECORD), &frozen.record_csv)
    }

    fn keep_files(&mut self, number: u64, captured: &CapturedBytes) -> Result<Vec<String>, DiskError> {
        let folder = self.path.join("captures");
        create_folder(&folder)?;
        let mut names = Vec::with_capacity(captured.files.len());
        for (name, bytes) in &captured.files {
            // Only the last part of a name says something here; it is tamed like a serial.
            let plain = Path::new(name).file_name().map_or_else(|| "capture".into(), |name| name.to_string_lossy());
            let name = format!("{number:06}-{}", folder_name(&plain));
            write_atomic(&folder.join(&name), bytes)?;
            names.push(name);
        }
        Ok(names)
    }
}

impl Journal for RunFolder {
    fn append(&mut self, at: Moment, what: &Happening, durability: Durability) -> Result<Event, JournalError> {
        self.push(at, what, durability).map_err(|error| JournalError(error.to_string()))
    }

    fn keep(&mut self, number: u64, captured: &CapturedBytes) -> Result<Vec<String>, JournalError> {
        self.keep_files(number, captured).map_err(|error| JournalError(error.to_string()))
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::record::event::{Identity, Opened};

    fn opened() -> Happening {
        Happening::Opened(Box::new(Opened {
            identity: Identity::default(),
            recipe: String::new(),
            limits: String::new(),
            station: String::new(),
        }))
    }

    fn at(elapsed_ms: u64) -> Moment {
        Moment { wall: "2026-01-05T06:00:00+00:00".parse().unwrap(), elapsed_ms }
    }

    #[test]
    fn goes_on_after_a_torn_line_as_if_it_had_never_been() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("2026/A/run");
        let (mut run, _) = RunFolder::create(&path, at(0), &opened()).unwrap();
        run.append(at(1), &Happening::Waited, Durability::Soon).unwrap();
        let whole = std::fs::read(path.join(EVENTS)).unwrap();
        std::fs::write(path.join(EVENTS), [&whole[..], b"{\"seq\":2,\"at\":\"20"].concat()).unwrap();
        let (mut run, events) = RunFolder::reopen(&path).unwrap();
        assert_eq!(events.len(), 2);
        run.append(at(2), &Happening::MadeSafe, Durability::Now).unwrap();
        let (_, events) = RunFolder::reopen(&path).unwrap();
        assert_eq!(events[2].what, Happening::MadeSafe);
    }

    #[test]
    fn kept_captures_stay_below_their_folder() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("run");
        let (mut run, _) = RunFolder::create(&path, at(0), &opened()).unwrap();
        let captured = CapturedBytes { files: vec![("../../x y.csv".into(), b"1".to_vec())], taken_ms: 0 };
        assert_eq!(run.keep(7, &captured).unwrap(), ["000007-x%20y.csv"]);
        assert_eq!(std::fs::read(path.join("captures/000007-x%20y.csv")).unwrap(), b"1");
    }
}
