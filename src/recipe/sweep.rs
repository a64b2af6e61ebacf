//! Keys of a sweep: whole captures of a tube at rest.
//! Must not measure.
//! Main type: [`Sweep`].

use super::parse::Context;

/// Whole captures at rest.
#[derive(Debug, Clone, PartialEq)]
pub struct Sweep {
    /// How many.
    pub captures: u64,
    /// Samples of each.
    pub samples: usize,
    /// Keep their bytes: a verdict leans on them singly.
    pub keep: bool,
}

impl Sweep {
    pub(super) const KEYS: &[&str] = &["captures", "samples", "keep"];
    pub(super) const FILLS: &[&str] = &["mode_spacing", "mirror_spacing", "finesse"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        let captures = context.or("captures", 5, |item| item.whole(1, 100_000));
        let samples = context.or("samples", 20_000, |item| item.whole(200, 10_000_000));
        let keep = context.or("keep", true, |item| item.switch());
        Some(Self { captures: captures?, samples: usize::try_from(samples?).ok()?, keep: keep? })
    }
}
