//! The life of a tube between its runs: `reports/life/<serial>.jsonl`, every line holding the hash of the line before.
//! Must not change or drop a line that is there: it only appends. Hold the serial's lock meanwhile.
//! Main functions: [`life_of`], [`add_to_life`].

use std::fs::OpenOptions;
use std::io::Write as _;
use std::path::{Path, PathBuf};

use super::{
    DiskError,
    atomic::{create_folder, sync_folder_of},
    chain::{Chain, read_links},
    name::folder_name,
};
use crate::record::life::{LIFE_VERSION, LifeEvent};

/// The file of a serial below the folder of records.
fn path_of(reports: &Path, serial: &str) -> PathBuf {
    reports.join("life").join(folder_name(serial) + ".jsonl")
}

/// What was noted about a tube, in the order it was noted.
///
/// Errors: the file cannot be read, or was changed.
pub fn life_of(reports: &Path, serial: &str) -> Result<Vec<LifeEvent>, DiskError> {
    Ok(chain_of(&path_of(reports, serial))?.events)
}

fn chain_of(path: &Path) -> Result<Chain<LifeEvent>, DiskError> {
    let bytes = match std::fs::read(path) {
        Ok(bytes) => bytes,
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => Vec::new(),
        Err(error) => return Err(DiskError::io("read", path)(error)),
    };
    read_links(&bytes).map_err(|fault| DiskError::Chain { path: path.to_owned(), fault })
}

/// Appends a line; on disk when it returns. A torn last line is cut off first.
///
/// * `event`: number, form and hash are filled in here.
///
/// Returns the file.
pub fn add_to_life(reports: &Path, event: LifeEvent) -> Result<PathBuf, DiskError> {
    let path = path_of(reports, &event.serial);
    let chain = chain_of(&path)?;
    let event =
        LifeEvent { seq: chain.events.len() as u64, version: LIFE_VERSION, before: chain.last.clone(), ..event };
    let mut line = serde_json::to_vec(&event).map_err(|error| DiskError::Json(error.to_string()))?;
    line.push(b'\n');
    create_folder(&reports.join("life"))?;
    let mut file = OpenOptions::new().create(true).append(true).open(&path).map_err(DiskError::io("open", &path))?;
    let written = file.set_len(chain.whole).and_then(|()| file.write_all(&line)).and_then(|()| file.sync_all());
    if let Err(error) = written {
        // Best effort: a torn line would be dropped by the reader all the same.
        let _ = file.set_len(chain.whole);
        return Err(DiskError::io("write", &path)(error));
    }
    sync_folder_of(&path)?;
    Ok(path)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::{super::name::sha256_hex, *};
    use crate::record::life::LifeKind;

    fn event(note: &str) -> LifeEvent {
        LifeEvent {
            seq: 9,
            noted_at: "2026-03-04T10:00:00+00:00".into(),
            version: 9,
            serial: "a/b".into(),
            kind: LifeKind::Rework,
            date: "2026-03-04".into(),
            note: note.into(),
            after: String::new(),
            before: "x".into(),
        }
    }

    #[test]
    fn lines_are_chained_appended_and_found_changed() {
        let folder = tempfile::tempdir().unwrap();
        assert!(life_of(folder.path(), "a/b").unwrap().is_empty());
        let path = add_to_life(folder.path(), event("one")).unwrap();
        let first = std::fs::read(&path).unwrap();
        // A line torn by a power cut is dropped, then overwritten by the next.
        std::fs::write(&path, [&first[..], b"{\"seq\":1,"].concat()).unwrap();
        add_to_life(folder.path(), event("two")).unwrap();
        let life = life_of(folder.path(), "a/b").unwrap();
        assert_eq!(life.iter().map(|event| event.note.as_str()).collect::<Vec<_>>(), ["one", "two"]);
        assert_eq!((life[1].seq, life[1].before.as_str()), (1, &*sha256_hex(&first[..first.len() - 1])));
        let text = std::fs::read_to_string(&path).unwrap();
        std::fs::write(&path, text.replacen("one", "0ne", 1)).unwrap();
        let error = life_of(folder.path(), "a/b").unwrap_err().to_string();
        assert!(error.contains("line 2 does not follow"), "{error}");
    }
}
