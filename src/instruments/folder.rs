//! Captures from a folder of files stand for an interferometer: one file or one pair of files is one capture.
//! Must not parse samples: bytes are passed on as they are.
//! Main types: [`CaptureFolder`], [`FolderError`].

use std::cell::{Cell, RefCell};
use std::fs::{self, File};
use std::io::Read as _;
use std::path::{Path, PathBuf};
use std::rc::Rc;

use chrono::{DateTime, FixedOffset};

use super::nobody::NoInstrument;
use crate::capture::{natural_order, pair_names};
use crate::quantity::{Dimension, parse_as};
use crate::record::event::{Event, Happening};
use crate::station::{
    Bench, CaptureRequest, CaptureSource, CapturedBytes, Clock, LightRequest, Moment, Person, Trouble,
};

/// Time between captures that do not say when they were taken.
const NOMINAL_CADENCE_MS: u64 = 1000;
/// Our own lines stand within this many bytes of the start.
const HEAD_BYTES: u64 = 4096;
/// Endings of text exports.
const ENDINGS: &[&str] = &["csv", "txt", "tsv", "dat", "asc", "prn"];

/// Why a folder cannot stand for an interferometer.
#[derive(Debug, thiserror::Error)]
pub enum FolderError {
    /// It cannot be read.
    #[error("cannot read the captures `{}`: {error}", .path.display())]
    Io {
        /// Folder or file.
        path: PathBuf,
        /// What the system said.
        error: std::io::Error,
    },
    /// There is nothing in it.
    #[error("`{}` holds no capture; expected files that end in {}", .path.display(), ENDINGS.join(", "))]
    Empty {
        /// Folder.
        path: PathBuf,
    },
}

#[derive(Debug, Clone, PartialEq)]
struct Group {
    files: Vec<PathBuf>,
    at: Option<DateTime<FixedOffset>>,
}

/// A file that says of itself that it is a trace of the total light.
#[derive(Debug, Clone, PartialEq)]
struct LightFile {
    path: PathBuf,
    lit: bool,
    /// Samples a second.
    rate: f64,
    at: Option<DateTime<FixedOffset>>,
}

/// A sample rate is the wanted one within this factor.
const NEAR_RATE: f64 = 2.0;

/// The captures of a folder, in order.
#[derive(Debug, Clone, PartialEq)]
pub struct CaptureFolder {
    groups: Vec<Group>,
    /// Light traces, in the order of their names.
    lights: Vec<LightFile>,
    timed: bool,
}

impl CaptureFolder {
    /// Lists a folder, not what is below it.
    ///
    /// If every capture has a line `# captured_at = …`, that is their order and their time; else the natural order of
    /// their names is, one capture a second. Files named like `…CH1`, `…CH2` are one capture. A file with the lines
    /// `# light = lit` (or `dark`) and `# sample_rate = …` is a trace of the total light and no sweep.
    pub fn open(folder: &Path) -> Result<Self, FolderError> {
        let io = |path: &Path| {
            let path = path.to_owned();
            move |error| FolderError::Io { path, error }
        };
        let mut names = Vec::new();
        for entry in fs::read_dir(folder).map_err(io(folder))? {
            let path = entry.map_err(io(folder))?.path();
            let ending = path.extension().and_then(|e| e.to_str()).unwrap_or_default().to_ascii_lowercase();
            let name = path.file_name().and_then(|name| name.to_str()).unwrap_or_default();
            if ENDINGS.contains(&ending.as_str()) && !name.starts_with('.') && path.is_file() {
                names.push(name.to_owned());
            }
        }
        names.sort_by(|a, b| natural_order(a, b));
        let mut lights = Vec::new();
        let mut sweeps = Vec::new();
        for name in names {
            let path = folder.join(&name);
            match light_file(&path).map_err(io(&path))? {
                Some(light) => lights.push(light),
                None => sweeps.push(name),
            }
        }
        let names = sweeps;
        let mut groups = Vec::new();
        for group in pair_names(&names) {
            let files: Vec<PathBuf> = group.iter().map(|&index| folder.join(&names[index])).collect();
            let mut at = None;
            for file in &files {
                at = at.or(captured_at(file).map_err(io(file))?);
            }
            groups.push(Group { files, at });
        }
        if groups.is_empty() {
            return Err(FolderError::Empty { path: folder.to_owned() });
        }
        let timed = groups.iter().all(|group| group.at.is_some());
        if timed {
            groups.sort_by_key(|group| group.at);
        }
        Ok(Self { groups, lights, timed })
    }

    /// How many captures there are.
    pub fn len(&self) -> usize {
        self.groups.len()
    }

    /// Whether there are none; a folder that could be opened never is.
    pub fn is_empty(&self) -> bool {
        self.groups.is_empty()
    }

    /// When the first was taken, if every one says when.
    pub fn first_at(&self) -> Option<DateTime<FixedOffset>> {
        self.groups.first().filter(|_| self.timed)?.at
    }
}

/// The value that one of our own lines in a file's head gives.
fn head_value(text: &str, wanted: &str) -> Option<String> {
    let mut lines = text.lines().filter_map(|line| line.strip_prefix('#')?.split_once('='));
    lines.find(|(key, _)| key.trim() == wanted).map(|(_, value)| value.trim().to_owned())
}

fn head(path: &Path) -> std::io::Result<String> {
    let mut head = Vec::new();
    File::open(path)?.take(HEAD_BYTES).read_to_end(&mut head)?;
    Ok(String::from_utf8_lossy(&head).into_owned())
}

fn time_in(head: &str) -> Option<DateTime<FixedOffset>> {
    head_value(head, "captured_at").and_then(|text| DateTime::parse_from_rfc3339(&text).ok())
}

/// The time our own line in a file's head gives.
fn captured_at(path: &Path) -> std::io::Result<Option<DateTime<FixedOffset>>> {
    Ok(time_in(&head(path)?))
}

/// The file as a light trace, if its head says that it is one.
fn light_file(path: &Path) -> std::io::Result<Option<LightFile>> {
    let head = head(path)?;
    let lit = match head_value(&head, "light").as_deref() {
        Some("lit") => true,
        Some("dark") => false,
        _ => return Ok(None),
    };
    let rate = head_value(&head, "sample_rate").and_then(|text| parse_as(&text, Dimension::Frequency).ok());
    // Without a rate it is near no wanted one, and still no sweep.
    Ok(Some(LightFile { path: path.to_owned(), lit, rate: rate.unwrap_or(f64::NAN), at: time_in(&head) }))
}

/// Where the folder's own time and place are, shared by its clock and its captures.
#[derive(Debug, Default)]
struct Place {
    elapsed_ms: Cell<u64>,
    next: Cell<usize>,
    /// Light traces given: lit, samples a second.
    lights: RefCell<Vec<(bool, f64)>>,
}

struct FolderClock {
    started_at: DateTime<FixedOffset>,
    place: Rc<Place>,
}

impl Clock for FolderClock {
    fn now(&mut self) -> Moment {
        let elapsed_ms = self.place.elapsed_ms.get();
        let ahead = chrono::TimeDelta::milliseconds(i64::try_from(elapsed_ms).unwrap_or(i64::MAX));
        Moment { wall: self.started_at.checked_add_signed(ahead).unwrap_or(self.started_at), elapsed_ms }
    }

    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble> {
        self.place.elapsed_ms.set(self.place.elapsed_ms.get().max(elapsed_ms));
        Ok(())
    }

    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
        let last = events.last().map_or(0.0, |event| event.elapsed_s);
        // Stored to the millisecond; a float to integer cast saturates.
        self.place.elapsed_ms.set((last * 1000.0).round() as u64);
        let given = events.iter().filter(|event| match &event.what {
            Happening::Captured(_) => true,
            Happening::CaptureLost { for_good, .. } => !for_good,
            _ => false,
        });
        self.place.next.set(given.count());
        let lights = events.iter().filter_map(|event| match &event.what {
            Happening::Light(light) => Some((light.lit, light.finding.sample_rate)),
            _ => None,
        });
        self.place.lights.replace(lights.collect());
        Ok(())
    }
}

struct FolderSource {
    folder: CaptureFolder,
    started_at: DateTime<FixedOffset>,
    place: Rc<Place>,
}

impl FolderSource {
    /// When a capture was taken: by its own line, else one cadence after the last event, not before it was wanted.
    fn taken_ms(&self, group: &Group, not_before_ms: u64) -> u64 {
        match group.at.filter(|_| self.folder.timed) {
            Some(at) => u64::try_from((at - self.started_at).num_milliseconds()).unwrap_or(0),
            None if self.place.next.get() == 0 => not_before_ms,
            None => not_before_ms.max(self.place.elapsed_ms.get().saturating_add(NOMINAL_CADENCE_MS)),
        }
    }
}

impl CaptureSource for FolderSource {
    fn capture(&mut self, request: &CaptureRequest) -> Result<CapturedBytes, Trouble> {
        let index = self.place.next.get();
        let Some(group) = self.folder.groups.get(index) else {
            return Err(Trouble::NotHere("captures only: the folder holds no further capture".to_owned()));
        };
        let taken_ms = self.taken_ms(group, request.not_before_ms);
        self.place.next.set(index + 1);
        self.place.elapsed_ms.set(self.place.elapsed_ms.get().max(taken_ms));
        let mut files = Vec::with_capacity(group.files.len());
        for path in &group.files {
            let name = path.file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
            let bytes = fs::read(path)
                .map_err(|error| Trouble::Instrument(format!("cannot read `{}`: {error}", path.display())))?;
            files.push((name, bytes));
        }
        Ok(CapturedBytes { files, taken_ms })
    }

    fn light(&mut self, request: &LightRequest) -> Result<CapturedBytes, Trouble> {
        let near = |rate: f64| rate > request.sample_rate / NEAR_RATE && rate < request.sample_rate * NEAR_RATE;
        let given = self.place.lights.borrow().iter().filter(|(lit, rate)| *lit == request.lit && near(*rate)).count();
        let mut fit = self.folder.lights.iter().filter(|light| light.lit == request.lit && near(light.rate));
        let Some(light) = fit.nth(given) else {
            let lit = if request.lit { "lit" } else { "dark" };
            return Err(Trouble::NotHere(format!(
                "captures only: no file says `# light = {lit}` and `# sample_rate =` near {:.0} Hz",
                request.sample_rate
            )));
        };
        let name = light.path.file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
        let bytes = fs::read(&light.path)
            .map_err(|error| Trouble::Instrument(format!("cannot read `{}`: {error}", light.path.display())))?;
        self.place.lights.borrow_mut().push((light.lit, light.rate));
        let at = light.at.and_then(|at| u64::try_from((at - self.started_at).num_milliseconds()).ok());
        let taken_ms = at.unwrap_or(0).max(self.place.elapsed_ms.get());
        self.place.elapsed_ms.set(taken_ms);
        Ok(CapturedBytes { files: vec![(name, bytes)], taken_ms })
    }
}

/// A bench whose interferometer is a folder and that has no other instrument.
///
/// * `started_at`: when the run was opened: the first capture's own time, where it has one.
/// * `person`: who answers.
pub fn folder_bench(folder: CaptureFolder, started_at: DateTime<FixedOffset>, person: Box<dyn Person>) -> Bench {
    let place = Rc::new(Place::default());
    let none = |what: &str| Box::new(NoInstrument { reason: format!("captures only: {what}") });
    Bench {
        clock: Box::new(FolderClock { started_at, place: Rc::clone(&place) }),
        captures: Box::new(FolderSource { folder, started_at, place }),
        meters: none("no meter"),
        person,
        interlock: none("no supply"),
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn request(number: u64, not_before_ms: u64) -> CaptureRequest {
        CaptureRequest { step: "warm".into(), number, not_before_ms, samples: 2000, keep: false, trace: false }
    }

    fn bench(folder: &Path, started_at: &str) -> Bench {
        let nobody = super::super::Nobody::PassesOver("nobody".into());
        folder_bench(CaptureFolder::open(folder).unwrap(), started_at.parse().unwrap(), Box::new(nobody))
    }

    #[test]
    fn header_times_are_order_and_clock() {
        let folder = tempfile::tempdir().unwrap();
        for (name, second) in [("a.csv", 2), ("b.csv", 0), ("c.csv", 1)] {
            let text = format!("# captured_at = 2026-01-05T06:00:0{second}.500Z\n1,2\n");
            fs::write(folder.path().join(name), text).unwrap();
        }
        fs::write(folder.path().join("truth.json"), "{}").unwrap();
        let mut bench = bench(folder.path(), "2026-01-05T06:00:00.500Z");
        let mut taken = Vec::new();
        while let Ok(captured) = bench.captures.capture(&request(1, 0)) {
            taken.push((captured.files[0].0.clone(), captured.taken_ms));
        }
        assert_eq!(taken, [("b.csv".into(), 0), ("c.csv".into(), 1000), ("a.csv".into(), 2000)]);
        assert_eq!(bench.clock.now().wall.to_rfc3339(), "2026-01-05T06:00:02.500+00:00");
    }

    #[test]
    fn without_every_time_names_and_a_nominal_cadence_count() {
        let folder = tempfile::tempdir().unwrap();
        for name in ["F10CH1.CSV", "F10CH2.CSV", "F9CH1.CSV", "F9CH2.CSV"] {
            fs::write(folder.path().join(name), "1,2\n").unwrap();
        }
        let mut bench = bench(folder.path(), "2026-01-05T06:00:00Z");
        let first = bench.captures.capture(&request(1, 0)).unwrap();
        let second = bench.captures.capture(&request(2, 200)).unwrap();
        assert_eq!(first.files.iter().map(|f| f.0.as_str()).collect::<Vec<_>>(), ["F9CH1.CSV", "F9CH2.CSV"]);
        assert_eq!((first.taken_ms, second.taken_ms), (0, NOMINAL_CADENCE_MS));
        assert!(matches!(bench.captures.capture(&request(3, 0)), Err(Trouble::NotHere(_))));
    }

    #[test]
    fn an_empty_folder_is_refused() {
        let folder = tempfile::tempdir().unwrap();
        assert!(CaptureFolder::open(folder.path()).unwrap_err().to_string().contains("holds no capture"));
        assert!(CaptureFolder::open(&folder.path().join("absent")).is_err());
    }
}
