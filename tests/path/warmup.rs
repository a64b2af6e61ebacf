//! Time constant and end of the dwell follow the tube's own, whatever that is: the dwell is no timer.
//! Must not test how the walk is fitted.

use super::bench::{Brisk, Driven};

/// A time constant, s, of which others are 30 % to either side.
const TAU: f64 = 28.0;
/// Walk from cold to rest of the brisk tubes, mode spacings.
const N_INFINITY: f64 = 12.0;
/// The recipes' bound on the walk that is left, mode spacings, and over what time, s.
const BOUND: f64 = 1.0;
const HORIZON: f64 = 30.0;

/// A tube with another time constant, and all else alike.
fn with_tau(brisk: &Brisk, tau: f64, seed: u64) -> Driven {
    brisk.clone().with(|tube| tube.warmup_tau = tau).drive(seed)
}

/// When the walk that is left over the horizon comes down to the bound, s: N∞·e^(−t/τ)(1 − e^(−h/τ)) = bound, for t.
fn expected_end(tau: f64) -> f64 {
    tau * (N_INFINITY * -(-HORIZON / tau).exp_m1() / BOUND).ln()
}

/// Time constant and end of the dwell against the truth; `step`: of the recipe's later grid, s.
#[track_caller]
fn follows(driven: &Driven, tau: f64, step: f64) {
    let (found, _, expanded) = driven.number("warmup_tau");
    assert!((found - tau).abs() <= expanded, "τ {tau} s: {found} ± {expanded}");
    // A tolerance that lets nearly anything through would not show that the time constant is measured.
    assert!(expanded < 0.01 * tau, "τ {tau} s is known to ± {expanded}");
    let (ready, _, expanded) = driven.number("warmup_ready");
    let expected = expected_end(tau);
    assert!((ready - expected).abs() <= expanded, "τ {tau} s: ready at {ready} ± {expanded}, expected {expected}");
    let end = driven.sheet.dwell.unwrap();
    // The dwell ends with a capture, the first after the prediction came inside its bound.
    assert!((end - expected).abs() <= expanded + step, "τ {tau} s: the dwell ended at {end}, expected {expected}");
}

/// 30 % either way: the ratio found is 1.3 within its own expanded uncertainty, and so is the end of the dwell.
fn moves_by_thirty_percent(brisk: &Brisk, seed: u64, step: f64) {
    let [less, same, more] = [TAU * 0.7, TAU, TAU * 1.3].map(|tau| {
        let driven = with_tau(brisk, tau, seed);
        follows(&driven, tau, step);
        driven
    });
    let (middle, _, u_middle) = same.number("warmup_tau");
    for (driven, factor) in [(&less, 0.7), (&more, 1.3)] {
        let (found, _, expanded) = driven.number("warmup_tau");
        let (ratio, u_ratio) = (found / middle, (expanded / found).hypot(u_middle / middle) * found / middle);
        assert!((ratio - factor).abs() <= u_ratio, "moved by {ratio} ± {u_ratio}, expected {factor}");
    }
    let later = more.sheet.dwell.unwrap() - less.sheet.dwell.unwrap();
    let expected = expected_end(TAU * 1.3) - expected_end(TAU * 0.7);
    assert!((later - expected).abs() < 3.0 * step, "the dwell grew by {later} s, expected {expected} s");
}

#[test]
fn a_twin_is_followed() {
    for seed in [1, 2] {
        moves_by_thirty_percent(&Brisk::twin(), seed, 0.25);
    }
}

#[test]
fn a_quad_is_followed() {
    moves_by_thirty_percent(&Brisk::quad(), 3, 0.125);
}

#[test]
fn a_longer_walk_ends_later_too() {
    let brisk = Brisk::twin().with(|tube| tube.walk_cycles = 2.0 * N_INFINITY);
    let end = brisk.drive(4).sheet.dwell.unwrap();
    let usual = Brisk::twin().drive(4).sheet.dwell.unwrap();
    // Twice the walk takes τ·ln 2 longer to settle; both ends fall on the grid of 250 ms and may be a capture late.
    let later = brisk.truth.warmup_tau * 2_f64.ln();
    assert!((end - usual - later).abs() <= 0.5, "{usual} s, then {end} s; expected {later} s more");
}
