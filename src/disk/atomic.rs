//! A file is written whole or not at all: temporary name, fsync, rename, fsync of the folder.
//! Must not leave a temporary file behind after an error.
//! Main function: [`write_atomic`].

use std::fs::{self, File};
use std::io::Write as _;
use std::path::Path;

use super::DiskError;

/// Writes bytes under a name so that, after a kill or a power cut at any instant, the name holds the old bytes or the new ones.
///
/// * `path`: the final name; its folder must exist.
/// * `bytes`: all of the file.
///
/// Errors name the file; nothing is left behind then.
pub fn write_atomic(path: &Path, bytes: &[u8]) -> Result<(), DiskError> {
    let mut temporary = path.as_os_str().to_owned();
    temporary.push(".part");
    let temporary = Path::new(&temporary);
    let written = write_synced(temporary, bytes)
        .and_then(|()| fs::rename(temporary, path))
        .map_err(DiskError::io("write", path))
        .and_then(|()| sync_folder_of(path));
    if written.is_err() {
        // It may never have come to be; what matters is the first error.
        let _ = fs::remove_file(temporary);
    }
    written
}

fn write_synced(path: &Path, bytes: &[u8]) -> std::io::Result<()> {
    let mut file = File::create(path)?;
    file.write_all(bytes)?;
    file.sync_all()
}

/// Makes a new or renamed entry of a folder durable.
pub(super) fn sync_folder_of(path: &Path) -> Result<(), DiskError> {
    let Some(folder) = path.parent() else { return Ok(()) };
    let folder = if folder.as_os_str().is_empty() { Path::new(".") } else { folder };
    // Only Unix can open a folder; elsewhere the rename itself is as durable as it gets.
    if cfg!(unix) {
        File::open(folder).and_then(|file| file.sync_all()).map_err(DiskError::io("sync the folder", folder))?;
    }
    Ok(())
}

/// Creates a folder with its parents, and makes them durable.
pub(super) fn create_folder(path: &Path) -> Result<(), DiskError> {
    if path.is_dir() {
        return Ok(());
    }
    if let Some(parent) = path.parent().filter(|parent| !parent.as_os_str().is_empty()) {
        create_folder(parent)?;
    }
    match fs::create_dir(path) {
        Err(error) if error.kind() == std::io::ErrorKind::AlreadyExists && path.is_dir() => Ok(()),
        Err(error) => Err(DiskError::io("create the folder", path)(error)),
        Ok(()) => sync_folder_of(path),
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn replaces_whole_and_leaves_nothing_beside() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("record.csv");
        write_atomic(&path, b"one").unwrap();
        write_atomic(&path, b"two").unwrap();
        assert_eq!(fs::read(&path).unwrap(), b"two");
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 1);
    }

    #[test]
    fn an_error_names_the_file_and_leaves_nothing() {
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join("plain"), b"").unwrap();
        let error = create_folder(&folder.path().join("plain/below/it")).unwrap_err().to_string();
        assert!(error.contains("plain") && error.contains("--reports"), "{error}");
        fs::create_dir(folder.path().join("taken")).unwrap();
        assert!(write_atomic(&folder.path().join("taken"), b"x").is_err());
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 2);
    }
}
