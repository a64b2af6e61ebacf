//! Tests of the warm-up on made-up tubes.
//! Must not read files.
//! Main functions: `warm_up`, `taken`.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::behaviour::synthetic::Synthetic;

const HORIZON: f64 = 600.0;
const BOUND: f64 = 2.0;

fn settings(nominal_spacing: f64) -> WarmupSettings {
    WarmupSettings { nominal_spacing, residual_walk: BOUND, horizon: HORIZON, cycles: 2.0 }
}

/// Five captures a second for three minutes, then one a second, until settled or `longest`; and the time of the last.
fn warm_up(tube: &Synthetic, longest: f64) -> (Warmup, f64) {
    let mut warmup = Warmup::new(settings(tube.spacing * 1.005));
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

fn taken(nominal: f64, glimpses: &[Glimpse]) -> Warmup {
    let mut warmup = Warmup::new(settings(nominal));
    glimpses.iter().for_each(|g| warmup.take(g));
    warmup.finish();
    warmup
}

/// Time at which the expected walk of the next ten minutes falls to the bound: τ·ln(N∞(1 − e^(−h/τ))/bound).
fn expected_end(tau: f64, n_infinity: f64) -> f64 {
    tau * (n_infinity * (1.0 - (-HORIZON / tau).exp()) / BOUND).ln()
}

#[test]
fn dwell_ends_where_the_formula_says() {
    for (seed, tau, n) in [(1, 200.0, 40.0), (2, 350.0, 90.0), (3, 500.0, 150.0), (4, 650.0, 60.0)] {
        let tube = Synthetic { tau, n_infinity: n, ..Synthetic::quad(seed) };
        let (warmup, end) = warm_up(&tube, 5000.0);
        let state = warmup.state();
        let (fitted, whole) = (state.tau.unwrap(), state.n_infinity.unwrap());
        // The upper prediction comes inside after the expected one; one capture and 1 % for what is not yet known.
        let expected = expected_end(tau, n);
        assert!(end > expected - 0.002 * expected && end < 1.01 * expected + 1.0, "ended {end}, expected {expected}");
        assert!((fitted.value - tau).abs() < 2.0 * fitted.expanded(), "{fitted:?}, planted {tau}");
        assert!((whole.value - n).abs() < 2.0 * whole.expanded(), "{whole:?}, planted {n}");
        let ready = state.ready.unwrap();
        assert!((ready.value - end).abs() < 0.01 * end + 1.0, "{ready:?}, ended {end}");
        assert!(
            (state.walked - tube.walked(end)).abs() < 4.0 * state.u_walked,
            "{} ± {}",
            state.walked,
            state.u_walked
        );
    }
}

#[test]
fn tau_by_thirty_per_cent_moves_tau_and_end_alike() {
    let run = |factor: f64| {
        let tube = Synthetic { tau: 400.0 * factor, ..Synthetic::quad(11) };
        let (warmup, end) = warm_up(&tube, 5000.0);
        (warmup.state().tau.unwrap(), end)
    };
    let (plain, end) = run(1.0);
    for factor in [0.7, 1.3] {
        let (moved, moved_end) = run(factor);
        let u = moved.expanded().hypot(factor * plain.expanded());
        assert!((moved.value - factor * plain.value).abs() < u, "{moved:?} {plain:?}");
        let expected = expected_end(400.0 * factor, 90.0) / expected_end(400.0, 90.0);
        // One capture a second at both ends and the margin of the prediction.
        assert!((moved_end / end - expected).abs() < 0.005, "{moved_end} / {end}, expected {expected}");
    }
}

#[test]
fn stated_uncertainties_hold() {
    // At half, one and two time constants; 40 seeds, phases noisy enough to matter.
    for share in [0.5, 1.0, 2.0] {
        let (mut tau_inside, mut whole_inside, mut bounded) = (0, 0, 0);
        for seed in 1..=40 {
            let tube = Synthetic { u_position: 8e6, tau: 300.0, n_infinity: 60.0, ..Synthetic::quad(seed) };
            let end = share * tube.tau;
            let state = taken(tube.spacing, &tube.glimpses(0.3, end, 0.5)).state();
            let inside = |m: &Measured, truth: f64| usize::from((m.value - truth).abs() < m.expanded());
            tau_inside += inside(state.tau.as_ref().unwrap(), 300.0);
            whole_inside += inside(state.n_infinity.as_ref().unwrap(), 60.0);
            let residual = tube.walked(end + HORIZON) - tube.walked(end);
            bounded += usize::from(state.residual_upper.unwrap() > residual);
        }
        // 95 % of 40 is 38; under 33 has a chance below 1 in 200.
        assert!(
            tau_inside >= 33 && whole_inside >= 33 && bounded >= 33,
            "{share}: {tau_inside} {whole_inside} {bounded}"
        );
    }
}

#[test]
fn a_fast_part_is_found_and_does_not_spoil_tau() {
    let tube = Synthetic { fast: Some((8.0, 25.0)), tau: 400.0, n_infinity: 80.0, ..Synthetic::quad(5) };
    let (warmup, end) = warm_up(&tube, 5000.0);
    let state = warmup.state();
    let tau = state.tau.unwrap();
    assert!((tau.value - 400.0).abs() < 2.0 * tau.expanded(), "{tau:?}");
    let (fast, share) = state.fast_part.unwrap();
    // Not stated with an uncertainty: 10 %.
    assert!((fast - 25.0).abs() < 2.5 && (share - 8.0 / 88.0).abs() < 0.01, "{fast} {share}");
    assert!((state.walked - tube.walked(end)).abs() < 4.0 * state.u_walked);
    // A pure exponential has none.
    assert_eq!(warm_up(&Synthetic { fast: None, ..tube }, 600.0).0.state().fast_part, None);
}

#[test]
fn either_sense_of_the_axis_any_fold_and_a_fast_start() {
    // 1.5 spacings a second at first: 0.3 between captures; a line at the cut between orders; the nominal spacing 1 %
    // off.
    for (direction, line) in [(-1.0, 2.9e9), (1.0, 2.9e9), (-1.0, 0.02e9), (1.0, 6.39e9)] {
        for mut tube in [Synthetic::quad(7), Synthetic::twin(7)] {
            tube = Synthetic { direction, line, fast: Some((13.0, 10.0)), ..tube };
            let state = taken(tube.spacing * 1.01, &tube.glimpses(0.1, 200.0, 0.2)).state();
            let truth = tube.walked(200.0) - tube.walked(0.1);
            assert!((state.cycles_seen - truth).abs() < 0.03, "{} of {truth}", state.cycles_seen);
            assert!(!state.early_unknown);
        }
    }
}

#[test]
fn a_slow_stream_says_that_early_cycles_are_unknown() {
    // One capture in 4 s: over a cycle between captures at first.
    let tube = Synthetic { n_infinity: 150.0, tau: 300.0, ..Synthetic::quad(8) };
    let mut glimpses = tube.glimpses(0.3, 1500.0, 4.0);
    let state = taken(tube.spacing, &glimpses).state();
    assert!(state.early_unknown);
    // What can be followed is right, and the fit still knows the shape.
    let tau = state.tau.unwrap();
    assert!((tau.value - 300.0).abs() < 2.0 * tau.expanded(), "{tau:?}");
    let n = state.n_infinity.unwrap();
    assert!((n.value - 150.0).abs() < 2.0 * n.expanded(), "{n:?}");
    // A long gap early on has the same effect.
    glimpses = tube.glimpses(0.3, 1500.0, 0.5);
    glimpses.retain(|g| !(20.0..90.0).contains(&g.at));
    assert!(taken(tube.spacing, &glimpses).state().early_unknown);
}

#[test]
fn hops_do_not_count_as_walk() {
    let tube = Synthetic { hops: vec![(100.1, 150e6), (150.2, -120e6), (300.3, 160e6)], ..Synthetic::quad(9) };
    let state = taken(tube.spacing, &tube.glimpses(0.3, 800.0, 0.5)).state();
    assert!((state.walked - tube.walked(800.0)).abs() < 0.03, "{} {}", state.walked, tube.walked(800.0));
    // Three steps known to a megahertz or so each: 1 %.
    assert!((state.tau.unwrap().value - 500.0).abs() < 5.0);
}

#[test]
fn the_state_does_not_depend_on_who_asked_when() {
    let tube = Synthetic::quad(10);
    let glimpses = tube.glimpses(0.3, 120.0, 0.2);
    let mut asked = Warmup::new(settings(tube.spacing));
    let mut silent = Warmup::new(settings(tube.spacing));
    for (i, glimpse) in glimpses.iter().enumerate() {
        asked.take(glimpse);
        silent.take(glimpse);
        let state = asked.state();
        if i % 97 == 0 {
            assert_eq!(state, silent.clone().state());
        }
    }
    assert_eq!(asked.state(), silent.state());
}

#[test]
fn last_cycles_and_time_left() {
    let tube = Synthetic::quad(12);
    let warmup = taken(tube.spacing, &tube.glimpses(0.3, 400.0, 0.5));
    let (from, to) = warmup.last_cycles(3.0).unwrap();
    // Half a capture of walk.
    assert!((tube.walked(to) - tube.walked(from) - 3.0).abs() < 0.03 && (to - 400.0).abs() < 0.5, "{from} {to}");
    assert_eq!(warmup.last_cycles(1000.0), None);
    let left = warmup.remaining().unwrap();
    let expected = expected_end(tube.tau, tube.n_infinity) - 400.0;
    assert!((left - expected).abs() < 0.02 * expected, "{left}, expected {expected}");
}

#[test]
fn bad_glimpses_do_no_harm() {
    let tube = Synthetic::quad(13);
    let mut glimpses = tube.glimpses(0.3, 60.0, 0.5);
    let clean = taken(tube.spacing, &glimpses).state();
    let mut nan = tube.glimpse(30.05);
    nan.modes.iter_mut().for_each(|m| m.position = f64::NAN);
    glimpses.push(nan);
    glimpses.push(Glimpse { at: f64::NAN, ..tube.glimpse(61.0) });
    glimpses.push(Glimpse { free_spectral_range: 0.0, ..tube.glimpse(61.0) });
    glimpses.push(Glimpse { at: 61.0, ..Glimpse::default() });
    assert_eq!(taken(tube.spacing, &glimpses).state(), clean);
    let nothing = taken(f64::NAN, &glimpses[..2]).state();
    assert!(!nothing.settled && nothing.tau.is_none());
    assert_eq!(Warmup::new(settings(1e9)).remaining(), None);
}
