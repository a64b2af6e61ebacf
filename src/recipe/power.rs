//! Keys of a power step: the power over the captures of an earlier step.
//! Must not measure.
//! Main type: [`Power`].

use super::parse::Context;

/// Power, its ripple and drift.
#[derive(Debug, Clone, PartialEq)]
pub struct Power {
    /// The dwell whose last whole cycles are used, or the sweep whose captures carry readings.
    pub from: String,
}

impl Power {
    pub(super) const KEYS: &[&str] = &["from"];
    pub(super) const FILLS: &[&str] = &["power", "power_ripple", "power_drift"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        Some(Self { from: context.need_from(&["dwell", "sweep"])? })
    }
}
