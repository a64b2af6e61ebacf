//! From captures to the rows on mode and mirror spacing.
//! Must not fit a sweep.
//! Main functions: [`pooled`], [`rows`].

use super::{
    filled::Filled,
    notebook::{Notebook, Seen},
    pool::{Pooled, pool},
};
use crate::{
    phrase::{Saying, figure, reasons, said},
    tube::mirror_spacing,
};

/// The spacing over the captures that show two modes or more.
pub(crate) fn pooled<'a>(captures: impl IntoIterator<Item = &'a Seen>) -> Option<Pooled> {
    let values: Vec<_> = captures
        .into_iter()
        .filter(|seen| seen.finding.modes.len() >= 2)
        .filter_map(|seen| seen.glimpse.mode_spacing.map(|spacing| (spacing, seen.finding.budget.as_slice())))
        .collect();
    pool(&values)
}

/// Both rows, the spacing noted in the book; none without a spacing.
pub(crate) fn rows(pooled: Option<Pooled>, from: Saying, book: &mut Notebook) -> Option<[Filled; 2]> {
    let mut pooled = pooled?;
    if let Some(mut air) = book.air.clone() {
        air.sensitivity = pooled.measured.value;
        pooled.measured.budget.push(air);
    }
    let spacing = &pooled.measured;
    let phrase = if pooled.used == 1 { &reasons::FROM_ONE } else { &reasons::FROM_MANY };
    let mut note = phrase.with([figure(pooled.used), said(from)]);
    if pooled.left_out > 0 {
        note = reasons::LEFT_OUT.with([said(note), figure(pooled.left_out)]);
    }
    if let Some(birge) = pooled.birge.filter(|birge| *birge > 1.0) {
        note = reasons::BIRGE.with([said(note), figure(format!("{birge:.2}"))]);
    }
    let mirror = match mirror_spacing(spacing) {
        Some(mirror) => Filled::number("mirror_spacing", &mirror),
        None => Filled::absent("mirror_spacing", &reasons::SPACING_NOT_POSITIVE),
    };
    let rows = [Filled::number("mode_spacing", spacing).noted(note), mirror];
    book.spacing = Some(pooled.measured);
    Some(rows)
}
