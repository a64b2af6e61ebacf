//! What the parts of a simulated bench share: bench time, discharge, polarizer.
//! Must not answer or measure anything.
//! Main type: [`State`].

use std::{
    thread,
    time::{Duration, Instant},
};

use chrono::TimeDelta;

use super::{SimulatedOptions, hands};
use crate::{
    phantom::{Setting, World},
    record::event::{Event, Happening},
    station::Moment,
};

/// The shared state.
pub(super) struct State {
    pub world: World,
    pub options: SimulatedOptions,
    /// Bench time since the run was opened, ms.
    now_ms: u64,
    /// Bench time of first light, ms, while the discharge burns; below zero where it burnt before the run.
    first_light: Option<i64>,
    pub polarizer: Option<f64>,
    pub blocked: bool,
    /// Where bench time and wall time were last alike.
    tied: (Instant, u64),
}

impl State {
    pub fn new(world: World, options: SimulatedOptions) -> Self {
        let tied = (Instant::now(), 0);
        Self { world, options, now_ms: 0, first_light: None, polarizer: None, blocked: false, tied }
    }

    /// Now, on both clocks of the bench.
    pub fn now(&self) -> Moment {
        let since = TimeDelta::milliseconds(i64::try_from(self.now_ms).unwrap_or(i64::MAX / 2));
        let wall = self.options.started_at.checked_add_signed(since).unwrap_or(self.options.started_at);
        Moment { wall, elapsed_ms: self.now_ms }
    }

    /// Lets bench time reach a moment; sleeps where it would run faster than its pace.
    pub fn advance_to(&mut self, elapsed_ms: u64) {
        self.now_ms = self.now_ms.max(elapsed_ms);
        let bench_s = (self.now_ms - self.tied.1) as f64 / 1e3;
        // A pace that is no positive number is no ceiling.
        let due = Duration::try_from_secs_f64(bench_s / self.options.pace).unwrap_or_default();
        if let Some(early) = due.checked_sub(self.tied.0.elapsed()) {
            thread::sleep(early);
        }
    }

    /// Lets bench time pass.
    pub fn advance_by(&mut self, ms: u64) {
        self.advance_to(self.now_ms.saturating_add(ms));
    }

    /// Time for the world, ms since first light (below zero: time on the dark bench), and how the bench stands.
    pub fn on_tube(&self) -> (i64, Setting) {
        let signed = |ms: u64| i64::try_from(ms).unwrap_or(i64::MAX);
        let lit = self.first_light.is_some();
        let at = match self.first_light {
            Some(light) => signed(self.now_ms).saturating_sub(light).max(0),
            // From −1 down, so that every moment in the dark has noise of its own.
            None => -1 - signed(self.now_ms),
        };
        (at, Setting { lit, polarizer: self.polarizer, blocked: self.blocked })
    }

    /// First light, now. A tube that burns already stays as it is.
    pub fn switch_on(&mut self) {
        self.first_light.get_or_insert(i64::try_from(self.now_ms).unwrap_or(i64::MAX));
    }

    /// The tube burnt for so long already when the run was opened, ms.
    pub fn burns_for(&mut self, ms: u64) {
        self.first_light = Some(i64::try_from(ms).map_or(i64::MIN, |ms| -ms));
    }

    /// The discharge is out.
    pub fn switch_off(&mut self) {
        self.first_light = None;
    }

    /// Takes the bench to where the stored events left it.
    pub fn resume(&mut self, events: &[Event]) {
        let mut strikes: Vec<(String, String)> = Vec::new();
        for event in events {
            self.now_ms = self.now_ms.max((event.elapsed_s * 1e3).round().max(0.0) as u64);
            match &event.what {
                Happening::Asked { question } if question.high_voltage => {
                    strikes.push((question.step.clone(), question.word.clone()));
                }
                Happening::Answered { step, word, answer, .. } => {
                    let high_voltage = strikes.contains(&(step.clone(), word.clone()));
                    hands::carry_out(self, word, high_voltage, answer);
                }
                Happening::MadeSafe => self.switch_off(),
                _ => {}
            }
        }
        self.tied = (Instant::now(), self.now_ms);
    }
}
