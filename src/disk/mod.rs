//! Files and folders of runs: where they are, how they are written so that nothing is ever half there, how they are read back.
//! Must not decide anything about a tube.
//! Main types: [`Home`], [`Store`], [`RunFolder`], [`DiskError`].

mod atomic;
mod chain;
mod folder;
mod home;
mod life;
mod lock;
mod name;
mod rack;
mod record;
mod store;

pub use atomic::write_atomic;
pub use chain::{ChainFault, read_chain};
pub use folder::{Frozen, RunFolder};
pub use home::{Home, TypeTexts, demo_bench, demo_checks};
pub use life::{add_to_life, life_of};
pub use lock::SerialLock;
pub use name::{folder_name, is_folder_name};
pub use rack::Rack;
pub use record::frozen_record;
pub use store::{FoundRun, Store};

use std::path::{Path, PathBuf};

/// Why the disk did not do what it was asked. Reads after "failed to …: ".
#[derive(Debug, thiserror::Error)]
pub enum DiskError {
    /// The operating system said no.
    #[error("cannot {doing} `{}`: {}{}", .path.display(), said(.error), hint(.error))]
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
    /// Another process holds the rack longer than a change takes.
    #[error("`{}` is held by another process for more than {seconds} s; nothing was changed: give the same command again", .path.display())]
    RackBusy {
        /// The rack's file.
        path: PathBuf,
        /// How long it was waited, s.
        seconds: u64,
    },
    /// The stored events do not fit together.
    #[error("`{}`: {fault}", .path.display())]
    Chain {
        /// The file.
        path: PathBuf,
        /// What does not fit.
        fault: ChainFault,
    },
    /// A frozen record is not as it was frozen.
    #[error("`{}`: {what}", .path.display())]
    Record {
        /// The run's folder.
        path: PathBuf,
        /// What does not fit.
        what: String,
    },
    /// A run folder without its first event: opening it was cut short, and nothing was measured.
    #[error("`{}`: no run was ever opened here (it holds no whole first event); it can be removed", .path.display())]
    Half {
        /// The folder.
        path: PathBuf,
    },
    /// Something cannot be put into a line of JSON.
    #[error("cannot write an event as JSON: {0}")]
    Json(String),
}

/// What the system said, as a fragment without its number.
pub fn said(error: &std::io::Error) -> String {
    use std::io::ErrorKind;
    let words = match error.kind() {
        ErrorKind::NotFound => "there is no such file or folder",
        ErrorKind::IsADirectory => "it is a folder",
        ErrorKind::NotADirectory => "it is not a folder",
        ErrorKind::AlreadyExists => "something of that name is in the way",
        ErrorKind::PermissionDenied => "it is not allowed here",
        ErrorKind::ReadOnlyFilesystem => "nothing can be written there",
        ErrorKind::StorageFull => "the disk is full",
        ErrorKind::InvalidData => "it is not plain text (UTF-8)",
        _ => {
            let text = error.to_string();
            return text.split(" (os error").next().unwrap_or_default().to_owned();
        }
    };
    words.to_owned()
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
