//! From captures to the rows on mode and mirror spacing.
//! Must not fit a sweep.
//! Main functions: [`pooled`], [`mirror_spacing`].

use super::{
    filled::Filled,
    notebook::{Notebook, Seen},
    pool::{Pooled, pool},
};
use crate::{
    constants::{MODE_PULLING, SPEED_OF_LIGHT},
    uncertainty::{BudgetLine, Evaluation, Measured},
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

/// L = c/(2 Δν (1 + p)): gain dispersion shrinks the comb by p, [`MODE_PULLING`]; n = 1 in a sealed low-pressure tube.
pub(crate) fn mirror_spacing(spacing: &Measured) -> Measured {
    let length = SPEED_OF_LIGHT.value / (2.0 * spacing.value * (1.0 + MODE_PULLING.value));
    let mut mirror = spacing.scaled(-length / spacing.value);
    mirror.value = length;
    let mut pulling = BudgetLine::direct(
        "mode pulling",
        "correction for mode pulling",
        Evaluation::TypeB,
        MODE_PULLING.u_value,
        f64::INFINITY,
    );
    pulling.sensitivity = -length / (1.0 + MODE_PULLING.value);
    mirror.budget.push(pulling);
    mirror
}

/// Both rows, the spacing noted in the book; none without a spacing.
pub(crate) fn rows(pooled: Option<Pooled>, from: &str, book: &mut Notebook) -> Option<[Filled; 2]> {
    let pooled = pooled?;
    let spacing = &pooled.measured;
    let mut note = format!("from {} capture{} {from}", pooled.used, if pooled.used == 1 { "" } else { "s" });
    if pooled.left_out > 0 {
        note += &format!(", {} that stood apart left out", pooled.left_out);
    }
    if let Some(birge) = pooled.birge.filter(|birge| *birge > 1.0) {
        note += &format!("; Birge ratio {birge:.2}");
    }
    let rows = [
        Filled::number("mode_spacing", spacing).noted(note),
        Filled::number("mirror_spacing", &mirror_spacing(spacing)),
    ];
    book.spacing = Some(pooled.measured);
    Some(rows)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn four_hundred_megahertz_is_375_millimetres() {
        let line = BudgetLine::direct("scatter", "", Evaluation::TypeA, 0.4e6, 10.0);
        let mirror = mirror_spacing(&Measured::with_line(0.4e9, line));
        // c/2Δν = 0.374741 m; 1 ‰ of pulling takes 0.374 mm.
        assert!((mirror.value - 0.374_366).abs() < 2e-6, "{}", mirror.value);
        // 1 ‰ and 0.5 ‰ in quadrature.
        assert!((mirror.u() / mirror.value - 1.118e-3).abs() < 2e-6);
    }
}
