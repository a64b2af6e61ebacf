//! A run: a pure fold over what happened. Happenings in, wants and sheet out.
//! Must not call a trait of the bench, do I/O or read a clock; names no step kind outside the table in `steps`.
//! Main type: [`Run`].

mod answer;
mod caution;
mod charts;
mod filled;
mod fold;
mod grid;
mod malus;
mod notebook;
mod plan;
mod pool;
mod rack;
mod reference;
mod sheet;
mod spacing;
mod steps;

pub use answer::check_answer;
pub use plan::Plan;

use std::fmt;

use chrono::{DateTime, FixedOffset};

use self::{
    notebook::Notebook,
    rack::Rack,
    steps::{LightWish, Step, Wish},
};
use crate::{
    record::{
        event::{Happening, Identity},
        question::Question,
        sheet::{Sheet, WalkChart},
    },
    station::file::Interferometer,
    station::{CaptureRequest, LightRequest, ReadingRequest, Want},
};

/// When something happened, on both clocks.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct At {
    /// Wall time in the station's zone.
    pub wall: DateTime<FixedOffset>,
    /// Monotonic milliseconds since the run was opened.
    pub elapsed_ms: u64,
}

/// Something that whoever drives the run should say: an unexpected happening, or a sentence that also stands on the sheet.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Remark {
    /// Step at hand, or empty before the first and after the last.
    pub step: String,
    /// In words.
    pub text: String,
}

impl fmt::Display for Remark {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.step.is_empty() { f.write_str(&self.text) } else { write!(f, "{}: {}", self.step, self.text) }
    }
}

/// How far a run is.
#[derive(Debug, Clone, PartialEq)]
pub struct Progress {
    /// Step at hand; empty after the last.
    pub step: String,
    /// Steps done.
    pub done_steps: usize,
    /// Steps of the recipe.
    pub n_steps: usize,
    /// Expected seconds to the end of the step at hand; none where that cannot be said yet.
    pub step_s: Option<f64>,
    /// Expected seconds to the end of the run; none where that cannot be said yet.
    pub expected_s: Option<f64>,
}

/// One inspection of one tube.
pub struct Run {
    plan: Plan,
    identity: Identity,
    opened_at: Option<DateTime<FixedOffset>>,
    book: Notebook,
    steps: Vec<Box<dyn Step>>,
    current: usize,
    /// Number that the next capture gets: the one place where numbers are made.
    next_capture: u64,
    elapsed_ms: u64,
    events: u64,
    /// A question that switches high voltage on was put and not answered.
    pending: Option<Question>,
    /// Taken up again while such a question was open: high voltage off first.
    interrupted: bool,
    high_voltage: bool,
    /// Who answered last, for a run opened without a technician.
    answered_by: String,
    ending: Option<Ending>,
}

/// The run wants nothing more of its steps.
#[derive(Debug, Clone, PartialEq)]
struct Ending {
    /// When the last row was filled, or the stop came.
    at: DateTime<FixedOffset>,
    /// Why a person stopped it; none for a run that came to its end.
    stopped: Option<String>,
    /// High voltage still has to be taken off.
    unsafe_yet: bool,
}

impl Run {
    /// Opens the sheet of one tube. The first step begins at once.
    pub fn open(plan: Plan, identity: Identity) -> Self {
        let steps = plan.recipe.steps.iter().map(|step| steps::step_of(&step.kind)).collect();
        let opened_at = DateTime::parse_from_rfc3339(&identity.started_at).ok();
        let air = plan.station.interferometer.as_ref().and_then(Interferometer::air_line);
        let mut run = Self {
            plan,
            book: Notebook::begin(Rack::of(&identity, opened_at), air),
            steps,
            current: 0,
            next_capture: 1,
            elapsed_ms: 0,
            events: 0,
            pending: None,
            interrupted: false,
            // Taken over from the rack, it burns from the first moment on.
            high_voltage: identity.lit_since.is_some(),
            identity,
            opened_at,
            answered_by: String::new(),
            ending: None,
        };
        run.begin();
        // A step that wants nothing is done as it begins; the end itself waits for the first event, which brings a time.
        run.pass_done();
        run
    }

    /// Takes what happened. Total: an unexpected happening changes nothing and is a remark.
    pub fn take(&mut self, happening: &Happening, at: At) -> Vec<Remark> {
        self.fold(happening, at)
    }

    /// What the run waits for; a function of the happenings taken.
    pub fn wants(&self) -> Want {
        match &self.ending {
            Some(ending) if ending.unsafe_yet => return Want::MakeSafe,
            Some(_) => return Want::Finished,
            None if self.interrupted => return Want::MakeSafe,
            None => {}
        }
        let step = self.step_name().to_owned();
        match self.wish() {
            Wish::Capture { not_before_ms, samples, keep, trace } => {
                Want::Capture(CaptureRequest { step, number: self.next_capture, not_before_ms, samples, keep, trace })
            }
            Wish::Light(LightWish { lit, sample_rate, samples, band, overlap }) => {
                let number = self.next_capture;
                Want::Light(LightRequest { step, number, lit, sample_rate, samples, band, overlap })
            }
            Wish::Reading(what) => Want::Reading(ReadingRequest { step, what, not_before_ms: 0 }),
            Wish::Ask { word, text, expects, high_voltage } => {
                let language = self.identity.language();
                let caution = caution::of_question(&word, &expects, high_voltage);
                let caution = caution.map_or_else(String::new, |caution| caution.of(language).to_owned());
                Want::Answer(Question { step, word, text: text.text(language), caution, expects, high_voltage })
            }
            // Only a recipe whose every step wants nothing, before its first event.
            Wish::Nothing => Want::WaitUntil { step, elapsed_ms: self.elapsed_ms },
        }
    }

    /// The sheet as it stands.
    pub fn sheet(&self) -> Sheet {
        sheet::sheet_of(self)
    }

    /// How far the run is.
    pub fn progress(&self) -> Progress {
        let left = self.steps.get(self.current..).unwrap_or(&[]);
        let expected_s = match self.ending {
            Some(_) => Some(0.0),
            None => left.iter().map(|step| step.expected_s(&self.book)).sum(),
        };
        Progress {
            step: self.step_name().to_owned(),
            done_steps: self.current.min(self.steps.len()),
            n_steps: self.steps.len(),
            step_s: left.first().and_then(|step| step.expected_s(&self.book)),
            expected_s,
        }
    }

    /// The walk as the sheet shows it, without the rest of the sheet.
    pub fn walk(&self) -> Option<WalkChart> {
        charts::walk_chart(&self.book).filter(|_| !self.identity.times_assumed)
    }

    /// The plan it was opened with.
    pub fn plan(&self) -> &Plan {
        &self.plan
    }

    /// Whose run it is.
    pub fn identity(&self) -> &Identity {
        &self.identity
    }

    fn step_name(&self) -> &str {
        self.plan.recipe.steps.get(self.current).map_or("", |step| step.name.as_str())
    }

    fn wish(&self) -> Wish {
        self.steps.get(self.current).map_or(Wish::Nothing, |step| step.wants())
    }
}
