//! Keys of a watch: hops and swaps, over a dwell or at rest.
//! Must not measure.
//! Main type: [`Watch`].

use super::parse::Context;

/// A watch for hops and swaps.
#[derive(Debug, Clone, PartialEq)]
pub struct Watch {
    /// The dwell that is watched; none for a watch of its own at rest.
    pub from: Option<String>,
    /// Length of a watch at rest, s.
    pub for_s: Option<f64>,
    /// Between captures of a watch at rest, s.
    pub every_s: f64,
}

impl Watch {
    pub(super) const KEYS: &[&str] = &["from", "for", "every"];
    pub(super) const FILLS: &[&str] = &["hop_count", "swap_count", "cycles_watched"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        let from = context.from(&["dwell"]);
        let for_s = context.or("for", None, |item| item.positive(crate::quantity::Dimension::Time).map(Some));
        match (context.table.get("from"), context.table.get("for")) {
            (Some(_), Some(item)) => item.fault("`for` stands beside `from`; expected only one of them", None),
            (None, None) => context.table.fault("a watch has neither `from` nor `for`; expected one of them", None),
            _ => {}
        }
        let every_s = context.seconds_or("every", 0.5);
        Some(Self {
            from: match from {
                Some(named) => Some(named?),
                None => None,
            },
            for_s: for_s?,
            every_s: every_s?,
        })
    }
}
