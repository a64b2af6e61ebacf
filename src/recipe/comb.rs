//! Keys of a comb: counts of modes and off-axis light over the captures of an earlier step.
//! Must not measure.
//! Main type: [`Comb`].

use super::parse::Context;

/// The comb over a walk cycle.
#[derive(Debug, Clone, PartialEq)]
pub struct Comb {
    /// The dwell whose last whole cycles are used, or the sweep whose captures are.
    pub from: String,
}

impl Comb {
    pub(super) const KEYS: &[&str] = &["from"];
    pub(super) const FILLS: &[&str] = &["mode_count_min", "mode_count_max", "off_axis_ratio"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        Some(Self { from: context.need_from(&["dwell", "sweep"])? })
    }
}
