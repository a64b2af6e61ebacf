//! The instruments behind the traits of `station`: a folder of captures, a person at the terminal, answers from a file, clocks.
//! Must not decide anything about a tube.
//! Main types: [`CaptureFolder`], [`TerminalPerson`], [`WallClock`].

mod folder;
mod nobody;
mod terminal;
mod typed;
mod wall;

pub use folder::{CaptureFolder, FolderError, folder_bench};
pub use nobody::{NoInstrument, Nobody};
pub use terminal::TerminalPerson;
pub use typed::{expected, parse_answer};
pub use wall::WallClock;
