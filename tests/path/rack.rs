//! A tube that a rack warmed: the dwell proves only that it is at rest, and what it cannot show is not judged or held.
//! Must not test how rest is found.

use tubewright::record::sheet::{Outcome, Value};

use super::bench::{Brisk, Driven};

/// Limits of a type whose author says what does not bind a tube from the rack.
const LIMITS: &str = r#"
[[limit]]
measurand = "warmup_tau"
upper     = "12 min"
severity  = "minor"
reject    = "warm-up"
rack      = "skip"
"#;

/// A brisk tube that burnt for some seconds when its run was opened; its time constant is 20 s.
fn taken_after(seconds: f64, brisk: Brisk) -> Brisk {
    let recipe = brisk.recipe.replace("cycles = 2\n", "cycles = 2\nrest_for = \"20 s\"\n");
    assert_ne!(recipe, brisk.recipe);
    Brisk { lit_for_s: Some(seconds), recipe, limits: brisk.limits.clone() + LIMITS, ..brisk }
}

fn absent(driven: &Driven, key: &str) -> String {
    match &driven.row(key).value {
        Value::Absent(why) => why.english(),
        other => panic!("{key}: {other:?}"),
    }
}

#[test]
fn a_sound_tube_passes_without_strike_or_warm_up_and_reads_as_if_struck_here() {
    let cold = Brisk::twin().drive(1);
    let (spacing, _, u_spacing) = cold.number("mode_spacing");
    for seed in 1..=2 {
        // A rack hands it over while it still walks, or when nearly all of it is done: N·e^(−t/τ) is 5.7 to 1.6 spacings.
        for age in [15.0, 25.0, 40.0] {
            let driven = taken_after(age, Brisk::twin()).drive(seed);
            let verdict = &driven.sheet.verdict;
            assert_eq!(verdict.outcome, Outcome::Pass, "{seed}, {age} s: {}", verdict.reason.english());
            for key in ["start_delay", "start_tries", "start_voltage", "warmup_tau", "warmup_ready", "walk_cycles"] {
                assert!(
                    absent(&driven, key).starts_with("taken from the rack, burning since 2026-03-02 07:59"),
                    "{key}"
                );
            }
            assert_eq!(driven.row("warmup_tau").note.english(), "not judged: from the rack");
            let (found, _, u_found) = driven.number("mode_spacing");
            assert!((found - spacing).abs() <= u_found.hypot(u_spacing), "{seed}, {age} s: {found} against {spacing}");
            // No sooner than the look the recipe asks for, and far sooner than from cold.
            let dwell = driven.sheet.dwell.unwrap();
            assert!(dwell >= 20.0 && dwell < cold.sheet.dwell.unwrap(), "{seed}, {age} s: {dwell}");
        }
    }
}

#[test]
fn a_tube_in_a_draught_is_never_at_rest() {
    // As in the demo: three times the bound, and nine tenths of the horizon.
    for seed in 1..=2 {
        let draughty = Brisk::twin().with(|tube| (tube.draught_cycles, tube.draught_period) = (3.0, 27.0));
        let driven = taken_after(60.0, draughty).drive(seed);
        assert_ne!(driven.sheet.verdict.outcome, Outcome::Pass, "{seed}");
        assert!(driven.sheet.remarks.iter().any(|remark| remark.english().contains("had not settled")), "{seed}");
        let end = driven.sheet.dwell.unwrap();
        assert!(end > 299.0, "{seed}: the dwell went on to `longest`, 5 min, not {end} s");
    }
}

#[test]
fn a_tube_at_rest_for_long_shows_no_whole_cycle_and_is_held_whatever_else_it_reads() {
    // 12·e^(−6) is 0.03 spacings: at one place of the comb nothing is judged, nor is time wasted until `longest`.
    let driven = taken_after(120.0, Brisk::twin()).drive(1);
    assert_eq!(driven.sheet.verdict.outcome, Outcome::Hold);
    let reason = driven.sheet.verdict.reason.english();
    assert!(reason.contains("no whole walk cycle was seen"), "{reason}");
    // A swap comes once a cycle: none was looked for, so that none is reported as not seen.
    absent(&driven, "swap_count");
    assert!(driven.sheet.dwell.unwrap() < 60.0);
}

#[test]
fn without_the_word_of_the_limits_what_the_rack_hides_gives_hold() {
    let brisk = taken_after(25.0, Brisk::twin());
    let brisk = Brisk { limits: brisk.limits.replace("rack      = \"skip\"\n", ""), ..brisk };
    let verdict = brisk.drive(1).sheet.verdict;
    assert_eq!(verdict.outcome, Outcome::Hold);
    let reason = verdict.reason.english();
    assert!(reason.contains("taken from the rack, burning since"), "{reason}");
}
