//! The loop itself, and how a run is taken up again.
//! Must not look into a step: it does one want after the other.
//! Main types: [`Driver`], [`Watcher`].

use chrono::DateTime;

use super::{
    Interrupted,
    engine::{Engine, Measured, measure_trace},
};
use crate::record::event::{Captured, Event, Happening};
use crate::record::finding::{CaptureFinding, Trace};
use crate::record::light::LightCaptured;
use crate::record::question::{Answer, Question};
use crate::run::{At, Remark, Run};
use crate::station::{Bench, CaptureRequest, Durability, Journal, LightRequest, Moment, ReadingRequest, Trouble, Want};

/// Failures of an instrument in a row after which the run is left open instead of going on.
const FAILURES: u32 = 25;
/// Equal wants in a row that show an error in the program rather than a slow bench.
const REPEATS: u32 = 1000;

/// Sees what happens; shows it, or not.
pub trait Watcher {
    /// One event was stored and taken.
    fn happened(&mut self, run: &Run, event: &Event, remarks: &[Remark]);
    /// Whether it would show the next sweep: a trace is thinned for it then.
    fn looks(&self) -> bool {
        false
    }
    /// A sweep was measured; its trace is gone afterwards.
    fn swept(&mut self, _finding: &CaptureFinding, _trace: Option<Trace>) {}
    /// A person is about to be asked.
    fn asking(&mut self, _question: &Question) {}
}

/// Everything the loop works with.
pub struct Driver<'a> {
    /// The run.
    pub run: &'a mut Run,
    /// The bench.
    pub bench: &'a mut Bench,
    /// Where events go.
    pub journal: &'a mut dyn Journal,
    /// Measures captures; none if the bench has no interferometer.
    pub engine: Option<&'a Engine>,
    /// Who looks on.
    pub watcher: &'a mut dyn Watcher,
}

impl Driver<'_> {
    /// Goes on until the run is finished.
    ///
    /// Errors: see [`Interrupted`]; what was stored stays.
    pub fn drive(&mut self) -> Result<(), Interrupted> {
        let mut before = None;
        let (mut repeats, mut failures) = (0, 0);
        loop {
            let want = self.run.wants();
            repeats = if before.as_ref() == Some(&want) { repeats + 1 } else { 0 };
            if repeats > REPEATS {
                return Err(Interrupted::Stuck { times: repeats, want: format!("{want:?}") });
            }
            let done = match &want {
                Want::Finished => return Ok(()),
                Want::MakeSafe => self.make_safe(),
                want => self.unless_stopped(want),
            };
            match done {
                Ok(()) => failures = 0,
                Err(Failed::Instrument(why)) => {
                    failures += 1;
                    if failures >= FAILURES {
                        return Err(Interrupted::Instrument(why));
                    }
                }
                Err(Failed::Interrupted(why)) => return Err(why),
            }
            before = Some(want);
        }
    }

    /// What is wanted, unless somebody wants the run to end.
    fn unless_stopped(&mut self, want: &Want) -> Result<(), Failed> {
        if let Err(trouble) = self.bench.interlock.stop_key() {
            return self.trouble(trouble);
        }
        match want {
            Want::WaitUntil { elapsed_ms, .. } => self.wait_until(*elapsed_ms),
            Want::Capture(request) => self.capture(request),
            Want::Light(request) => self.light(request),
            Want::Reading(request) => self.read(request),
            Want::Answer(question) => self.ask(question),
            Want::MakeSafe | Want::Finished => Ok(()),
        }
    }

    fn make_safe(&mut self) -> Result<(), Failed> {
        let happened = match self.bench.interlock.make_safe() {
            Ok(()) => Happening::MadeSafe,
            Err(Trouble::NotHere(reason)) => Happening::NotMadeSafe { reason },
            Err(trouble) => return self.trouble(trouble),
        };
        self.store(happened, Durability::Now)
    }

    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Failed> {
        self.bench.clock.wait_until(elapsed_ms)?;
        self.store(Happening::Waited, Durability::Soon)
    }

    /// Takes, measures and stores one capture; kept bytes are on disk before their event.
    fn capture(&mut self, request: &CaptureRequest) -> Result<(), Failed> {
        let lost = |reason: String, for_good: bool| Happening::CaptureLost {
            step: request.step.clone(),
            number: request.number,
            reason,
            for_good,
        };
        let Some(engine) = self.engine else {
            return self.store(lost("the station has no interferometer".to_owned(), true), Durability::Now);
        };
        let captured = match self.bench.captures.capture(request) {
            Ok(captured) => captured,
            Err(Trouble::NotHere(reason)) => return self.store(lost(reason, true), Durability::Now),
            Err(Trouble::Instrument(reason)) => {
                self.store(lost(reason.clone(), false), Durability::Now)?;
                return Err(Failed::Instrument(reason));
            }
            Err(trouble) => return self.trouble(trouble),
        };
        let shown = self.watcher.looks();
        let Measured { mut fact, finding, trace } = match engine.measure(&captured, request, shown) {
            Ok(measured) => measured,
            Err(reason) => return self.store(lost(reason, false), Durability::Now),
        };
        let durability = if request.keep { Durability::Now } else { Durability::Soon };
        if request.keep {
            fact.files = self.journal.keep(request.number, &captured)?;
        }
        if shown {
            self.watcher.swept(&finding, trace);
        }
        let captured = Captured { step: request.step.clone(), number: request.number, fact, finding };
        self.store(Happening::Captured(Box::new(captured)), durability)
    }

    /// Takes, measures, keeps and stores one trace of the light. One that cannot be read is given up: a step leans on few.
    fn light(&mut self, request: &LightRequest) -> Result<(), Failed> {
        let lost = |reason: String, for_good: bool| Happening::CaptureLost {
            step: request.step.clone(),
            number: request.number,
            reason,
            for_good,
        };
        let captured = match self.bench.captures.light(request) {
            Ok(captured) => captured,
            Err(Trouble::NotHere(reason)) => return self.store(lost(reason, true), Durability::Now),
            // Nothing is stored: the trace is wanted again, now or by the same command later.
            Err(Trouble::Instrument(reason)) => return Err(Failed::Instrument(reason)),
            Err(trouble) => return self.trouble(trouble),
        };
        let (mut fact, finding) = match measure_trace(&captured, request) {
            Ok(measured) => measured,
            Err(reason) => return self.store(lost(reason, true), Durability::Now),
        };
        fact.files = self.journal.keep(request.number, &captured)?;
        let (step, number, lit) = (request.step.clone(), request.number, request.lit);
        self.store(Happening::Light(Box::new(LightCaptured { step, number, lit, fact, finding })), Durability::Now)
    }

    fn read(&mut self, request: &ReadingRequest) -> Result<(), Failed> {
        let (value, reason) = match self.bench.meters.read(request) {
            Ok(value) if value.is_finite() => (Some(value), None),
            Ok(value) => (None, Some(format!("the meter gave {value}, no finite number"))),
            Err(Trouble::NotHere(reason)) => (None, Some(reason)),
            // Nothing is stored: the reading is wanted again, now or by the same command later.
            Err(Trouble::Instrument(reason)) => return Err(Failed::Instrument(reason)),
            Err(trouble) => return self.trouble(trouble),
        };
        let what = request.what.word().to_owned();
        self.store(Happening::Reading { step: request.step.clone(), what, value, reason }, Durability::Soon)
    }

    /// The question is on disk before it is shown: its answer may switch high voltage on.
    fn ask(&mut self, question: &Question) -> Result<(), Failed> {
        self.store(Happening::Asked { question: question.clone() }, Durability::Now)?;
        self.watcher.asking(question);
        let answer = match self.bench.person.answer(question) {
            Ok(answer) => answer,
            Err(Trouble::NotHere(reason)) => Answer::CannotSay(reason),
            Err(trouble) => return self.trouble(trouble),
        };
        let answered = Happening::Answered {
            step: question.step.clone(),
            word: question.word.clone(),
            answer,
            by: self.bench.person.initials(),
        };
        self.store(answered, Durability::Now)
    }

    /// A person's word ends the run as stopped; all else is passed on.
    fn trouble(&mut self, trouble: Trouble) -> Result<(), Failed> {
        match trouble {
            Trouble::Stopped(reason) => self.store(Happening::Stopped { reason }, Durability::Now),
            other => Err(other.into()),
        }
    }

    fn store(&mut self, what: Happening, durability: Durability) -> Result<(), Failed> {
        let now = self.bench.clock.now();
        if let Some(by_s) = self.bench.clock.was_set() {
            self.store_at(now, Happening::ClockSet { by_s }, Durability::Soon)?;
        }
        self.store_at(now, what, durability)
    }

    fn store_at(&mut self, now: Moment, what: Happening, durability: Durability) -> Result<(), Failed> {
        let event = self.journal.append(now, &what, durability)?;
        let remarks = self.run.take(&event.what, at_of(&event));
        self.watcher.happened(self.run, &event, &remarks);
        Ok(())
    }
}

/// How one want failed.
enum Failed {
    /// It may be tried again.
    Instrument(String),
    Interrupted(Interrupted),
}

impl From<Trouble> for Failed {
    fn from(trouble: Trouble) -> Self {
        Self::Interrupted(trouble.into())
    }
}

impl From<crate::station::JournalError> for Failed {
    fn from(error: crate::station::JournalError) -> Self {
        Self::Interrupted(error.into())
    }
}

/// The moment of an event, from its stored form: the first time and every later one fold the same numbers.
fn at_of(event: &Event) -> At {
    let wall = DateTime::parse_from_rfc3339(&event.at).unwrap_or_default();
    // Stored to the millisecond; a float to integer cast saturates.
    At { wall, elapsed_ms: (event.elapsed_s * 1000.0).round() as u64 }
}

/// Folds stored events into a fresh run, as [`resume`] does, without going on.
pub fn fold(run: &mut Run, events: &[Event]) {
    for event in events {
        run.take(&event.what, at_of(event));
    }
}

/// Folds stored events into a fresh run, sets the clock after them and, unless all is done, stores that the run goes on.
///
/// * `events`: of the run folder, from the first.
///
/// Stored findings are used as they are: nothing is measured again.
pub fn resume(
    run: &mut Run,
    bench: &mut Bench,
    journal: &mut dyn Journal,
    events: &[Event],
) -> Result<(), Interrupted> {
    fold(run, events);
    bench.clock.resume(events)?;
    if events.len() > 1 && run.wants() != Want::Finished {
        let event = journal.append(bench.clock.now(), &Happening::Resumed, Durability::Now)?;
        run.take(&event.what, at_of(&event));
    }
    Ok(())
}
