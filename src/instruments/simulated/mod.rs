//! A bench that is not there: a `phantom` world behind the traits of `station`, on bench time of its own.
//! Must not let the wall clock into anything but the pace.
//! Main types: [`SimulatedBench`], [`SimulatedOptions`].

mod capture_text;
mod hands;
mod state;
mod technician;

use std::{cell::RefCell, rc::Rc};

use chrono::{DateTime, FixedOffset};

use crate::{
    phantom::{Scenario, World},
    record::event::Event,
    station::{
        Bench, CaptureRequest, CaptureSource, CapturedBytes, Clock, Interlock, LightRequest, Meters, Moment, Person,
        ReadingKind, ReadingRequest, Trouble,
    },
};
pub use capture_text::{CaptureHead, simulated_capture_name, simulated_csv, simulated_light_csv};
use state::State;
pub use technician::INITIALS as SIMULATED_INITIALS;
use technician::Technician;

/// Average of the power reading that goes into a capture's head, ms.
const HEAD_AVERAGE_MS: u32 = 100;
/// What one reading costs, and over how long a meter averages, ms.
const READING_MS: u32 = 1000;

/// How a simulated bench is run.
#[derive(Debug, Clone, PartialEq)]
pub struct SimulatedOptions {
    /// Wall time at which the run was opened.
    pub started_at: DateTime<FixedOffset>,
    /// Most bench seconds in one second of wall time; infinity for as fast as it goes.
    pub pace: f64,
    /// What an answer costs in bench time, ms, whoever answers.
    pub time_to_answer_ms: u64,
}

/// A simulated bench whose parts share one state.
#[derive(Clone)]
pub struct SimulatedBench {
    state: Rc<RefCell<State>>,
}

impl SimulatedBench {
    /// Puts a world behind the traits.
    pub fn new(world: World, options: SimulatedOptions) -> Self {
        Self { state: Rc::new(RefCell::new(State::new(world, options))) }
    }

    /// The same with a tube that burnt for so long already when the run was opened, ms: a rack warmed it.
    pub fn lit_for(self, ms: u64) -> Self {
        self.state.borrow_mut().burns_for(ms);
        self
    }

    /// The bench of a scenario's tube.
    ///
    /// * `seed`, `started_at`: in place of the scenario's own.
    ///
    /// Returns none for an unknown serial.
    pub fn of_scenario(
        scenario: &Scenario,
        serial: &str,
        seed: Option<u64>,
        started_at: Option<DateTime<FixedOffset>>,
        pace: f64,
    ) -> Option<Self> {
        let tube = scenario.tube(serial)?;
        let options = SimulatedOptions {
            started_at: started_at.unwrap_or(tube.started_at),
            pace,
            time_to_answer_ms: scenario.time_to_answer_ms,
        };
        Some(Self::new(scenario.world(serial, seed)?, options))
    }

    /// The bench with its own technician.
    pub fn bench(&self) -> Bench {
        self.bench_with(None)
    }

    /// The bench with somebody else to answer: what they say is done is done to the simulated bench.
    pub fn bench_with(&self, voice: Option<Box<dyn Person>>) -> Bench {
        Bench {
            clock: Box::new(self.clone()),
            captures: Box::new(self.clone()),
            meters: Box::new(self.clone()),
            person: Box::new(Technician::new(self.state.clone(), voice)),
            interlock: Box::new(self.clone()),
        }
    }
}

impl Clock for SimulatedBench {
    fn now(&mut self) -> Moment {
        self.state.borrow().now()
    }

    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble> {
        self.state.borrow_mut().advance_to(elapsed_ms);
        Ok(())
    }

    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
        self.state.borrow_mut().resume(events);
        Ok(())
    }
}

impl CaptureSource for SimulatedBench {
    fn capture(&mut self, request: &CaptureRequest) -> Result<CapturedBytes, Trouble> {
        let mut state = self.state.borrow_mut();
        state.advance_to(request.not_before_ms);
        let taken = state.now();
        let (at, setting) = state.on_tube();
        let trace = state.world.capture(at, request.samples, setting);
        let head = capture_text::CaptureHead {
            captured_at: taken.wall,
            number: request.number,
            polarizer: setting.polarizer,
            power: state.world.power(at, HEAD_AVERAGE_MS, setting),
            run_current: state.world.run_current(at, setting),
        };
        let cost = state.world.capture_ms();
        state.advance_by(cost);
        let Some(trace) = trace else {
            return Err(Trouble::Instrument("the digitizer gave no data for this capture".to_owned()));
        };
        let bytes = simulated_csv(&trace, &head);
        let files = vec![(simulated_capture_name(request.number), bytes)];
        Ok(CapturedBytes { files, taken_ms: taken.elapsed_ms })
    }

    fn light(&mut self, request: &LightRequest) -> Result<CapturedBytes, Trouble> {
        let mut state = self.state.borrow_mut();
        let taken = state.now();
        let (at, setting) = state.on_tube();
        let trace = state.world.light(at, request.samples, request.sample_rate, setting);
        state.advance_by((request.samples as f64 / request.sample_rate * 1e3).ceil() as u64);
        let bytes = simulated_light_csv(&trace, taken.wall, request.number, request.lit);
        let files = vec![(simulated_capture_name(request.number), bytes)];
        Ok(CapturedBytes { files, taken_ms: taken.elapsed_ms })
    }
}

impl Meters for SimulatedBench {
    fn read(&mut self, request: &ReadingRequest) -> Result<f64, Trouble> {
        let mut state = self.state.borrow_mut();
        state.advance_to(request.not_before_ms);
        let (at, setting) = state.on_tube();
        let value = match request.what {
            ReadingKind::Power => state.world.power(at, READING_MS, setting),
            ReadingKind::DarkPower => state.world.dark_power(at),
            ReadingKind::RunCurrent => state.world.run_current(at, setting),
            ReadingKind::RunVoltage => state.world.supply_voltage(at, setting),
        };
        state.advance_by(u64::from(READING_MS));
        Ok(value)
    }
}

impl Interlock for SimulatedBench {
    fn make_safe(&mut self) -> Result<(), Trouble> {
        self.state.borrow_mut().switch_off();
        Ok(())
    }
}

#[cfg(test)]
mod tests;
