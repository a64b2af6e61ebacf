//! The world as a run's driver sees it: a clock, a capture source, meters, a person, an interlock.
//! Must not do I/O: `instruments` implements these.
//! Main types: [`Bench`], [`Moment`].

use chrono::{DateTime, FixedOffset};

use super::want::{CaptureRequest, LightRequest, ReadingRequest};
use crate::record::{
    event::Event,
    question::{Answer, Question},
};

/// One moment on both clocks.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Moment {
    /// Wall time in the station's zone.
    pub wall: DateTime<FixedOffset>,
    /// Monotonic milliseconds since the run was opened.
    pub elapsed_ms: u64,
}

/// Why the world did not give what was asked.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Trouble {
    /// This bench has no such thing, and never will in this run.
    #[error("{0}")]
    NotHere(String),
    /// An instrument failed.
    #[error("{0}")]
    Instrument(String),
    /// A person's answer is missing; the sheet stays open. Names the key of the answer file.
    #[error("{0}")]
    NoAnswer(String),
    /// A person stopped the run, with the reason.
    #[error("stopped: {0}")]
    Stopped(String),
}

/// Tells time and lets it pass.
pub trait Clock {
    /// Now.
    fn now(&mut self) -> Moment;
    /// Returns when the monotonic clock has reached a time.
    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble>;
    /// Takes up a run again whose last event is given: the monotonic clock goes on from there.
    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble>;

    /// By how many seconds the clock on the wall was set since this was asked last, below zero for back; none if it was not.
    fn was_set(&mut self) -> Option<f64> {
        None
    }
}

/// The bytes of one capture as they came: one file or several, with their names.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct CapturedBytes {
    /// (name, bytes).
    pub files: Vec<(String, Vec<u8>)>,
    /// When it was taken on the monotonic clock.
    pub taken_ms: u64,
}

/// Gives captures.
pub trait CaptureSource {
    /// Takes one capture, not before the wanted time.
    fn capture(&mut self, request: &CaptureRequest) -> Result<CapturedBytes, Trouble>;

    /// Takes one trace of the total light. A source without a light detector says so.
    fn light(&mut self, _request: &LightRequest) -> Result<CapturedBytes, Trouble> {
        Err(Trouble::NotHere("there is no light detector".to_owned()))
    }
}

/// Reads meters.
pub trait Meters {
    /// SI value as read, before any correction.
    fn read(&mut self, request: &ReadingRequest) -> Result<f64, Trouble>;
}

/// Answers questions.
pub trait Person {
    /// Initials for the record.
    fn initials(&self) -> String;
    /// Answers one question.
    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble>;
}

/// Takes the high voltage away.
pub trait Interlock {
    /// High voltage off; returns when it is.
    fn make_safe(&mut self) -> Result<(), Trouble>;

    /// Looked at before each thing that is done: whether somebody pressed the key that stops the run.
    ///
    /// Errors: [`Trouble::Stopped`] with the reason.
    fn stop_key(&mut self) -> Result<(), Trouble> {
        Ok(())
    }
}

/// A bench: everything a run needs of the world.
pub struct Bench {
    /// Clock.
    pub clock: Box<dyn Clock>,
    /// Interferometer and digitizer.
    pub captures: Box<dyn CaptureSource>,
    /// Meters.
    pub meters: Box<dyn Meters>,
    /// Technician.
    pub person: Box<dyn Person>,
    /// Interlock.
    pub interlock: Box<dyn Interlock>,
}
