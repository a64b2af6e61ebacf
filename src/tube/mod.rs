//! Physics of a helium-neon tube: its comb of modes, its gain line, its growth in warm-up.
//! Must not know how any of it is measured.
//! Main functions: [`mode_spacing`], [`mirror_spacing`], [`doppler_width`], [`half_lasing_range`], [`growth`].

mod comb;
mod gain;
mod growth;

pub use comb::{mirror_spacing, mode_count_bounds, mode_number, mode_spacing};
pub use gain::{doppler_parameter, doppler_width, gain_ratio, half_lasing_range};
pub use growth::{body_drift, growth, walk_cycles};
