//! Files and folders of runs: where they are, how they are written so that nothing is ever half there, how they are read back.
//! Must not decide anything about a tube.
//! Main types: [`Home`], [`Store`], [`RunFolder`], [`DiskError`].

mod atomic;
mod chain;
mod folder;
mod home;
mod lock;
mod name;
mod record;
mod store;

pub use atomic::write_atomic;
pub use chain::{ChainFault, read_chain};
pub use folder::{Frozen, RunFolder};
pub use home::{Home, TypeTexts, demo_bench, demo_checks};
pub use lock::SerialLock;
pub use name::{folder_name, is_folder_name};
pub use record::{RecordLine, read_record};
pub use store::{FoundRun, Store};

use std::path::{Path, PathBuf};

/// Why the disk did not do what it was asked. Reads after "failed to …: ".
#[derive(Debug, thiserror::Error)]
pub enum DiskError {
    /// The operating system said no.
    #[error("cannot {doing} `{}`: {error}{}", .path.display(), hint(.error))]
    Io {
        /// "create the folder", "write".
        doing: &'static str,
        /// Which file or folder.
        path: PathBuf,
        /// What the system said.
        error: std::io::Error,
    },
    /// Another process works on this serial.
    #[error("serial `{serial}` is already being inspected{by}; wait until that run ends, or stop it first")]
    Busy {
        /// The serial.
        serial: String,
        /// " by process 4242 since 2026-01-05T06:00:00Z", or empty.
        by: String,
    },
    /// The stored events do not fit together.
    #[error("`{}`: {fault}", .path.display())]
    Chain {
        /// The file.
        path: PathBuf,
        /// What does not fit.
        fault: ChainFault,
    },
    /// Something cannot be put into a line of JSON.
    #[error("cannot write an event as JSON: {0}")]
    Json(String),
}

/// What to do about the most frequent refusals of the system.
fn hint(error: &std::io::Error) -> &'static str {
    use std::io::ErrorKind;
    match error.kind() {
        ErrorKind::StorageFull | ErrorKind::QuotaExceeded | ErrorKind::FileTooLarge => {
            "; what was stored is whole: make room and give the same command again"
        }
        ErrorKind::NotADirectory | ErrorKind::AlreadyExists => {
            "; a part of this path is a plain file: name another folder with `--reports`"
        }
        ErrorKind::PermissionDenied | ErrorKind::ReadOnlyFilesystem => {
            "; name a folder that can be written with `--reports`"
        }
        _ => "",
    }
}

impl DiskError {
    /// Wraps an error of the system; made for `map_err`.
    fn io<'a>(doing: &'static str, path: &'a Path) -> impl FnOnce(std::io::Error) -> Self + 'a {
        move |error| Self::Io { doing, path: path.to_owned(), error }
    }
}
