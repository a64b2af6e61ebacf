//! Keys of a dwell: the warm-up, watched by short captures until the walk is inside its bound.
//! Must not tell time.
//! Main type: [`Dwell`].

use super::parse::Context;
use crate::quantity::Dimension;

/// A warm-up.
#[derive(Debug, Clone, PartialEq)]
pub struct Dwell {
    /// Between captures at the beginning, s.
    pub early_every_s: f64,
    /// How long the beginning lasts, s.
    pub early_for_s: f64,
    /// Between captures after that, s.
    pub every_s: f64,
    /// It ends here at the latest, s.
    pub longest_s: f64,
    /// Walk still to come that counts as ready, mode spacings …
    pub residual_walk: f64,
    /// … in this time, s.
    pub horizon_s: f64,
    /// Whole walk cycles that must have been seen.
    pub cycles: f64,
    /// Samples of a capture.
    pub samples: usize,
    /// A tube from the rack is looked at for at least this long before it counts as at rest, s.
    pub rest_for_s: f64,
    /// Whole walk cycles wanted of a tube from the rack; its dwell ends without them once they cannot come any more.
    pub rack_cycles: f64,
}

impl Dwell {
    pub(super) const KEYS: &[&str] = &[
        "early_every",
        "early_for",
        "every",
        "longest",
        "residual_walk",
        "horizon",
        "cycles",
        "samples",
        "rest_for",
        "rack_cycles",
    ];
    pub(super) const FILLS: &[&str] = &["warmup_tau", "warmup_ready", "walk_cycles", "walk_growth", "walk_rate"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        let count = |key, default| {
            let within = |item: &crate::limits::reading::Item<'_>| {
                item.quantity_within(Dimension::Ratio, (1e-3, 1e4), "a number from 0.001 to 10000")
            };
            context.or(key, default, within)
        };
        let early_every_s = context.seconds_or("early_every", 0.2);
        let early_for_s = context.seconds_or("early_for", 180.0);
        let every_s = context.seconds_or("every", 0.5);
        let longest_s = context.seconds_or("longest", 3600.0);
        let residual_walk = count("residual_walk", 2.0);
        let horizon_s = context.seconds_or("horizon", 600.0);
        let cycles = count("cycles", 2.0);
        let samples = context.or("samples", 2_000, |item| item.whole(200, 10_000_000));
        let rest_for_s = context.seconds_or("rest_for", 120.0);
        let rack_cycles = context.or("rack_cycles", 1.0, |item| {
            item.quantity_within(Dimension::Ratio, (0.0, 1e4), "a number from 0 to 10000")
        });
        if let (Some(early), Some(longest), Some(item)) = (early_for_s, longest_s, context.table.get("early_for"))
            && early > longest
        {
            item.fault("`early_for` is longer than `longest`; expected it to be shorter", None);
        }
        Some(Self {
            early_every_s: early_every_s?,
            early_for_s: early_for_s?,
            every_s: every_s?,
            longest_s: longest_s?,
            residual_walk: residual_walk?,
            horizon_s: horizon_s?,
            cycles: cycles?,
            samples: usize::try_from(samples?).ok()?,
            rest_for_s: rest_for_s?,
            rack_cycles: rack_cycles?,
        })
    }
}
