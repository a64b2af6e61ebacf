//! Hops and swaps that were planted are found, and nothing else is.
//! Must not test how they are told apart.

use super::bench::{Brisk, Driven};
use tubewright::{
    phantom::Incident,
    record::sheet::{Outcome, Value},
};

/// c/2L of the quad, Hz; what is pulled off it does not matter here.
const SPACING: f64 = 399.7e6;
/// Two captures of the quad's recipe, at its slower pace, s.
const TWO_CAPTURES: f64 = 0.25;
/// What a size may be off, Hz.
const SIZE: f64 = 5e6;

/// A quad whose walk is over soon: 20 of them take 20 s.
fn short_quad() -> Brisk {
    Brisk::quad().with(|tube| {
        tube.walk_cycles = 8.0;
        tube.warmup_tau = 14.0;
    })
}

/// Another tube of the lot for each seed: mirror distance within ± 0.5 mm, place of the comb and all noise of its own.
fn of_lot(brisk: Brisk, seed: u64) -> Brisk {
    brisk.with(|tube| tube.mirror_spacing += (seed as f64 - 10.5) * 5e-5)
}

/// Neither hop nor swap, and no jump that nobody owns.
#[track_caller]
fn is_quiet(driven: &Driven, seed: u64) {
    let hops = &driven.row("hop_count").value;
    assert!(matches!(hops, Value::Count { value: 0, .. }), "seed {seed}: {hops:?} {:?}", driven.hops());
    assert!(driven.hops().is_empty() && driven.swaps().is_empty());
    // A plate has one axis: there is nothing that could swap, and the row says so.
    match &driven.row("swap_count").value {
        Value::Count { value: 0, .. } => {}
        Value::Absent(reason) if driven.sheet.identity.tube_type == "brisk-plate" => {
            assert!(reason.english().contains("told apart"), "{reason:?}");
        }
        other => panic!("seed {seed}: swaps {other:?} {:?}", driven.swaps()),
    }
}

fn sound(brisk: fn() -> Brisk, seeds: impl Iterator<Item = u64>) {
    for seed in seeds {
        let driven = of_lot(brisk(), seed).drive(seed);
        is_quiet(&driven, seed);
        assert_eq!(driven.sheet.verdict.outcome, Outcome::Pass, "seed {seed}: {:?}", driven.sheet.verdict);
    }
}

#[test]
fn planted_hops_and_swaps_are_found_at_their_times() {
    // One hop is larger than half a spacing, one larger than a whole one: known modulo one spacing.
    let hops = [(12.03, 150e6), (20.41, -260e6), (31.77, 490e6)];
    let swaps = [16.62, 25.35];
    for seed in 1..=3 {
        let incidents = hops.map(|(at, size)| Incident::Hop { at, size }).into_iter();
        let incidents = incidents.chain(swaps.map(|at| Incident::Swap { at })).collect();
        let driven = Brisk::quad().with(|tube| tube.incidents = incidents).drive(seed);
        assert_eq!(driven.count("hop_count"), 3, "seed {seed}: {:?}", driven.hops());
        assert_eq!(driven.count("swap_count"), 2, "seed {seed}: {:?}", driven.swaps());
        for ((at, size), (found_at, found)) in hops.iter().zip(driven.hops()) {
            assert!((found_at - at).abs() <= TWO_CAPTURES, "seed {seed}: hop at {found_at} s, planted at {at} s");
            let off = (found - size) / SPACING;
            let off = (off - off.round()) * SPACING;
            assert!(off.abs() <= SIZE, "seed {seed}: hop of {found} Hz, planted {size} Hz");
        }
        for (at, found_at) in swaps.iter().zip(driven.swaps()) {
            assert!((found_at - at).abs() <= TWO_CAPTURES, "seed {seed}: swap at {found_at} s, planted at {at} s");
        }
        let (found_at, found) = driven.hops()[0];
        let words = format!("at {found_at:.1} s ({:+.0} MHz)", found / 1e6);
        let note = driven.row("hop_count").note.english();
        assert!(note.contains(&words), "`{words}` is not in `{note}`");
        let (note, words) = (driven.row("swap_count").note.english(), format!("at {:.1} s", driven.swaps()[0]));
        assert!(note.contains(&words), "`{words}` is not in `{note}`");
        // A limit on hops fails the tube; it is no matter for a hold.
        assert_eq!(driven.sheet.verdict.outcome, Outcome::Fail);
        assert_eq!(driven.sheet.verdict.reject_code.as_deref(), Some("hops"));
    }
}

#[test]
fn ten_sound_quads_are_quiet() {
    sound(short_quad, 1..=10);
}

#[test]
fn ten_more_sound_quads_are_quiet() {
    sound(short_quad, 11..=20);
}

#[test]
fn twenty_sound_twins_are_quiet() {
    sound(Brisk::twin, 1..=20);
}

#[test]
fn twenty_sound_plates_are_quiet() {
    sound(Brisk::plate, 1..=20);
}

#[test]
fn what_befalls_the_bench_is_no_hop_and_no_swap() {
    let lost = |at, lasts| Incident::Lost { at, lasts };
    let knock = |at, to, lasts| Incident::Knock { at, to, lasts };
    let cases = [
        ("a capture lost", vec![lost(9.95, 0.1)]),
        ("two seconds lost", vec![lost(12.0, 2.0)]),
        ("a knock that halves one capture", vec![knock(9.95, 0.5, 0.1)]),
        ("a knock that lasts", vec![knock(11.0, 0.3, 4.0)]),
        ("all of them", vec![lost(6.0, 0.3), knock(8.0, 0.5, 0.2), lost(13.0, 1.0), knock(13.5, 0.4, 2.0)]),
    ];
    for (what, incidents) in cases {
        let lossy = incidents.iter().any(|incident| matches!(incident, Incident::Lost { .. }));
        let driven = short_quad().with(|tube| tube.incidents = incidents).drive(21);
        println!("{what}");
        is_quiet(&driven, 21);
        // The case happened at all: what was lost is said on the sheet.
        assert_eq!(driven.sheet.remarks.iter().any(|it| it.english().contains("could not be read")), lossy, "{what}");
    }
}

#[test]
fn a_jump_of_the_interferometer_is_not_put_down_to_the_tube() {
    for (seed, size) in [(22, 170e6), (23, -120e6)] {
        let driven = short_quad().with(|tube| tube.incidents = vec![Incident::Jump { at: 12.04, size }]).drive(seed);
        is_quiet(&driven, seed);
    }
}
