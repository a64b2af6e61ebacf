//! The instruments behind the traits of `station`: here the simulated bench.
//! Must not decide anything about a tube.
//! Main types: [`SimulatedBench`], [`SimulatedOptions`].

mod simulated;

pub use simulated::{CaptureHead, SimulatedBench, SimulatedOptions, simulated_capture_name, simulated_csv};
