//! Keys of a beam step: at how many distances the knife edge is read.
//! Must not measure.
//! Main type: [`Beam`].

use super::parse::Context;

/// Beam diameter and divergence.
#[derive(Debug, Clone, PartialEq)]
pub struct Beam {
    /// Distances: one gives the diameter, two the divergence as well.
    pub distances: u64,
}

impl Beam {
    pub(super) const KEYS: &[&str] = &["distances"];
    pub(super) const FILLS: &[&str] = &["beam_diameter", "beam_divergence"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        Some(Self { distances: context.or("distances", 2, |item| item.whole(1, 2))? })
    }
}
