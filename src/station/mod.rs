//! What a run needs of the world, as traits, and the station file that names the instruments.
//! Must not touch an instrument itself.
//! Main types: [`Bench`], [`Want`].

pub mod answers;
mod bench;
pub mod file;
mod journal;
pub mod shift;
pub mod standing;
pub mod stored;
mod want;

pub use bench::{Bench, CaptureSource, CapturedBytes, Clock, Interlock, Meters, Moment, Person, Trouble};
pub use journal::{Durability, Journal, JournalError};
pub use want::{CaptureRequest, LightRequest, ReadingKind, ReadingRequest, Want};
