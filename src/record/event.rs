//! What happened in a run, one line each in `events.jsonl`.
//! Must not mix facts (what came from outside) with findings (derived, with the engine's version): they are marked apart.
//! Main types: [`Event`], [`Happening`].

use serde::{Deserialize, Serialize};

use super::{
    finding::CaptureFinding,
    light::LightCaptured,
    question::{Answer, Question},
    reference::ReferenceCheck,
};
use crate::phrase::Language;

/// Version of the form of an event line. A newer one is refused, an older one stays readable.
pub const EVENT_VERSION: u32 = 1;

/// One line of `events.jsonl`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Event {
    /// Number in the run, from 0, without gaps.
    pub seq: u64,
    /// Wall time, RFC 3339 with offset, to the millisecond.
    pub at: String,
    /// Monotonic time since the run was opened, s, to the millisecond.
    pub elapsed_s: f64,
    /// Form of the line.
    pub version: u32,
    /// What happened.
    pub what: Happening,
    /// SHA-256 of the line before, hexadecimal; of the empty text for the first.
    pub before: String,
}

/// What happened.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", tag = "kind")]
pub enum Happening {
    /// The sheet was opened. Always the first event.
    Opened(Box<Opened>),
    /// A question was put; stored before high voltage may be switched on.
    Asked {
        /// The question.
        question: Question,
    },
    /// It was answered.
    Answered {
        /// Step that asked.
        step: String,
        /// The question's word.
        word: String,
        /// The answer.
        answer: Answer,
        /// Initials of who answered, `simulated` for the bench's own technician.
        by: String,
    },
    /// A capture came.
    Captured(Box<Captured>),
    /// A fast trace of the total light came.
    Light(Box<LightCaptured>),
    /// A capture or a light trace could not be had or not be read.
    CaptureLost {
        /// Step that wanted it.
        step: String,
        /// Its number in the run.
        number: u64,
        /// Why, in words.
        reason: String,
        /// There will be none: the source is at its end or cannot give it.
        for_good: bool,
    },
    /// A meter was read.
    Reading {
        /// Step that wanted it.
        step: String,
        /// What was read: key of [`crate::station::ReadingRequest`].
        what: String,
        /// SI value as read, before any correction; none if the meter could not.
        value: Option<f64>,
        /// Why there is none.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        reason: Option<String>,
    },
    /// A wait is over.
    Waited,
    /// High voltage is off.
    MadeSafe,
    /// Nobody stood at the switch: whether high voltage is off is not known.
    NotMadeSafe {
        /// Why, in words.
        reason: String,
    },
    /// The clock on the wall was set, or the machine slept; wall times of the run go on from before.
    ClockSet {
        /// By how much, s; below zero: back.
        by_s: f64,
    },
    /// Opened again after an interruption.
    Resumed,
    /// Stopped by a person, with the reason.
    Stopped {
        /// In words.
        reason: String,
    },
}

/// The plan and the identity, frozen by value: a run folder needs nothing else to be read or judged again.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Opened {
    /// Who and what.
    pub identity: Identity,
    /// Text of `recipe.toml`.
    pub recipe: String,
    /// Text of `limits.toml`.
    pub limits: String,
    /// Text of `station.toml`.
    pub station: String,
}

/// Who and what a run is about.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct Identity {
    /// UUID version 7.
    pub run_id: String,
    /// Serial number as scanned.
    pub serial: String,
    /// Type: name of a folder below `limits/`.
    pub tube_type: String,
    /// Supplier, or empty.
    pub supplier: String,
    /// Lot, or empty.
    pub lot: String,
    /// Condition of the item, or empty.
    pub condition: String,
    /// Date of receipt, or empty.
    pub received: String,
    /// Initials of the technician, or empty.
    pub technician: String,
    /// RFC 3339 with offset, to the millisecond.
    pub started_at: String,
    /// IANA time zone of the station.
    pub time_zone: String,
    /// Every capture and reading comes from a simulated bench.
    pub simulated: bool,
    /// Captures come from a folder of files, not from instruments.
    pub from_captures: bool,
    /// The captures carry no time: they stand in their order, and what counts in time cannot be measured.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub times_assumed: bool,
    /// Version of the program that opened it.
    pub program_version: String,
    /// What the run is for.
    #[serde(default, skip_serializing_if = "RunKind::is_product")]
    pub run_kind: RunKind,
    /// The earlier run that it repeats, and why; none for a first run.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub repeats: Option<Repeat>,
    /// The tube was burning already, since then, RFC 3339 with offset (a rack warmed it); none if it is struck here.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub lit_since: Option<String>,
    /// The last check of each reference tube of the station when the run was opened: on them hangs whether the bench
    /// gives a verdict. None where nobody looked: an earlier version of the program, or a study.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub reference_checks: Option<Vec<ReferenceCheck>>,
    /// Language of the sheet, two letters; empty is English.
    #[serde(default, skip_serializing_if = "String::is_empty")]
    pub language: String,
}

impl Identity {
    /// The language of the sheet.
    pub fn language(&self) -> Language {
        Language::of_record(&self.language)
    }
}

/// What a run is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum RunKind {
    /// A tube to be judged.
    #[default]
    Product,
    /// A reference tube of the station: the bench is judged by it.
    Reference,
}

impl RunKind {
    /// A tube to be judged, the ordinary case.
    pub fn is_product(&self) -> bool {
        *self == Self::Product
    }
}

/// Which run is repeated, and why.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Repeat {
    /// Id of the earlier run of the same serial.
    pub run_id: String,
    /// The assigned cause, in words.
    pub reason: String,
}

/// One capture: the fact and, apart from it, the finding.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Captured {
    /// Step that wanted it.
    pub step: String,
    /// Its number in the run, from 1.
    pub number: u64,
    /// The fact.
    pub fact: CaptureFact,
    /// The finding.
    pub finding: CaptureFinding,
}

/// What came from outside with a capture.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct CaptureFact {
    /// Seconds since the run was opened at which it was taken.
    pub taken_s: f64,
    /// SHA-256 of the bytes as they came, hexadecimal.
    pub sha256: String,
    /// Files below `captures/` if the bytes are kept; else empty.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub files: Vec<String>,
    /// Polarizer, rad.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub polarizer: Option<f64>,
    /// Power meter at that moment, W, before any correction.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub power: Option<f64>,
    /// Tube current, A.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub run_current: Option<f64>,
}
