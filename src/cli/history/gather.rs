//! The runs of a tube and what was noted about it, read from the folders.
//! Must not stop at a folder that cannot be read: it is named and left out.
//! Main types: [`Past`], [`Column`].

use std::path::PathBuf;

use crate::cli::Failure;
use crate::disk::{DiskError, FoundRun, Store, frozen_record, life_of};
use crate::driver::fold;
use crate::record::{event::Identity, life::LifeEvent};
use crate::report::{ReadRecord, budget_csv, csv_metadata, read_record, record_csv};
use crate::run::{Plan, Run};

/// Everything there is about a serial.
pub(super) struct Past {
    /// Its runs, in the order in which they were opened.
    pub columns: Vec<Column>,
    /// What was noted between them, in the order it was noted.
    pub life: Vec<LifeEvent>,
    /// What was left out: folder or file, and why.
    pub left_out: Vec<String>,
    /// Something that was stored is not as it was stored.
    pub changed: bool,
}

/// One run.
pub(super) struct Column {
    pub identity: Identity,
    /// Frozen; else folded from its events, as far as it went.
    pub frozen: bool,
    pub record: ReadRecord,
    pub folder: PathBuf,
}

impl Past {
    /// Reads all of it.
    ///
    /// A frozen record is read from its files, since they are what was signed, whatever this version would make of the events
    /// today; a run that is not frozen has no such files and is folded from its events.
    ///
    /// Errors: the folder of records itself cannot be read.
    pub fn of(store: &Store, serial: &str) -> Result<Self, Failure> {
        let (runs, faults) = store.survey(serial).map_err(|error| Failure::store(&error))?;
        let mut past = Self { columns: Vec::new(), life: Vec::new(), left_out: Vec::new(), changed: false };
        for fault in faults {
            past.leave_out(&fault);
        }
        for found in runs {
            match read(&found) {
                Ok(record) => past.columns.push(Column {
                    identity: found.opened.identity,
                    frozen: found.frozen,
                    record,
                    folder: found.path,
                }),
                Err(fault) => past.leave_out(&fault),
            }
        }
        match life_of(store.reports(), serial) {
            Ok(life) => past.life = life,
            Err(fault) => past.leave_out(&fault),
        }
        Ok(past)
    }

    fn leave_out(&mut self, fault: &DiskError) {
        self.changed |= matches!(fault, DiskError::Chain { .. } | DiskError::Record { .. });
        self.left_out.push(fault.to_string());
    }
}

fn read(found: &FoundRun) -> Result<ReadRecord, DiskError> {
    if found.frozen {
        return frozen_record(&found.path);
    }
    let wrong = |what: String| DiskError::Record { path: found.path.clone(), what };
    let plan = Plan::from_texts(&found.opened.recipe, &found.opened.limits, &found.opened.station)
        .map_err(|faults| wrong(format!("the stored plan cannot be used: {} faults", faults.len())))?;
    let mut run = Run::open(plan, found.opened.identity.clone());
    fold(&mut run, &Store::events_of(&found.path)?);
    let sheet = run.sheet();
    // By way of the files that it would be frozen to, so that all runs are read alike.
    read_record(&record_csv(&sheet), &budget_csv(&sheet), &csv_metadata(&sheet, "", "")).map_err(wrong)
}
