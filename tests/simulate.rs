//! `simulate` through the built program: same seed, same bytes; nothing written over; what it writes measures as it says.
//! Must not look into the phantom.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod contract;
mod program;

use std::fs;

use program::Place;
use serde_json::Value;

/// Stated uncertainties that an error may be. Of some fifty captures one in a thousand errs by more.
const COVERAGE: f64 = 3.0;

/// Names and bytes of what a folder holds.
fn contents(place: &Place, folder: &str) -> Vec<(String, Vec<u8>)> {
    let mut files: Vec<_> = fs::read_dir(place.join(folder))
        .unwrap()
        .map(|entry| entry.unwrap())
        .map(|entry| (entry.file_name().into_string().unwrap(), fs::read(entry.path()).unwrap()))
        .collect();
    files.sort();
    files
}

fn simulate(place: &Place, folder: &str, more: &[&str]) -> Vec<(String, Vec<u8>)> {
    place.run(&[&["simulate", folder, "--captures", "3"][..], more].concat()).ends(0, &["3 captures written"]);
    contents(place, folder)
}

#[test]
fn the_same_seed_gives_the_same_bytes_and_another_seed_others() {
    let place = Place::new();
    let first = simulate(&place, "a", &["--seed", "7"]);
    assert_eq!(
        first.iter().map(|f| f.0.as_str()).collect::<Vec<_>>(),
        ["c00000.csv", "c00001.csv", "c00002.csv", "truth.json"]
    );
    assert!(first == simulate(&place, "b", &["--seed", "7"]));
    let other = simulate(&place, "c", &["--seed", "8"]);
    for (mine, its) in first.iter().zip(&other) {
        assert!(mine.0 == its.0 && mine.1 != its.1, "{} is the same with another seed", mine.0);
    }
}

#[test]
fn nothing_is_written_over() {
    let place = Place::new();
    simulate(&place, "a", &[]);
    let before = contents(&place, "a");
    place.run(&["simulate", "a", "--seed", "2"]).ends(32, &["nothing is written over"]).leaves_nothing();
    assert!(before == contents(&place, "a"));
    // One file in the way is enough, and then none is written.
    place.write("b/c00002.csv", "mine");
    place.run(&["simulate", "b", "--captures", "5"]).ends(32, &["c00002.csv"]).leaves_nothing();
    place.write("file", "no folder");
    place.run(&["simulate", "file"]).ends(32, &["file"]).leaves_nothing();
}

#[test]
fn what_no_tube_can_be_is_refused_by_name() {
    let place = Place::new();
    place.run(&["simulate", "a", "--type", "octa-900"]).ends(30, &["octa-900", "quad-375"]).leaves_nothing();
    place.run(&["simulate", "a", "--length", "3 m"]).ends(30, &["--length"]).leaves_nothing();
    place.run(&["simulate", "a", "--noise", "2 mW"]).ends(2, &["2 mW"]).leaves_nothing();
}

#[test]
fn the_truth_says_that_it_is_simulated_and_what_was_planted() {
    let place = Place::new();
    let planted = ["--hop", "600ms=60MHz", "--swap", "1 s", "--length", "350 mm", "--off-axis", "5 %"];
    simulate(&place, "a", &planted);
    let truth: Value = serde_json::from_slice(&fs::read(place.join("a/truth.json")).unwrap()).unwrap();
    assert_eq!(truth["note"], "Simulated bench: not a measurement of a tube");
    assert_eq!((&truth["hops"][0][0], &truth["hops"][0][1]), (&0.6.into(), &60e6.into()));
    assert_eq!(truth["swaps_s"][0], 1.0);
    // Millimetres to metres may cost the last bit.
    assert!((truth["mirror_spacing_m"].as_f64().unwrap() - 0.35).abs() < 1e-15);
    assert_eq!(truth["captures"].as_array().unwrap().len(), 3);
}

/// Measures a folder of captures; the spacings that were found and the truth.
fn spacings(more: &[&str]) -> (Vec<(String, f64, f64)>, f64) {
    let place = Place::new();
    let arguments = ["simulate", "made", "--captures", "12", "--every", "2 s", "--samples", "4000"];
    place.run(&[&arguments[..], more].concat()).ends(0, &[]);
    let truth: Value = serde_json::from_slice(&fs::read(place.join("made/truth.json")).unwrap()).unwrap();
    let names: Vec<String> = (0..12).map(|k| format!("made/c{k:05}.csv")).collect();
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    let fsr = truth["free_spectral_range_hz"].as_f64().unwrap();
    let given = format!("{fsr} Hz");
    let ran = place.run(&[&["measure", "--format", "json", "--fsr", &given][..], &names].concat());
    ran.is_calm();
    let found = ran.out.lines().map(|line| contract::check(line, fsr).unwrap());
    let spacings = found.filter_map(|found| found.mode_spacing.map(|(value, u)| (found.capture, value, u))).collect();
    (spacings, truth["mode_spacing_hz"].as_f64().unwrap())
}

/// Every capture of a tube that has two modes or more measures as the truth says, and its uncertainty says something.
#[track_caller]
fn measures_as_made(least: usize, u_at_most: f64, more: &[&str]) {
    let (found, truth) = spacings(more);
    assert!(found.len() >= least, "{more:?}: only {} of 12 measured", found.len());
    let off: Vec<f64> = found.iter().map(|(_, value, u)| (value - truth) / u).collect();
    let faults: Vec<_> = found.iter().zip(&off).filter(|(_, off)| off.abs() > COVERAGE).collect();
    assert!(faults.is_empty(), "{more:?}, truth {truth}: (capture, spacing, u) and error over u: {faults:?}");
    let mut shares: Vec<f64> = found.iter().map(|(_, _, u)| u / truth).collect();
    shares.sort_by(f64::total_cmp);
    assert!(shares[shares.len() / 2] <= u_at_most, "{more:?}: u over spacing: {shares:?}");
}

#[test]
fn four_modes_measure_as_made() {
    measures_as_made(12, 5e-3, &[]);
    measures_as_made(12, 5e-3, &["--length", "350 mm", "--seed", "3"]);
}

#[test]
fn three_modes_of_a_plate_tube_measure_as_made() {
    measures_as_made(12, 5e-3, &["--type", "plate-250", "--seed", "4"]);
}

#[test]
fn two_modes_of_a_twin_measure_as_made() {
    // With one mode there is no spacing: a quarter of the captures shows two at this gain. Two modes leave the bend of
    // the ramp to a parabola: 3 %.
    measures_as_made(3, 3e-2, &["--type", "twin-150", "--gain-ratio", "2.2", "--seed", "5"]);
}

#[test]
fn more_orders_noise_steps_and_a_slow_detector_measure_as_made() {
    measures_as_made(12, 2e-3, &["--orders", "3.3", "--seed", "6"]);
    measures_as_made(12, 5e-3, &["--noise", "3 %", "--seed", "7"]);
    measures_as_made(12, 5e-3, &["--bits", "8", "--seed", "8"]);
    measures_as_made(12, 5e-3, &["--rising", "85 %", "--detector-pole", "20 us", "--seed", "9"]);
}
