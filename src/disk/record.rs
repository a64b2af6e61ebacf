//! A frozen record read back from its folder, after a look whether it is still the one that was frozen.
//! Must not fold events: what was frozen is shown as it was frozen, whatever this version would make of it today.
//! Main function: [`frozen_record`].

use std::path::Path;

use super::{DiskError, folder::RECORD, name::sha256_hex};
use crate::report::{ReadRecord, hashes_in, read_record};

/// Reads the frozen record of a run.
///
/// * `run`: the run's folder.
///
/// Errors: a file is missing, is not the one that was frozen (its hash is another than the metadata say), or cannot be read.
pub fn frozen_record(run: &Path) -> Result<ReadRecord, DiskError> {
    let read = |name: &str| {
        let path = run.join(name);
        std::fs::read(&path).map_err(DiskError::io("read", &path))
    };
    let (record, budget, metadata) = (read(RECORD)?, read("budget.csv")?, read("record.csv-metadata.json")?);
    let wrong = |what: String| DiskError::Record { path: run.to_owned(), what };
    for ((name, bytes), frozen) in [(RECORD, &record), ("budget.csv", &budget)].into_iter().zip(hashes_in(&metadata)) {
        if frozen.is_some_and(|hash| hash != sha256_hex(bytes)) {
            return Err(wrong(format!("{name} was changed after it was frozen: its SHA-256 is another")));
        }
    }
    read_record(&record, &budget, &metadata).map_err(wrong)
}
