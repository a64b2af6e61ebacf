//! The rack: which tubes burn there since when, in one small file beside the records.
//! Must not keep a tube that was taken.
//! Main type: [`Rack`].

use std::{
    collections::BTreeMap,
    fs::{File, OpenOptions, TryLockError},
    io::{Error, ErrorKind},
    path::{Path, PathBuf},
    thread::sleep,
    time::{Duration, Instant},
};

use super::{
    DiskError,
    atomic::{create_folder, write_atomic},
};

/// Name of the file.
const FILE: &str = "rack.json";
/// Name of the small file that is locked while the rack changes; it stays.
const LOCK: &str = ".rack.lock";
/// How long another process may be at it. A change takes milliseconds; a slow network drive a second or two.
const PATIENCE: Duration = Duration::from_secs(10);

/// The tubes that burn in a rack.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Rack {
    path: PathBuf,
    tubes: BTreeMap<String, String>,
}

impl Rack {
    /// Reads the rack of a folder of records; empty where there is no file.
    pub fn read(reports: &Path) -> Result<Self, DiskError> {
        let path = reports.join(FILE);
        Ok(Self { tubes: read(&path)?, path })
    }

    /// (serial, since when it burns: RFC 3339), in the order of the serials.
    pub fn tubes(&self) -> impl Iterator<Item = (&str, &str)> {
        self.tubes.iter().map(|(serial, since)| (serial.as_str(), since.as_str()))
    }

    /// Since when a tube burns, if it is in the rack.
    pub fn since(&self, serial: &str) -> Option<&str> {
        self.tubes.get(serial).map(String::as_str)
    }

    /// Puts tubes in and takes tubes out, and stores the rack whole or not at all. What other processes changed since it was
    /// read stays changed.
    ///
    /// Errors: another process does not let go of it, or the disk says no.
    pub fn change(&mut self, put: &[(String, String)], take: &[String]) -> Result<(), DiskError> {
        if let Some(folder) = self.path.parent() {
            create_folder(folder)?;
        }
        let _lock = lock(&self.path)?;
        self.tubes = read(&self.path)?;
        self.tubes.extend(put.iter().cloned());
        self.tubes.retain(|serial, _| !take.contains(serial));
        let text = serde_json::to_vec_pretty(&self.tubes).map_err(|error| DiskError::Json(error.to_string()))?;
        write_atomic(&self.path, &text)
    }
}

fn read(path: &Path) -> Result<BTreeMap<String, String>, DiskError> {
    match std::fs::read(path) {
        Ok(bytes) => serde_json::from_slice(&bytes)
            .map_err(|error| DiskError::io("read", path)(Error::new(ErrorKind::InvalidData, error.to_string()))),
        Err(error) if error.kind() == ErrorKind::NotFound => Ok(BTreeMap::new()),
        Err(error) => Err(DiskError::io("read", path)(error)),
    }
}

/// Waits a short while until no other process changes the rack; dropping the file lets the next one in.
fn lock(rack: &Path) -> Result<File, DiskError> {
    let path = rack.with_file_name(LOCK);
    let mut options = OpenOptions::new();
    options.read(true).write(true).create(true).truncate(false);
    let file = options.open(&path).map_err(DiskError::io("open", &path))?;
    let began = Instant::now();
    loop {
        match file.try_lock() {
            Ok(()) => return Ok(file),
            Err(TryLockError::Error(error)) => return Err(DiskError::io("lock", &path)(error)),
            Err(TryLockError::WouldBlock) if began.elapsed() > PATIENCE => {
                return Err(DiskError::RackBusy { path: rack.to_owned(), seconds: PATIENCE.as_secs() });
            }
            Err(TryLockError::WouldBlock) => sleep(Duration::from_millis(5)),
        }
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn what_is_put_in_is_there_until_it_is_taken() {
        let folder = tempfile::tempdir().unwrap();
        let reports = folder.path().join("reports");
        let pair = |serial: &str| (serial.to_owned(), "2026-03-02T07:40:00+00:00".to_owned());
        Rack::read(&reports).unwrap().change(&[pair("a/b"), pair("c")], &[]).unwrap();
        let mut rack = Rack::read(&reports).unwrap();
        assert_eq!(rack.since("a/b"), Some("2026-03-02T07:40:00+00:00"));
        rack.change(&[], &["a/b".to_owned()]).unwrap();
        assert_eq!(Rack::read(&reports).unwrap().tubes().map(|(serial, _)| serial).collect::<Vec<_>>(), ["c"]);
        std::fs::write(reports.join(FILE), b"[]").unwrap();
        assert!(Rack::read(&reports).unwrap_err().to_string().contains("rack.json"));
    }

    #[test]
    fn twenty_who_add_at_once_lose_nothing() {
        let folder = tempfile::tempdir().unwrap();
        let reports = folder.path().join("reports");
        // All have read the empty rack before the first one changes it.
        let gate = std::sync::Barrier::new(20);
        std::thread::scope(|scope| {
            for n in 0..20 {
                let (reports, gate) = (&reports, &gate);
                scope.spawn(move || {
                    let mut rack = Rack::read(reports).unwrap();
                    gate.wait();
                    rack.change(&[(format!("T-{n:02}"), "2026-03-02T07:40:00+00:00".to_owned())], &[]).unwrap();
                });
            }
        });
        let there = Rack::read(&reports).unwrap();
        let wanted: Vec<String> = (0..20).map(|n| format!("T-{n:02}")).collect();
        assert_eq!(there.tubes().map(|(serial, _)| serial).collect::<Vec<_>>(), wanted);
    }
}
