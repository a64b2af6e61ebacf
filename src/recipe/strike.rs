//! Keys of a strike: cold, before the dwell.
//! Must not switch anything.
//! Main type: [`Strike`].

use super::parse::Context;

/// Start delay, tries, and start voltage where the bench can read it.
#[derive(Debug, Clone, PartialEq)]
pub struct Strike {
    /// Tries after which a tube that stays dark is given up.
    pub tries_at_most: u64,
}

impl Strike {
    pub(super) const KEYS: &[&str] = &["tries_at_most"];
    pub(super) const FILLS: &[&str] = &["start_delay", "start_tries", "start_voltage"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        Some(Self { tries_at_most: context.or("tries_at_most", 3, |item| item.whole(1, 10))? })
    }
}
