//! The noise of the light: truths of tubes and benches to the rows of the sheet.
//! Must not know how light traces are made or measured.

use tubewright::record::{event::Happening, sheet::Value};

use crate::bench::{Brisk, Driven};

/// Strike and noise alone: nothing of it waits for a warm tube.
const RECIPE: &str = r#"
revision = 1
nominal_spacing = "999.3 MHz"
wavelength = "632.991 nm"
[[step]]
name = "strike"
do = "strike"
[[step]]
name = "noise"
do = "noise"
"#;

fn alone(brisk: Brisk) -> Brisk {
    Brisk { recipe: RECIPE.to_owned(), ..brisk }
}

#[track_caller]
fn absent(driven: &Driven, key: &str) -> String {
    match &driven.row(key).value {
        Value::Absent(reason) => reason.english(),
        other => panic!("{key}: {other:?}"),
    }
}

#[test]
fn sound_tubes_of_every_type_read_their_noise_and_ripple() {
    let (mut inside, mut n) = (0, 0);
    for (brisk, limits) in
        [(Brisk::twin(), (1e-2, 5e-3)), (Brisk::plate(), (5e-3, 3e-3)), (Brisk::quad(), (1e-2, 3e-3))]
    {
        let brisk = alone(brisk);
        for seed in 1..=6 {
            let driven = brisk.drive(seed);
            let (noise, _, expanded) = driven.number("noise_rms");
            n += 1;
            inside += u32::from((noise - brisk.truth.discharge_noise).abs() < expanded);
            // Sound tubes must stay inside the limits of their type with room to spare: half of them.
            assert!(noise + expanded < 0.5 * limits.0, "{noise} ± {expanded}");
            let (ripple, u, expanded) = driven.number("line_ripple");
            assert!((ripple - brisk.bench.supply_ripple).abs() < 4.0 * u, "{ripple} ± {u}");
            assert!(ripple + expanded < 0.5 * limits.1);
            if let Value::Number { value, .. } = driven.row("tone_level").value {
                panic!("{} of {value} at {:?}; chance is 1 in 1,000 a trace", brisk.name, driven.row("tone_frequency"));
            }
        }
    }
    // 95 % wanted of 18; 15 has a chance of 1 % below it.
    assert!(inside >= 15, "{inside} of {n}");
}

#[test]
fn a_supply_that_ripples_is_read_within_its_uncertainty_on_either_mains() {
    for (seed, mains, ripple) in [(1, 50.0, 0.014), (2, 60.0, 0.014), (3, 49.8, 0.005), (4, 50.0, 0.05)] {
        let mut brisk = alone(Brisk::twin()).with(|tube| tube.line_ripple = ripple);
        brisk.bench.mains = mains;
        let driven = brisk.drive(seed);
        let (found, _, expanded) = driven.number("line_ripple");
        assert!(
            (found - ripple.hypot(brisk.bench.supply_ripple)).abs() < expanded,
            "{found} ± {expanded} at {mains} Hz"
        );
        let note = driven.row("line_ripple").note.english();
        assert!(note.contains(&format!("{mains:.2} Hz")), "{note}");
        // The ripple is no noise.
        let (noise, _, expanded) = driven.number("noise_rms");
        assert!((noise - 2e-3).abs() < 1.5 * expanded, "{noise} ± {expanded}");
    }
}

#[test]
fn a_tone_is_named_by_what_it_does() {
    let fixed = alone(Brisk::twin()).with(|tube| (tube.tone_level, tube.tone_frequency) = (2e-3, 210e3)).drive(1);
    let (level, u, _) = fixed.number("tone_level");
    // The digitizer's mean over a sample takes 0.7 % at 210 kHz.
    assert!((level / 2e-3 - 1.0).abs() < 0.01 + 4.0 * u / 2e-3, "{level} ± {u}");
    let (frequency, u, _) = fixed.number("tone_frequency");
    assert!((frequency - 210e3).abs() < 4.0 * u, "{frequency} ± {u}");
    assert!(fixed.row("tone_level").note.english().contains("stayed"));
    // Three modes of a warming tube beat at a frequency that sweeps.
    let beats = alone(Brisk::quad()).with(|tube| tube.beat_level = 2e-3);
    let moved =
        (1..=6).filter(|seed| beats.drive(*seed).row("tone_level").note.english().contains("beat of modes")).count();
    assert!(moved >= 4, "a beat below 2 kHz is in the slow trace, taken once: {moved} of 6");
}

#[test]
fn every_trace_is_in_the_record_and_reads_again() {
    let driven = alone(Brisk::plate()).drive(7);
    let lights: Vec<_> = driven
        .events
        .iter()
        .filter_map(|event| match &event.what {
            Happening::Light(light) => Some((light.lit, light.finding.sample_rate, light.fact.files.len())),
            _ => None,
        })
        .collect();
    let (slow, fast) = (20e3, 5e6);
    let wanted = [(true, slow, 1), (true, fast, 1), (false, slow, 1), (false, fast, 1), (true, fast, 1)];
    for (found, wanted) in lights.iter().zip(wanted) {
        assert_eq!((found.0, found.2), (wanted.0, wanted.2));
        assert!((found.1 / wanted.1 - 1.0).abs() < 1e-9);
    }
    assert_eq!(lights.len(), wanted.len());
    for event in &driven.events {
        let line = serde_json::to_string(event).unwrap();
        assert!(
            line.len() < 4000 && serde_json::from_str::<tubewright::record::event::Event>(&line).unwrap() == *event
        );
    }
}

#[test]
fn what_is_missing_leaves_the_rows_empty_with_the_reason() {
    let mut brisk = alone(Brisk::twin());
    let at = brisk.station.find("[light_detector]").unwrap();
    brisk.station.truncate(at);
    assert!(absent(&brisk.drive(1), "line_ripple").contains("no light detector"));
    brisk.station.push_str("[light_detector]\nsource = \"simulated\"\nbandwidth = \"80 kHz\"\n");
    let narrow = brisk.drive(1);
    assert_eq!(absent(&narrow, "noise_rms"), "the light detector reaches 80 kHz, the band 1 MHz");
    narrow.number("line_ripple");
    // More light than the digitizer takes.
    let mut bright = alone(Brisk::twin());
    bright.bench.dark_level = 0.9;
    let driven = bright.drive(1);
    let why = absent(&driven, "noise_rms");
    assert!(why.contains("saturated") || why.contains("step"), "{why}");
}
