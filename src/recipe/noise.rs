//! Keys of a noise step: the band over which the noise of the light is summed.
//! Must not measure.
//! Main type: [`Noise`].

use super::parse::Context;
use crate::quantity::Dimension;

/// Noise, mains ripple and tones of the total light.
#[derive(Debug, Clone, PartialEq)]
pub struct Noise {
    /// Begin of the band, Hz.
    pub lowest: f64,
    /// End of the band, Hz.
    pub highest: f64,
}

impl Noise {
    pub(super) const KEYS: &[&str] = &["lowest", "highest"];
    pub(super) const FILLS: &[&str] = &["noise_rms", "line_ripple", "tone_level", "tone_frequency"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        let within = |key, default, bounds, words| {
            context.or(key, default, |item| item.quantity_within(Dimension::Frequency, bounds, words))
        };
        let lowest = within("lowest", 10.0, (1.0, 40.0), "a frequency from 1 Hz to 40 Hz, below the mains");
        let highest = within("highest", 1e6, (2e4, 1e7), "a frequency from 20 kHz to 10 MHz");
        Some(Self { lowest: lowest?, highest: highest? })
    }
}
