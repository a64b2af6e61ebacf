//! The instruments behind the traits of `station`: the simulated bench, a folder of captures, a person at the terminal, answers from
//! a file, the clock on the wall.
//! Must not decide anything about a tube.
//! Main types: [`SimulatedBench`], [`SimulatedOptions`], [`CaptureFolder`], [`TerminalPerson`], [`FilePerson`], [`WallClock`].

mod answers;
mod folder;
mod nobody;
mod simulated;
mod terminal;
mod typed;
mod wall;

pub use answers::FilePerson;
pub use folder::{CaptureFolder, FolderError, folder_bench};
pub use nobody::{NoInstrument, Nobody};
pub use simulated::{
    CaptureHead, SIMULATED_INITIALS, SimulatedBench, SimulatedOptions, simulated_capture_name, simulated_csv,
    simulated_light_csv,
};
pub use terminal::{Charset, Colour, HandInterlock, Line, Look, Role, Screen, TerminalPerson, caution_lines};
pub use typed::{expected, parse_answer, said};
pub use wall::{TimeSource, WallClock, Zoned};
