//! What a tube does over time: walk and warm-up, hops and swaps, mode counts, points of the gain line, power over walk cycles.
//! Must not read a clock or do I/O: everything is a function of the glimpses taken.
//! Main types: [`Glimpse`], [`Warmup`], [`Watched`], [`Counts`], [`CyclePower`].

mod decay;
mod glimpse;
mod jumps;
#[cfg(test)]
mod synthetic;
mod track;
mod warmup;

pub use glimpse::{Glimpse, GlimpseMode};
pub use warmup::{Warmup, WarmupSettings, WarmupState};
