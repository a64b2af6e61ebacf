//! Keys of an envelope step: the heights of the modes along the gain line over a dwell.
//! Must not measure.
//! Main type: [`Envelope`].

use super::parse::Context;

/// Lasing span, width and dip of the envelope, gain over loss.
#[derive(Debug, Clone, PartialEq)]
pub struct Envelope {
    /// The dwell whose last whole cycles are used.
    pub from: String,
}

impl Envelope {
    pub(super) const KEYS: &[&str] = &["from"];
    pub(super) const FILLS: &[&str] = &["lasing_span", "envelope_fwhm", "dip_depth", "gain_ratio"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        Some(Self { from: context.need_from(&["dwell"])? })
    }
}
