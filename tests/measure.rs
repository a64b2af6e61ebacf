//! The contract of `measure`, on captures that `simulate` makes, through the built program.
//! Must not judge how well a sweep is measured: `independent` and `real` do.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod contract;
mod program;

use std::fs;

use contract::Found;
use program::{Place, Ran};

/// Free spectral range of the simulated bench, Hz.
const FSR: f64 = 6.4e9;

/// A place with captures `made/c00000.csv` … of a four-mode tube.
fn made(captures: u32, more: &[&str]) -> Place {
    let place = Place::new();
    let captures = captures.to_string();
    let arguments = ["simulate", "made", "--captures", &captures, "--every", "5 s", "--samples", "4000"];
    place.run(&[&arguments[..], more].concat()).ends(0, &[]);
    place
}

fn measure(place: &Place, more: &[&str]) -> Ran {
    place.run(&[&["measure", "--format", "json", "--fsr", "6.4GHz"][..], more].concat())
}

/// Every result, each held to the contract.
fn results(ran: &Ran) -> Vec<Found> {
    ran.out.lines().map(|line| contract::check(line, FSR).unwrap()).collect()
}

/// The one result of a capture that can be measured.
#[track_caller]
fn only(ran: &Ran) -> Found {
    ran.ends(0, &[]);
    let [found] = results(ran).try_into().unwrap();
    found
}

#[test]
fn one_object_a_capture_in_the_order_given() {
    let place = made(3, &[]);
    let ran = measure(&place, &["made/c00002.csv", "made/c00000.csv", "made/c00001.csv"]);
    ran.ends(0, &[]);
    let found = results(&ran);
    let names: Vec<&str> = found.iter().map(|found| found.capture.as_str()).collect();
    assert_eq!(names, ["made/c00002.csv", "made/c00000.csv", "made/c00001.csv"]);
    for found in found {
        let (spacing, u) = found.spacing();
        assert!((spacing - 399.3e6).abs() < 3.0 * u, "{found:?}");
        assert_eq!((found.mode_count, found.modes.len(), found.off_axis.len()), (Some(4), 4, 0));
    }
    assert_eq!(ran.err, "", "talk without a reason");
}

#[test]
fn the_same_input_gives_the_same_bytes_but_for_the_time_it_took() {
    let place = made(2, &[]);
    let said = || {
        let ran = measure(&place, &["made/c00000.csv", "made/c00001.csv"]);
        let without = |line: &str| line.split(",\"computed_in_s\":").next().unwrap().to_owned();
        ran.out.lines().map(without).collect::<Vec<_>>()
    };
    assert_eq!(said(), said());
}

/// Lines of samples of a made capture: time, ramp, photodiode, crossed.
fn samples(place: &Place) -> Vec<Vec<String>> {
    let text = fs::read_to_string(place.join("made/c00000.csv")).unwrap();
    let is_data = |line: &&str| line.starts_with(|c: char| c.is_ascii_digit());
    text.lines().filter(is_data).map(|line| line.split(',').map(str::to_owned).collect()).collect()
}

fn table(samples: &[Vec<String>], head: &str, columns: &[usize]) -> String {
    let row = |cells: &Vec<String>| columns.iter().map(|&c| cells[c].as_str()).collect::<Vec<_>>().join(",");
    samples.iter().fold(head.to_owned(), |text, cells| text + &row(cells) + "\n")
}

/// The result of the capture with its first photodiode alone.
fn without_crossed(place: &Place, samples: &[Vec<String>]) -> Found {
    place.write("plain.csv", table(samples, "time_s,ramp_V,photodiode_V\n", &[0, 1, 2]));
    only(&measure(place, &["plain.csv"]))
}

/// The same samples give the same spacing, whatever the layout.
#[track_caller]
fn same_spacing(found: &Found, plain: &Found) {
    let ((a, u), (b, _)) = (found.spacing(), plain.spacing());
    // The time base is read from other digits: far below what is stated.
    assert!((a - b).abs() < 1e-3 * u, "{a} and {b}");
}

#[test]
fn columns_say_which_column_is_which() {
    let place = made(1, &[]);
    let plain = only(&measure(&place, &["made/c00000.csv"]));
    let samples = samples(&place);
    // No head, photodiode first: the crossed photodiode stands where a ramp might.
    place.write("turned.csv", table(&samples, "", &[2, 3, 1, 0]));
    let columns = "time=4,ramp=3,photodiode=1,crossed=2";
    same_spacing(&only(&measure(&place, &["--columns", columns, "turned.csv"])), &plain);
    // The ramp in a file of its own, and no crossed photodiode.
    let plain = without_crossed(&place, &samples);
    place.write("light.csv", table(&samples, "", &[0, 2]));
    place.write("push.csv", table(&samples, "", &[0, 1]));
    let columns = "time=1,ramp=push.csv:2,photodiode=2";
    let found = only(&measure(&place, &["--columns", columns, "light.csv", "push.csv"]));
    same_spacing(&found, &plain);
    assert_eq!(found.capture, "light.csv");
}

#[test]
fn every_channel_may_be_in_a_file_of_its_own() {
    let place = made(1, &[]);
    let samples = samples(&place);
    let plain = without_crossed(&place, &samples);
    place.write("light.csv", table(&samples, "", &[0, 2]));
    place.write("push.csv", table(&samples, "", &[0, 1]));
    let columns = "time=push.csv:1,ramp=push.csv:2,photodiode=light.csv:2";
    same_spacing(&only(&measure(&place, &["--columns", columns, "light.csv", "push.csv"])), &plain);
}

#[test]
fn wrong_columns_are_wrong_usage() {
    let place = made(1, &[]);
    let ran = measure(&place, &["--columns", "time=1,push=2", "made/c00000.csv"]);
    ran.ends(2, &["push"]).leaves_nothing();
    let ran = measure(&place, &["--columns", "time=1,ramp=2,photodiode=9", "made/c00000.csv"]);
    ran.ends(30, &["9"]).leaves_nothing();
}

#[test]
fn files_named_as_channels_are_one_capture() {
    let place = made(1, &[]);
    let samples = samples(&place);
    let plain = without_crossed(&place, &samples);
    place.write("tube7CH1.csv", table(&samples, "time_s,photodiode_V\n", &[0, 2]));
    place.write("tube7CH2.csv", table(&samples, "time_s,ramp_V\n", &[0, 1]));
    for order in [["tube7CH1.csv", "tube7CH2.csv"], ["tube7CH2.csv", "tube7CH1.csv"]] {
        let found = only(&measure(&place, &order));
        same_spacing(&found, &plain);
        assert!(order.contains(&found.capture.as_str()));
    }
}

#[test]
fn one_channel_given_alone_finds_the_other_beside_it_or_says_that_it_is_missing() {
    let place = made(1, &[]);
    let samples = samples(&place);
    let plain = without_crossed(&place, &samples);
    place.write("both/tube7CH1.csv", table(&samples, "time_s,photodiode_V\n", &[0, 2]));
    place.write("both/tube7CH2.csv", table(&samples, "time_s,ramp_V\n", &[0, 1]));
    place.write("both/tube8CH2.csv", table(&samples, "time_s,ramp_V\n", &[0, 1]));
    for given in ["both/tube7CH1.csv", "both/tube7CH2.csv"] {
        let found = only(&measure(&place, &[given]));
        same_spacing(&found, &plain);
        assert!(found.capture == given && found.warns("which lies beside it"), "{:?}", found.warnings);
    }
    // What is said of one half depends on what it gives alone; that the other is missing is said whatever it gives.
    place.write("half/tube7CH1.csv", table(&samples, "time_s,photodiode_V\n", &[0, 2]));
    let found = results(&measure(&place, &["half/tube7CH1.csv"])).remove(0);
    assert!(found.warns("no other lies beside it"), "{found:?}");
    // A file that holds every channel lacks nothing, whatever its name.
    place.write("whole/tube7CH1.csv", table(&samples, "time_s,ramp_V,photodiode_V\n", &[0, 1, 2]));
    assert!(!only(&measure(&place, &["whole/tube7CH1.csv"])).warns("beside it"));
}

#[test]
fn one_refusal_does_not_stop_the_others_and_the_highest_status_counts() {
    let place = made(2, &[]);
    let flat: String = (0..2000).fold("time_s,ramp_V,photodiode_V\n".to_owned(), |text, i| {
        text + &format!(
            "{:.6},{:.3},{:.4}\n",
            f64::from(i) * 1e-5,
            f64::from(i) * 5e-3,
            f64::from(i * 7919 % 13) * 1e-4
        )
    });
    place.write("dark.csv", flat);
    place.write("empty.csv", "");
    place.write("words.csv", "no numbers here\nnone at all\n");
    let ran =
        measure(&place, &["made/c00000.csv", "dark.csv", "missing.csv", "empty.csv", "words.csv", "made/c00001.csv"]);
    ran.ends(30, &[]).leaves_nothing();
    let found = results(&ran);
    assert_eq!(found.len(), 6);
    let refused: Vec<bool> = found.iter().map(|found| found.refused.is_some()).collect();
    assert_eq!(refused, [false, true, true, true, true, false]);
    let why = |k: usize| found[k].refused.clone().unwrap();
    assert!(why(1).contains("no peak stands above the noise"), "{}", why(1));
    assert!(why(2).contains("missing.csv"), "{}", why(2));
    assert!(why(3).contains("empty"), "{}", why(3));
    // What was not seen is null, not zero.
    for (k, one) in found.iter().enumerate().take(5).skip(1) {
        let Found { mode_count, order_count, finesse, .. } = one;
        assert_eq!((mode_count, order_count, finesse), (&None, &None, &None), "{k}");
    }
}

#[test]
fn text_is_for_people() {
    let place = made(1, &[]);
    let ran = place.run(&["measure", "--fsr", "6.4GHz", "made/c00000.csv", "missing.csv"]);
    ran.ends(30, &["made/c00000.csv", "mode spacing 399.", " MHz", "mm apart", "finesse", "refused: ", "missing.csv"]);
    assert!(!ran.out.contains('{') && !ran.out.contains("null"), "{}", ran.out);
}

#[test]
fn modes_below_the_floor_do_not_count() {
    let place = made(1, &[]);
    let all = only(&measure(&place, &["made/c00000.csv"]));
    let mut heights: Vec<f64> = all.modes.iter().map(|mode| mode.relative_height).collect();
    heights.sort_by(f64::total_cmp);
    // Between the weakest and the next: all modes of one capture are equally wide, so heights are as areas.
    let floor = format!("{:.1}%", 50.0 * (heights[0] + heights[1]));
    let found = results(&measure(&place, &["--mode-floor", &floor, "made/c00000.csv"])).remove(0);
    assert_eq!((all.mode_count, found.mode_count), (Some(4), Some(3)), "{found:?}");
}

#[test]
fn the_uncertainty_of_the_free_spectral_range_enters() {
    let place = made(1, &[]);
    let without = only(&measure(&place, &["made/c00000.csv"]));
    assert!(without.warns("no uncertainty given for the free spectral range"));
    let with = only(&measure(&place, &["--fsr-u", "0.5%", "made/c00000.csv"]));
    assert!(!with.warns("no uncertainty given for the free spectral range"));
    let ((value, u0), (same, u)) = (without.spacing(), with.spacing());
    assert_eq!(value, same);
    // A spacing is proportional to the free spectral range; both in quadrature.
    let expected = u0.hypot(0.005 * value);
    assert!((u / expected - 1.0).abs() < 1e-3, "{u} for {expected}");
}

#[test]
fn the_nominal_spacing_settles_what_fits_equally_well_and_never_the_value() {
    // Two modes 998 MHz apart in an order of 1.6 GHz: 998 or 602 MHz.
    let twin = ["--type", "twin-150", "--fsr", "1.6GHz", "--gain-ratio", "3", "--curvature", "2%"];
    let place = made(6, &twin);
    let measure = |more: &[&str], name: &str| {
        let ran = place.run(&[&["measure", "--format", "json", "--fsr", "1.6GHz"][..], more, &[name]].concat());
        contract::check(ran.out.trim_end(), 1.6e9).unwrap()
    };
    let mut settled = 0;
    for k in 0..6 {
        let name = format!("made/c{k:05}.csv");
        let found = measure(&[], &name);
        if !found.refused.as_ref().is_some_and(|why| why.contains("fit equally well")) {
            continue;
        }
        settled += 1;
        for (nominal, truth) in [("999MHz", 998.3e6), ("980MHz", 998.3e6), ("600MHz", 601.7e6)] {
            let (value, u) = measure(&["--nominal-spacing", nominal], &name).spacing();
            assert!((value - truth).abs() < 3.0 * u && u < 0.03 * truth, "{nominal}: {value} ± {u}");
        }
    }
    assert!(settled > 0, "no capture was ambiguous");
}

#[test]
fn a_spacing_of_twice_the_nominal_is_said_to_be_one() {
    let place = made(1, &[]);
    let found = only(&measure(&place, &["--nominal-spacing", "199.7MHz", "made/c00000.csv"]));
    assert!(found.warns("twice nominal"), "{:?}", found.warnings);
    let found = only(&measure(&place, &["--nominal-spacing", "399.7MHz", "made/c00000.csv"]));
    assert!(!found.warns("twice nominal"), "{:?}", found.warnings);
}

#[test]
fn wrong_usage_reads_as_no_verdict() {
    let place = made(1, &[]);
    place.run(&["measure", "made/c00000.csv"]).ends(2, &["--fsr"]).leaves_nothing();
    place.run(&["measure", "--fsr", "6.4GHz"]).ends(2, &[]).leaves_nothing();
    for wrong in ["0GHz", "6.4", "6.4mm", "fast"] {
        place.run(&["measure", "--fsr", wrong, "made/c00000.csv"]).ends(2, &[wrong]).leaves_nothing();
    }
    for wrong in ["100%", "-1%", "5MHz"] {
        let option = format!("--mode-floor={wrong}");
        place.run(&["measure", "--fsr", "6.4GHz", &option, "made/c00000.csv"]).ends(2, &[wrong]).leaves_nothing();
    }
}
