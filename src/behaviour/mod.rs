//! What a tube does over time: walk and warm-up, hops and swaps, mode counts, gain line, power over walk cycles, noise of its light.
//! Must not read a clock or do I/O: everything is a function of the glimpses taken.
//! Main types: [`Glimpse`], [`Warmup`], [`Watched`], [`Counts`], [`CyclePower`].

mod attribution;
mod beam;
mod counts;
mod decay;
mod drift;
mod envelope;
mod glimpse;
mod jumps;
mod light;
mod line;
mod noise;
mod power;
mod rest;
mod swaps;
#[cfg(test)]
mod synthetic;
mod track;
mod trial;
mod warmup;
mod watch;

pub use beam::{KnifeEdge, beam_diameter, beam_divergence};
pub use counts::{Counts, GainPoint, count_modes, gain_points};
pub use drift::{line_drift, tau_per_slope};
pub use envelope::{Envelope, envelope};
pub use glimpse::{Glimpse, GlimpseMode};
pub use light::{LIGHT_ENGINE, LightMeasurement, LightSettings, LightTone, MainsRipple, measure_light};
pub use noise::{LightSet, NoiseFound, ToneFound, ToneOrigin, light_noise};
pub use power::{CyclePower, cycle_power, power_drift};
pub use rest::{Rest, rest};
pub use warmup::{Warmup, WarmupSettings, WarmupState};
pub use watch::{Hop, Swap, Watched, watch};

#[cfg(test)]
mod fixture_tests;
