//! What a step of a recipe is to a run, and the one table of its kinds.
//! Must not do I/O or call a trait of the bench.
//! Main types: [`Step`], [`Wish`], [`Given`], [`Room`].

mod comb;
mod dwell;
mod look;
mod noise;
mod polarizer;
mod power;
mod strike;
mod supply;
mod sweep;
mod watch;

use chrono::{DateTime, FixedOffset};

use super::{filled::Filled, notebook::Notebook, plan::Plan};
use crate::{
    phrase::Saying,
    recipe::StepKind,
    record::{
        event::Captured,
        light::LightCaptured,
        question::{Answer, Expects},
    },
    station::ReadingKind,
};

/// Samples of a whole capture, where a recipe has no key for it.
pub(crate) const WHOLE_CAPTURE: usize = 20_000;

/// A step at work: it is begun once, then wants one thing after the other until it wants nothing.
pub(crate) trait Step: Send {
    /// Called when the step before it is done.
    fn begin(&mut self, room: &mut Room<'_>);
    /// What it wants now; a function of what it was given. A step that only computes wants nothing.
    fn wants(&self) -> Wish {
        Wish::Nothing
    }
    /// Takes what it wanted: only ever what [`Step::wants`] named last.
    fn take(&mut self, _given: Given<'_>, _room: &mut Room<'_>) {}
    /// Its rows so far.
    fn filled(&self) -> &[Filled];
    /// Seconds until it is done, as far as can be said now; none if it cannot.
    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        Some(0.0)
    }
}

/// What a step sees of the run.
pub(crate) struct Room<'a> {
    /// The plan.
    pub plan: &'a Plan,
    /// Captures come from a folder.
    pub from_captures: bool,
    /// Name of the step.
    pub step: &'a str,
    /// What was seen so far.
    pub book: &'a mut Notebook,
    /// When the run was opened.
    pub opened_at: Option<DateTime<FixedOffset>>,
    /// Monotonic ms of the event at hand.
    pub now_ms: u64,
}

/// What a step wants.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Wish {
    /// A capture.
    Capture { not_before_ms: u64, samples: usize, keep: bool, trace: bool },
    /// A fast trace of the total light.
    Light(LightWish),
    /// A reading.
    Reading(ReadingKind),
    /// An answer.
    Ask { word: String, text: Saying, expects: Expects, high_voltage: bool },
    /// It is done.
    Nothing,
}

/// A light trace as a step wants it; see [`crate::station::LightRequest`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct LightWish {
    pub lit: bool,
    pub sample_rate: f64,
    pub samples: usize,
    pub band: (f64, f64),
    pub overlap: (f64, f64),
}

impl Wish {
    /// A number in a unit, SI bounds.
    pub fn number(word: &str, text: impl Into<Saying>, ucum: &str, lowest: f64, highest: f64) -> Self {
        let expects = Expects::Number { ucum: ucum.into(), lowest, highest };
        Self::Ask { word: word.into(), text: text.into(), expects, high_voltage: false }
    }

    /// Enter, once it is done.
    pub fn done(word: impl Into<String>, text: impl Into<Saying>) -> Self {
        Self::Ask { word: word.into(), text: text.into(), expects: Expects::Done, high_voltage: false }
    }
}

/// What a step is given.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Given<'a> {
    /// The capture it wanted.
    Capture(&'a Captured),
    /// The light trace it wanted.
    Light(&'a LightCaptured),
    /// It could not be had or read; `for_good`: there will be none.
    Lost { reason: &'a str, for_good: bool },
    /// The reading it wanted, SI, or why there is none.
    Reading(Result<f64, &'a str>),
    /// The answer it wanted.
    Answer(&'a Answer),
}

/// The table of step kinds: the only place in `run` that names them.
pub(crate) fn step_of(kind: &StepKind) -> Box<dyn Step> {
    match kind {
        StepKind::Strike(keys) => Box::new(strike::Strike::new(keys)),
        StepKind::Dwell(keys) => Box::new(dwell::Dwell::new(keys)),
        StepKind::Sweep(keys) => Box::new(sweep::Sweep::new(keys)),
        StepKind::Comb(keys) => Box::new(comb::Comb::new(keys)),
        StepKind::Polarizer(keys) => polarizer::step_of(keys),
        StepKind::Watch(keys) => Box::new(watch::Watch::new(keys)),
        StepKind::Power(keys) => Box::new(power::Power::new(keys)),
        StepKind::Noise(keys) => Box::new(noise::Noise::new(keys)),
        StepKind::Supply(keys) => Box::new(supply::Supply::new(keys)),
        StepKind::Look(keys) => Box::new(look::Look::new(keys)),
    }
}
