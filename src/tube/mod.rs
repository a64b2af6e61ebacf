//! Physics of a helium-neon tube: its comb of modes, its gain line, its growth in warm-up; likely causes of faults.
//! Must not know how any of it is measured.
//! Main functions: [`mode_spacing`], [`mirror_spacing`], [`doppler_width`], [`half_lasing_range`], [`growth`].

mod causes;
mod comb;
mod gain;
mod growth;

pub use causes::{Cause, Sign, likely_cause};
pub use comb::{mirror_spacing, mode_count_bounds, mode_number, mode_spacing};
pub use gain::{doppler_parameter, doppler_width, gain_ratio, half_lasing_range, measured_gain_ratio};
pub use growth::{body_drift, growth, walk_cycles};
