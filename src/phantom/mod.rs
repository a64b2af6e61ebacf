//! A model of a helium-neon tube on a bench: captures and readings from stated truths, and the scenario file.
//! Must not share code with the engine that measures it, do I/O or read a clock; takes quantities and constants only.
//! Main types: [`World`], [`Scenario`].

mod appearance;
mod bench;
mod comb;
mod condition;
mod fault;
mod gain;
mod light;
mod noise;
mod ramp;
mod scenario;
mod trace;
mod tube;
mod walk;
mod world;

pub use appearance::{cathode, discharge, getter, press_test};
pub use bench::BenchTruth;
pub use comb::{Axis, Comb, Mode};
pub use condition::Condition;
pub use fault::{FAULT_KINDS, Fault, FaultError, FaultKind};
pub use gain::GainLine;
pub use light::LightTrace;
pub use scenario::{Scenario, ScenarioError, ScenarioFault, ScenarioTube};
pub use trace::RawTrace;
pub use tube::{Incident, TubeTruth};
pub use world::{Setting, World};

#[cfg(test)]
mod fault_tests;
#[cfg(test)]
mod tests;
