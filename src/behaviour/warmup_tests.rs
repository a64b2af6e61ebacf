//! Tests of the warm-up on made-up tubes.
//! Must not read files.
//! Main helper: `warm_up`.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::behaviour::synthetic::Synthetic;

const HORIZON: f64 = 600.0;
const BOUND: f64 = 2.0;

fn settings(nominal_spacing: f64) -> WarmupSettings {
    WarmupSettings { nominal_spacing, residual_walk: BOUND, horizon: HORIZON, cycles: 2.0 }
}

/// Five captures a second for three minutes, then one a second, until settled or `longest`.
fn warm_up(tube: &Synthetic, longest: f64) -> (Warmup, f64) {
    let mut warmup = Warmup::new(settings(tube.spacing));
    let mut at = 0.3;
    while at < longest {
        warmup.take(&tube.glimpse(at));
        if warmup.state().settled {
            break;
        }
        at += if at < 180.0 { 0.2 } else { 1.0 };
    }
    warmup.finish();
    (warmup, at)
}

/// Time at which the expected walk of the next ten minutes falls to the bound: τ·ln(N∞(1 − e^(−h/τ))/bound).
fn expected_end(tube: &Synthetic) -> f64 {
    tube.tau * (tube.n_infinity * (1.0 - (-HORIZON / tube.tau).exp()) / BOUND).ln()
}

#[test]
fn dwell_ends_where_the_formula_says() {
    for (seed, tau, n) in [(1, 200.0, 40.0), (2, 350.0, 90.0), (3, 500.0, 150.0), (4, 650.0, 60.0)] {
        let tube = Synthetic { tau, n_infinity: n, ..Synthetic::quad(seed) };
        let (warmup, end) = warm_up(&tube, 5000.0);
        let state = warmup.state();
        let (fitted, u) = (state.tau.as_ref().unwrap().value, state.tau.as_ref().unwrap().expanded());
        println!(
            "tau {tau} n {n}: end {end} expected {} tau {fitted} ± {u} n∞ {:?} ready {:?}",
            expected_end(&tube),
            state.n_infinity.as_ref().map(|m| (m.value, m.expanded())),
            state.ready.as_ref().map(|m| (m.value, m.expanded()))
        );
        // The upper prediction comes inside a little after the expected one; the fit is renewed every 2 % of the time.
        assert!(end > expected_end(&tube) - 0.01 * tau && end < 1.04 * expected_end(&tube) + 2.0, "end {end}");
        assert!((fitted - tau).abs() < u, "tau {fitted} ± {u}, planted {tau}");
    }
}

#[test]
fn fast_part_and_walk() {
    let tube = Synthetic { fast: Some((8.0, 25.0)), tau: 400.0, n_infinity: 80.0, ..Synthetic::quad(5) };
    let (warmup, end) = warm_up(&tube, 5000.0);
    let state = warmup.state();
    println!(
        "end {end} {} {:?} {:?} walked {} ± {} truth {}",
        expected_end(&tube),
        state.tau.as_ref().map(|m| (m.value, m.expanded())),
        state.fast_part,
        state.walked,
        state.u_walked,
        tube.walked(end)
    );
    assert!((state.walked - tube.walked(end)).abs() < 3.0 * state.u_walked + 1e-3);
}
