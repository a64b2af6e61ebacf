//! Tests of hops and swaps on made-up tubes.
//! Must not read files.
//! Main function: `assert_times`.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::behaviour::synthetic::{Noise, Synthetic};

/// One capture every `EVERY` s.
const EVERY: f64 = 0.5;

fn assert_times(found: &[f64], planted: &[f64]) {
    assert_eq!(found.len(), planted.len(), "found {found:?}, planted {planted:?}");
    for (f, p) in found.iter().zip(planted) {
        // Within two captures, by definition.
        assert!((f - p).abs() <= 2.0 * EVERY, "found {found:?}, planted {planted:?}");
    }
}

fn hop_times(watched: &Watched) -> Vec<f64> {
    watched.hops.iter().map(|h| h.at).collect()
}

fn swap_times(watched: &Watched) -> Vec<f64> {
    watched.swaps.iter().map(|s| s.at).collect()
}

#[test]
fn planted_hops_and_swaps_of_a_quad() {
    for (seed, direction) in (1..=6).flat_map(|seed| [(seed, -1.0), (seed, 1.0)]) {
        let hops = vec![(300.3, 60e6), (520.2, -150e6), (700.1, 190e6)];
        let tube = Synthetic { hops: hops.clone(), swaps: vec![410.1, 600.3], direction, ..Synthetic::quad(seed) };
        let watched = watch(&tube.glimpses(0.3, 900.0, EVERY), tube.spacing);
        assert_times(&hop_times(&watched), &[300.3, 520.2, 700.1]);
        assert_times(&swap_times(&watched), &[410.1, 600.3]);
        assert!(watched.unattributed.is_empty() && watched.interferometer.is_empty(), "{watched:?}");
        for (found, planted) in watched.hops.iter().zip(&hops) {
            let planted = -direction * planted.1;
            assert!((found.size - planted).abs() < 4.0 * found.u_size, "{found:?}, planted {planted}");
        }
        let walked = tube.walked(900.0) - tube.walked(0.3);
        assert!((watched.cycles - walked).abs() < 0.05, "{} cycles, walked {walked}", watched.cycles);
    }
}

#[test]
fn sound_tubes_show_nothing() {
    for seed in 1..=20 {
        for tube in [Synthetic::quad(seed), Synthetic::twin(seed)] {
            let watched = watch(&tube.glimpses(0.3, 900.0, EVERY), tube.spacing);
            let none = watched.hops.len() + watched.unattributed.len() + watched.interferometer.len();
            assert_eq!((none, watched.swaps.len()), (0, 0), "seed {seed}: {watched:?}");
            assert!(watched.axes_seen);
        }
    }
}

#[test]
fn lost_captures_and_knocks_show_nothing() {
    for seed in 1..=5 {
        let tube = Synthetic {
            knocks: vec![(200.0, 201.2, 0.4), (400.0, 401.2, 1.3), (600.0, f64::INFINITY, 0.7)],
            ..Synthetic::quad(seed)
        };
        let mut glimpses = tube.glimpses(0.3, 900.0, EVERY);
        glimpses.retain(|g| !(300.0..303.0).contains(&g.at) && !(500.0..501.0).contains(&g.at));
        for glimpse in glimpses.iter_mut().filter(|g| (700.0..702.0).contains(&g.at)) {
            glimpse.modes.clear();
        }
        let watched = watch(&glimpses, tube.spacing);
        let none = watched.hops.len() + watched.unattributed.len() + watched.interferometer.len();
        assert_eq!((none, watched.swaps.len()), (0, 0), "seed {seed}: {watched:?}");
    }
}

#[test]
fn a_jump_of_the_interferometer_is_not_the_tubes() {
    for seed in 1..=5 {
        for size in [130e6, -250e6, 900e6] {
            let tube = Synthetic { shifts: vec![(500.2, size)], ..Synthetic::quad(seed) };
            let watched = watch(&tube.glimpses(0.3, 900.0, EVERY), tube.spacing);
            assert!(watched.hops.is_empty() && watched.unattributed.is_empty(), "seed {seed} {size}: {watched:?}");
            assert_times(&watched.interferometer.iter().map(|h| h.at).collect::<Vec<_>>(), &[500.2]);
        }
    }
}

#[test]
fn a_twin_with_a_hop_and_a_swap() {
    for seed in 1..=5 {
        let tube = Synthetic { hops: vec![(700.1, 300e6)], swaps: vec![500.2], ..Synthetic::twin(seed) };
        let watched = watch(&tube.glimpses(0.3, 900.0, EVERY), tube.spacing);
        // With one mode in sight nobody can say whose a jump is: it must not be lost, and must not be called the
        // interferometer's.
        let seen: Vec<f64> = watched.hops.iter().chain(&watched.unattributed).map(|h| h.at).collect();
        assert_times(&seen, &[700.1]);
        assert_times(&swap_times(&watched), &[500.2]);
    }
}

#[test]
fn a_cluster_across_the_fold() {
    // Middle of the line at the very cut between orders.
    let tube = Synthetic { line: 0.1e9, hops: vec![(520.2, -150e6)], swaps: vec![410.1], ..Synthetic::quad(3) };
    let watched = watch(&tube.glimpses(0.3, 900.0, EVERY), tube.spacing * 1.01);
    assert_times(&hop_times(&watched), &[520.2]);
    assert_times(&swap_times(&watched), &[410.1]);
}

#[test]
fn a_drifting_interferometer_hides_nothing() {
    // 1.8 GHz over the watch, several times across the fold of a narrow instrument.
    for (drift, range) in [(2e6, 6.4e9), (-2e6, 6.4e9), (2e6, 3.1e9)] {
        let tube = Synthetic {
            drift,
            free_spectral_range: range,
            hops: vec![(300.3, 60e6), (520.2, -150e6)],
            shifts: vec![(700.1, 190e6)],
            swaps: vec![410.1],
            ..Synthetic::quad(4)
        };
        let watched = watch(&tube.glimpses(0.3, 900.0, EVERY), tube.spacing);
        assert_times(&hop_times(&watched), &[300.3, 520.2]);
        assert_times(&swap_times(&watched), &[410.1]);
        assert_eq!((watched.unattributed.len(), watched.interferometer.len()), (0, 1), "{watched:?}");
    }
}

#[test]
fn swaps_at_one_place_under_the_line_every_cycle() {
    // Two swaps a cycle would cancel in mode identity over the cycle; one each cycle at the same comb phase is the
    // common case.
    let tube = Synthetic::quad(6);
    let phase_at = |n: f64| -tube.tau * (1.0 - n / tube.n_infinity).ln();
    let swaps: Vec<f64> = (20..60).map(|n| phase_at(f64::from(n) + 0.1) + 1e-3).collect();
    let (from, to) = (phase_at(19.6), phase_at(59.6));
    let tube = Synthetic { swaps: swaps.clone(), ..tube };
    let watched = watch(&tube.glimpses(from, to, EVERY), tube.spacing);
    assert_times(&swap_times(&watched), &swaps);
    // Comb 0.3 GHz above the middle at the start: after n + 0.1 cycles a mode lies 0.3 − 0.03997 − 0.3997 GHz off. One
    // capture of walk, and a middle known to some tens of megahertz.
    let planted = 0.3e9 - 0.1 * tube.spacing - tube.spacing;
    for swap in &watched.swaps {
        assert!((swap.detuning.unwrap() - planted).abs() < 80e6, "{swap:?}, planted {planted}");
    }
}

#[test]
fn nothing_from_nothing() {
    assert_eq!(watch(&[], 400e6), Watched::default());
    let dark = Glimpse { at: 1.0, ..Glimpse::default() };
    assert_eq!(watch(&[dark.clone(), dark], f64::NAN), Watched::default());
}

#[test]
fn events_anywhere_are_found_and_attributed() {
    let mut noise = Noise(77);
    let mut share = || (noise.normal() / 2.0).tanh().abs();
    for seed in 1..=20 {
        let sizes = [30e6 + 140e6 * share(), -30e6 - 140e6 * share(), 100e6];
        let times = [40.0 + 100.0 * share(), 250.0 + 200.0 * share(), 620.0 + 100.0 * share()];
        let swaps = vec![160.0 + 50.0 * share(), 500.0 + 80.0 * share()];
        let tube = Synthetic {
            drift: 1.5e6 * share(),
            u_height: 0.03,
            u_position: 1.5e6,
            hops: times.into_iter().zip(sizes).collect(),
            swaps: swaps.clone(),
            ..Synthetic::quad(seed)
        };
        let mut glimpses = tube.glimpses(0.3, 180.0, 0.2);
        glimpses.extend(tube.glimpses(180.2, 900.0, EVERY));
        let watched = watch(&glimpses, tube.spacing);
        assert_times(&hop_times(&watched), &times);
        assert_times(&swap_times(&watched), &swaps);
        assert!(watched.unattributed.is_empty() && watched.interferometer.is_empty(), "seed {seed}: {watched:?}");
    }
}
