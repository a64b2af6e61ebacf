//! The folder of records: `<year>/<serial>/<run>`; finds the runs of a serial.
//! Must not write: [`super::RunFolder`] does.
//! Main types: [`Store`], [`FoundRun`].

use std::path::{Path, PathBuf};

use super::{
    DiskError,
    chain::read_chain,
    folder::{EVENTS, RECORD},
    name::folder_name,
};
use crate::record::event::{Event, Happening, Opened};

/// A folder of records.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Store {
    reports: PathBuf,
}

/// A run of a serial, found by its first event.
#[derive(Debug, Clone, PartialEq)]
pub struct FoundRun {
    /// Its folder.
    pub path: PathBuf,
    /// How it was opened.
    pub opened: Opened,
    /// Its record is there whole.
    pub frozen: bool,
}

impl Store {
    /// Over a folder of records, which need not be there yet.
    pub fn new(reports: impl Into<PathBuf>) -> Self {
        Self { reports: reports.into() }
    }

    /// The folder of records.
    pub fn reports(&self) -> &Path {
        &self.reports
    }

    /// Where a run is or will be.
    ///
    /// * `year`: of its start in the station's zone.
    pub fn run_path(&self, year: i32, serial: &str, run_id: &str) -> PathBuf {
        self.reports.join(year.to_string()).join(folder_name(serial)).join(folder_name(run_id))
    }

    /// The runs of a serial that hold a first event, in the order of their ids, which is the order in which they were opened.
    ///
    /// Errors: a folder that is there cannot be read, or a first line is no opening.
    pub fn runs_of(&self, serial: &str) -> Result<Vec<FoundRun>, DiskError> {
        let (runs, faults) = self.survey(serial)?;
        // A folder without its first event was never opened; what cannot be read must not be passed over.
        faults.into_iter().find(|fault| !matches!(fault, DiskError::Half { .. })).map_or(Ok(runs), Err)
    }

    /// As [`Store::runs_of`], with what is wrong with each folder that cannot be read instead of stopping at it.
    ///
    /// Errors: the folder of records, or that of the serial, cannot be read.
    pub fn survey(&self, serial: &str) -> Result<(Vec<FoundRun>, Vec<DiskError>), DiskError> {
        let (mut runs, mut faults) = (Vec::new(), Vec::new());
        for year in names_in(&self.reports)? {
            if !year.bytes().all(|b| b.is_ascii_digit()) {
                continue;
            }
            let folder = self.reports.join(year).join(folder_name(serial));
            for run in names_in(&folder)? {
                let path = folder.join(run);
                match first_event(&path) {
                    Ok(Some(opened)) => {
                        let frozen = path.join(RECORD).is_file();
                        runs.push(FoundRun { path, opened, frozen });
                    }
                    Ok(None) => faults.push(DiskError::Half { path }),
                    Err(fault) => faults.push(fault),
                }
            }
        }
        // Version 7: the id begins with the time, then the number among the runs of that millisecond.
        runs.sort_by(|a, b| a.opened.identity.run_id.cmp(&b.opened.identity.run_id));
        Ok((runs, faults))
    }

    /// Every run opened at or after a moment, in the order in which they were opened. Looks at the names of all runs, and
    /// reads only those.
    ///
    /// * `from_ms`: milliseconds of the Unix epoch.
    pub fn runs_from(&self, from_ms: i64) -> Result<Vec<FoundRun>, DiskError> {
        let mut runs = Vec::new();
        for year in names_in(&self.reports)?.into_iter().filter(|year| year.bytes().all(|b| b.is_ascii_digit())) {
            let year = self.reports.join(year);
            for serial in names_in(&year)? {
                let folder = year.join(serial);
                for run in names_in(&folder)?.into_iter().filter(|run| opened_ms(run).is_some_and(|ms| ms >= from_ms)) {
                    let path = folder.join(run);
                    if let Some(opened) = first_event(&path)? {
                        let frozen = path.join(RECORD).is_file();
                        runs.push(FoundRun { path, opened, frozen });
                    }
                }
            }
        }
        runs.sort_by(|a, b| a.opened.identity.run_id.cmp(&b.opened.identity.run_id));
        Ok(runs)
    }

    /// Every event of a run.
    pub fn events_of(path: &Path) -> Result<Vec<Event>, DiskError> {
        let file = path.join(EVENTS);
        let bytes = std::fs::read(&file).map_err(DiskError::io("read", &file))?;
        Ok(read_chain(&bytes).map_err(|fault| DiskError::Chain { path: file, fault })?.events)
    }
}

/// When a run was opened, ms of the Unix epoch: the first 48 bits of its id (UUID version 7, RFC 9562, 5.7).
fn opened_ms(run_id: &str) -> Option<i64> {
    let digits: String = run_id.chars().filter(|c| *c != '-').take(12).collect();
    i64::from_str_radix(&digits, 16).ok().filter(|_| digits.len() == 12)
}

/// Names in a folder; none if it is not there.
fn names_in(folder: &Path) -> Result<Vec<String>, DiskError> {
    let entries = match std::fs::read_dir(folder) {
        Ok(entries) => entries,
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => return Ok(Vec::new()),
        Err(error) => return Err(DiskError::io("read the folder", folder)(error)),
    };
    let mut names = Vec::new();
    for entry in entries {
        let entry = entry.map_err(DiskError::io("read the folder", folder))?;
        // A name that is not UTF-8 was not made here.
        if let (Ok(name), true) = (entry.file_name().into_string(), entry.path().is_dir()) {
            names.push(name);
        }
    }
    names.sort();
    Ok(names)
}

/// The opening of a run; none where the folder holds no whole line.
fn first_event(run: &Path) -> Result<Option<Opened>, DiskError> {
    use std::io::{BufRead as _, BufReader};
    let path = run.join(EVENTS);
    let file = match std::fs::File::open(&path) {
        Ok(file) => file,
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => return Ok(None),
        Err(error) => return Err(DiskError::io("read", &path)(error)),
    };
    let mut line = Vec::new();
    BufReader::new(file).read_until(b'\n', &mut line).map_err(DiskError::io("read", &path))?;
    let chain = read_chain(&line).map_err(|fault| DiskError::Chain { path, fault })?;
    Ok(chain.events.into_iter().next().and_then(|event| match event.what {
        Happening::Opened(opened) => Some(*opened),
        _ => None,
    }))
}
