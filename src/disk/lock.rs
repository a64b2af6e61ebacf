//! One run of a serial at a time, over all processes of a store.
//! Must not outlive its process: the system drops the lock when the process ends, however it ends.
//! Main type: [`SerialLock`].

use std::fs::{self, File, OpenOptions, TryLockError};
use std::io::Write as _;
use std::path::Path;

use super::{DiskError, atomic::create_folder, name::folder_name};

/// Holds a serial until dropped. The small file below `.locks/` stays: removing it could let two processes in.
#[derive(Debug)]
pub struct SerialLock {
    _file: File,
}

impl SerialLock {
    /// Takes the serial, or says who has it.
    ///
    /// * `reports`: the folder of records; made if it is not there.
    /// * `serial`: as scanned.
    /// * `since`: time of day for the sentence another process may show.
    pub fn take(reports: &Path, serial: &str, since: &str) -> Result<Self, DiskError> {
        let folder = reports.join(".locks");
        create_folder(&folder)?;
        let path = folder.join(folder_name(serial) + ".lock");
        let mut file = OpenOptions::new()
            .read(true)
            .write(true)
            .create(true)
            .truncate(false)
            .open(&path)
            .map_err(DiskError::io("open", &path))?;
        match file.try_lock() {
            Ok(()) => {}
            Err(TryLockError::WouldBlock) => {
                let holder = fs::read_to_string(&path).unwrap_or_default();
                let by = if holder.trim().is_empty() { String::new() } else { format!(" by {}", holder.trim()) };
                return Err(DiskError::Busy { serial: serial.to_owned(), by });
            }
            Err(TryLockError::Error(error)) => return Err(DiskError::io("lock", &path)(error)),
        }
        file.set_len(0)
            .and_then(|()| writeln!(file, "process {} since {since}", std::process::id()))
            .map_err(DiskError::io("write", &path))?;
        Ok(Self { _file: file })
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn a_second_taker_is_told_who_has_it() {
        let folder = tempfile::tempdir().unwrap();
        let first = SerialLock::take(folder.path(), "a/b", "06:00").unwrap();
        let error = SerialLock::take(folder.path(), "a/b", "06:01").unwrap_err().to_string();
        assert!(error.contains("`a/b` is already being inspected by process") && error.contains("06:00"), "{error}");
        SerialLock::take(folder.path(), "other", "06:01").unwrap();
        drop(first);
        SerialLock::take(folder.path(), "a/b", "06:02").unwrap();
    }
}
