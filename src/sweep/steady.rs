//! Whether the tube stayed as it was during the sweep: every mode's height must go from order to order as the others' do.
//! Must not look at positions: a hop within one sweep cannot be told there from the ramp's own bend.
//! Main entry: [`height_change`].

use super::{comb::Class, lines::LineFit};

/// A change counts if it exceeds this many of its standard uncertainties.
const SIGMA: f64 = 6.0;
/// Modes below this share of the strongest are too near their neighbours' tails to judge.
const LEAST_HEIGHT: f64 = 0.1;
/// Orders compared at most.
const MOST_ORDERS: i32 = 16;

/// Greatest change of one mode's height against another's from one order to another, as a share; 0 where none is significant.
///
/// * `classes`: the modes, each seen once an order. Only those clear of the noise are compared.
///
/// For every pair of orders: ln(height in one / height in the other) of each mode; what alignment and detector do to all
/// alike falls out of the difference of two modes. A hop moves modes along the gain line, so that some grow while others
/// shrink; a swap exchanges them in a polarized beam.
pub(super) fn height_change(classes: &[&Class], fit: &LineFit) -> f64 {
    let top = classes.iter().map(|c| c.height).fold(0.0, f64::max);
    let orders = || classes.iter().flat_map(|c| c.members.iter().map(|m| m.1));
    let (Some(first), Some(last)) = (orders().min(), orders().max()) else { return 0.0 };
    let mut worst = 0.0_f64;
    // A ramp shows a handful of orders; noise may invent hundreds, in which nothing is to be found.
    for a in first..=last.min(first.saturating_add(MOST_ORDERS)) {
        for b in a + 1..=last.min(a.saturating_add(MOST_ORDERS)) {
            let strong = classes.iter().filter(|c| c.height > LEAST_HEIGHT * top);
            let changes: Vec<(f64, f64)> = strong.filter_map(|class| change(class, fit, a, b)).collect();
            for (i, (one, u)) in changes.iter().enumerate() {
                for (other, v) in &changes[i + 1..] {
                    let apart = (one - other).abs();
                    if apart > SIGMA * u.hypot(*v) {
                        worst = worst.max(apart.exp_m1());
                    }
                }
            }
        }
    }
    worst
}

/// ln of a class's height in order `b` over that in order `a`, and its standard uncertainty.
fn change(class: &Class, fit: &LineFit, a: i32, b: i32) -> Option<(f64, f64)> {
    let of = |order: i32| class.members.iter().find(|m| m.1 == order).map(|m| m.0);
    let (i, j) = (of(a)?, of(b)?);
    let (low, high) = (fit.heights[i], fit.heights[j]);
    let u = (fit.u_heights[i] / low).hypot(fit.u_heights[j] / high);
    (low > 0.0 && high > 0.0 && u.is_finite()).then(|| ((high / low).ln(), u))
}
