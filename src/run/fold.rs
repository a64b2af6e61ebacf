//! What each happening does to a run.
//! Must not panic on any of them, in any order.
//! Main function: `Run::fold`.

use super::{
    At, Ending, Remark, Run,
    answer::check_answer,
    steps::{Given, Room, Step, Wish},
};
use crate::phrase::{Saying, figure, reasons};
use crate::record::{
    event::{Captured, Happening},
    question::{Answer, Question},
};

impl Run {
    pub(super) fn fold(&mut self, happening: &Happening, at: At) -> Vec<Remark> {
        let step = self.step_name().to_owned();
        let said = self.book.remarks.len();
        // The monotonic clock does not run backward; an event that says so does not move it.
        self.elapsed_ms = self.elapsed_ms.max(at.elapsed_ms);
        let surprise = self.take_one(happening, at).err();
        self.events += 1;
        self.pass_done();
        self.end_if_done(at);
        let new = self.book.remarks.get(said..).unwrap_or(&[]).iter().cloned();
        let language = self.identity.language();
        let new = new.map(|saying| saying.text(language));
        surprise.into_iter().chain(new).map(|text| Remark { step: step.clone(), text }).collect()
    }

    /// Errors: what was unexpected about it.
    fn take_one(&mut self, happening: &Happening, at: At) -> Result<(), String> {
        match happening {
            Happening::Opened(opened) => self.opened(&opened.identity.run_id),
            Happening::Asked { question } => self.asked(question),
            Happening::Answered { step, word, answer, by } => {
                self.answered(step, word, answer)?;
                self.answered_by.clone_from(by);
                Ok(())
            }
            Happening::Captured(captured) => self.captured(captured),
            Happening::Light(light) => {
                self.wanted_capture(&light.step, light.number)?;
                match self.wish() {
                    Wish::Light(wanted) if wanted.lit == light.lit => {}
                    _ => return Err(format!("light trace {} for {}, which was not wanted", light.number, light.step)),
                }
                self.next_capture += 1;
                self.give(Given::Light(light));
                Ok(())
            }
            Happening::CaptureLost { step, number, reason, for_good } => self.lost(step, *number, reason, *for_good),
            Happening::Reading { step, what, value, reason } => self.read(step, what, *value, reason.as_deref()),
            Happening::Waited => Ok(()),
            Happening::ClockSet { by_s } => {
                self.book.remark(clock_set(*by_s));
                Ok(())
            }
            Happening::MadeSafe => {
                self.made_safe();
                Ok(())
            }
            Happening::NotMadeSafe { .. } => {
                // With captures alone there is no tube that this program had lit.
                if !self.identity.from_captures {
                    self.book.remark(&reasons::NOT_MADE_SAFE);
                }
                self.made_safe();
                Ok(())
            }
            Happening::Resumed => {
                // Nobody knows whether the switch was thrown: off first, then the question again.
                self.interrupted |= self.ending.is_none() && self.pending.is_some();
                Ok(())
            }
            Happening::Stopped { reason } => self.stopped(reason, at),
        }
    }

    fn opened(&self, run_id: &str) -> Result<(), String> {
        if self.events > 0 {
            return Err("opened again; expected only as the first event".into());
        }
        if run_id != self.identity.run_id {
            return Err(format!("opened as run {run_id}, expected {}", self.identity.run_id));
        }
        Ok(())
    }

    fn asked(&mut self, question: &Question) -> Result<(), String> {
        self.running()?;
        if question.high_voltage {
            self.pending = Some(question.clone());
            self.high_voltage = true;
        }
        match self.wish() {
            Wish::Ask { word, .. } if word == question.word && question.step == self.step_name() => Ok(()),
            _ => Err(format!("asked for {}.{}, which is not wanted now", question.step, question.word)),
        }
    }

    fn answered(&mut self, step: &str, word: &str, answer: &Answer) -> Result<(), String> {
        self.running()?;
        match self.wish() {
            Wish::Ask { word: wanted, expects, high_voltage, .. } if wanted == word && step == self.step_name() => {
                self.high_voltage |= high_voltage;
                if self.interrupted {
                    return Err(format!("answer to {step}.{word} before high voltage was off; it is asked again"));
                }
                check_answer(&expects, answer).map_err(|why| format!("answer to {step}.{word}: {why}"))?;
                self.pending = None;
                self.give(Given::Answer(answer));
                Ok(())
            }
            _ => Err(format!("answer to {step}.{word}, which was not asked")),
        }
    }

    fn captured(&mut self, captured: &Captured) -> Result<(), String> {
        self.wanted_capture(&captured.step, captured.number)?;
        if !matches!(self.wish(), Wish::Capture { .. }) {
            return Err(format!("capture {} for {}, which wants a light trace now", captured.number, captured.step));
        }
        self.next_capture += 1;
        // Light means that somebody switched high voltage on.
        self.high_voltage |= !captured.finding.dark;
        self.give(Given::Capture(captured));
        Ok(())
    }

    fn lost(&mut self, step: &str, number: u64, reason: &str, for_good: bool) -> Result<(), String> {
        self.wanted_capture(step, number)?;
        self.next_capture += 1;
        self.give(Given::Lost { reason, for_good });
        Ok(())
    }

    fn wanted_capture(&self, step: &str, number: u64) -> Result<(), String> {
        self.running()?;
        if !matches!(self.wish(), Wish::Capture { .. } | Wish::Light(_)) || step != self.step_name() {
            return Err(format!("capture {number} for {step}, which wants none now"));
        }
        if number != self.next_capture {
            return Err(format!("capture {number}, expected number {}", self.next_capture));
        }
        Ok(())
    }

    fn read(&mut self, step: &str, what: &str, value: Option<f64>, reason: Option<&str>) -> Result<(), String> {
        self.running()?;
        match self.wish() {
            Wish::Reading(wanted) if wanted.word() == what && step == self.step_name() => {
                let reading = match value {
                    Some(value) if value.is_finite() => Ok(value),
                    Some(_) => Err("the meter gave no finite number"),
                    None => Err(reason.unwrap_or("the meter gave no value")),
                };
                self.give(Given::Reading(reading));
                Ok(())
            }
            _ => Err(format!("reading of {what} for {step}, which was not wanted")),
        }
    }

    fn made_safe(&mut self) {
        self.high_voltage = false;
        self.pending = None;
        self.interrupted = false;
        if let Some(ending) = &mut self.ending {
            ending.unsafe_yet = false;
        }
    }

    fn stopped(&mut self, reason: &str, at: At) -> Result<(), String> {
        self.running()?;
        self.interrupted = false;
        let unsafe_yet = self.high_voltage || self.pending.is_some();
        self.ending = Some(Ending { at: at.wall, stopped: Some(reason.to_owned()), unsafe_yet });
        Ok(())
    }

    fn running(&self) -> Result<(), String> {
        match self.ending {
            Some(_) => Err("something happened after the run had ended".into()),
            None => Ok(()),
        }
    }

    /// Hands the current step what it wanted.
    fn give(&mut self, given: Given<'_>) {
        self.with_step(|step, room| step.take(given, room));
    }

    /// Begins the current step.
    pub(super) fn begin(&mut self) {
        self.with_step(|step, room| step.begin(room));
    }

    fn with_step(&mut self, act: impl FnOnce(&mut dyn Step, &mut Room<'_>)) {
        let Some(step) = self.steps.get_mut(self.current) else { return };
        let name = self.plan.recipe.steps.get(self.current).map_or("", |step| step.name.as_str());
        let mut room = Room {
            plan: &self.plan,
            from_captures: self.identity.from_captures,
            step: name,
            book: &mut self.book,
            opened_at: self.opened_at,
            now_ms: self.elapsed_ms,
        };
        act(step.as_mut(), &mut room);
    }

    /// Goes on past steps that want nothing more; none is begun after a dark tube.
    pub(super) fn pass_done(&mut self) {
        while self.ending.is_none()
            && self.book.dark.is_none()
            && self.current < self.steps.len()
            && self.wish() == Wish::Nothing
        {
            self.current += 1;
            self.begin();
        }
    }

    fn end_if_done(&mut self, at: At) {
        if self.ending.is_none() && (self.book.dark.is_some() || self.current >= self.steps.len()) {
            self.interrupted = false;
            self.ending = Some(Ending { at: at.wall, stopped: None, unsafe_yet: true });
        }
    }
}

/// What the sheet says of a clock that was set in mid-run.
fn clock_set(by_s: f64) -> Saying {
    let phrase = if by_s < 0.0 { &reasons::CLOCK_BACK } else { &reasons::CLOCK_AHEAD };
    phrase.with([figure(by_s.abs().round())])
}
