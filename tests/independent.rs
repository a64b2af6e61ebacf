//! Captures that an independent script simulated, through the built program, against that script's own truth.
//! Must not take a truth from the program.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod contract;
mod program;

use std::fs;
use std::path::{Path, PathBuf};

use contract::{Found, FoundMode};
use program::Place;
use serde_json::Value;

/// Stated uncertainties that an error may be.
const COVERAGE: f64 = 3.0;
/// Largest stated uncertainty of the spacing, of itself: a wide one would let anything through.
const U_SPACING_AT_MOST: f64 = 1e-3;
/// Of the strongest mode.
const HEIGHT: f64 = 0.02;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/independent")
}

/// What is true of a capture.
struct Truth {
    mode_spacing: f64,
    free_spectral_range: f64,
    finesse: f64,
    /// Offset and height of the axial modes, and of the transverse ones.
    modes: Vec<(f64, f64)>,
    off_axis: Vec<(f64, f64)>,
}

fn truth(name: &str) -> Truth {
    let text = fs::read_to_string(folder().join(format!("{name}.json"))).unwrap();
    let value: Value = serde_json::from_str(&text).unwrap();
    let number = |key: &str| value[key].as_f64().unwrap();
    let (spacing, free_spectral_range) = (number("mode_spacing_hz"), number("fsr_hz"));
    let all: Vec<(f64, f64)> = value["modes"].as_array().unwrap().iter().map(place_and_height).collect();
    // A transverse mode stands beside its axial one: off the comb of the first.
    let on_comb = |place: f64| {
        let places = (place - all[0].0) / spacing;
        (places - places.round()).abs() < 0.01
    };
    let (axial, transverse): (Vec<_>, Vec<_>) = all.iter().copied().partition(|mode| on_comb(mode.0));
    let mut modes: Vec<(f64, f64)> =
        axial.iter().map(|mode| (mode.0.rem_euclid(free_spectral_range), mode.1)).collect();
    modes.sort_by(|a, b| a.0.total_cmp(&b.0));
    // The first mode after the largest gap comes first; of equal gaps (to 1 kHz) that at the lowest ramp voltage: in
    // `interleaved`, the one capture with equal gaps, the strongest mode is the first on the ramp, at 0.385 V.
    let gap = |k: usize| {
        let before = if k == 0 { modes[modes.len() - 1].0 - free_spectral_range } else { modes[k - 1].0 };
        ((modes[k].0 - before) / 1e3).round()
    };
    let rank = |k: usize| (gap(k), modes[k].1);
    let first = (0..modes.len()).max_by(|&a, &b| rank(a).partial_cmp(&rank(b)).unwrap()).unwrap();
    let origin = modes[first].0;
    modes.rotate_left(first);
    let offset = |mode: &(f64, f64)| ((mode.0 - origin).rem_euclid(free_spectral_range), mode.1);
    Truth {
        mode_spacing: spacing,
        free_spectral_range,
        finesse: number("finesse"),
        modes: modes.iter().map(offset).collect(),
        off_axis: transverse.iter().map(offset).collect(),
    }
}

fn place_and_height(mode: &Value) -> (f64, f64) {
    (mode["detuning_hz"].as_f64().unwrap(), mode["amplitude"].as_f64().unwrap())
}

fn measured(name: &str, status: i32) -> (Found, Truth) {
    let truth = truth(name);
    let fsr = format!("{} Hz", truth.free_spectral_range);
    let capture = folder().join(format!("{name}.csv"));
    let ran = Place::new().run(&["measure", "--format", "json", "--fsr", &fsr, capture.to_str().unwrap()]);
    ran.ends(status, &[]);
    (contract::check(ran.out.trim_end(), truth.free_spectral_range).unwrap(), truth)
}

#[track_caller]
fn modes_agree(name: &str, found: &[FoundMode], truth: &[(f64, f64)]) {
    assert_eq!(found.len(), truth.len(), "{name}: {found:?}");
    for (mode, (offset, height)) in found.iter().zip(truth) {
        let off = (mode.offset - offset).abs();
        assert!(off <= COVERAGE * mode.u_offset, "{name}: {mode:?} for {offset}");
        assert!((mode.relative_height - height).abs() < HEIGHT, "{name}: {mode:?} for {height}");
    }
}

/// A capture with a spacing: the spacing, the modes, the finesse; and the result, for what is special about it.
#[track_caller]
fn agrees(name: &str, finesse_within: f64) -> Found {
    let (found, truth) = measured(name, 0);
    let (spacing, u) = found.spacing();
    let off = spacing - truth.mode_spacing;
    println!("{name}: {:+.1} kHz, {:+.2} stated uncertainties of {:.1} kHz", off / 1e3, off / u, u / 1e3);
    assert!(off.abs() <= COVERAGE * u, "{name}: off by {off} Hz, u {u} Hz");
    assert!(u <= U_SPACING_AT_MOST * spacing, "{name}: u {u} Hz says nothing");
    modes_agree(name, &found.modes, &truth.modes);
    modes_agree(name, &found.off_axis, &truth.off_axis);
    let finesse = found.finesse.unwrap() / truth.finesse;
    assert!((finesse - 1.0).abs() < finesse_within, "{name}: finesse is {finesse} of the truth");
    found
}

#[test]
fn plain_and_walking_captures_agree() {
    for name in ["plain", "walking", "noisy", "two-modes", "low-finesse"] {
        let found = agrees(name, 0.03);
        assert!(!found.warns("clipped") && !found.warns("off the comb"), "{name}: {:?}", found.warnings);
    }
}

#[test]
fn ramps_outside_the_fitted_family_are_covered_by_the_stated_uncertainty() {
    for name in ["creeping-ramp", "power-law-ramp"] {
        agrees(name, 0.03);
    }
}

#[test]
fn faulty_captures_are_measured_and_said_to_be_so() {
    assert!(agrees("clipped", 0.03).warns("clipped tops"));
    assert!(agrees("inverted", 0.03).warns("points downward"));
    assert!(agrees("slow-detector", 0.03).warns("detector is slow"));
    agrees("six-bit", 0.07);
}

#[test]
fn orders_that_interleave_are_told_apart() {
    let found = agrees("interleaved", 0.03);
    assert_eq!(found.mode_count, Some(4));
}

#[test]
fn off_axis_light_is_listed_with_its_height_and_never_counted() {
    let found = agrees("off-axis", 0.03);
    assert_eq!((found.mode_count, found.off_axis.len()), (Some(3), 3));
    // Transverse modes were made 8 % as high as their axial mode.
    assert!((found.off_axis[0].relative_height - 0.08).abs() < 0.005, "{:?}", found.off_axis);
    assert!(found.warns("off the comb"), "{:?}", found.warnings);
}

#[test]
fn one_mode_gives_no_spacing_and_says_why() {
    let (found, truth) = measured("one-mode", 30);
    assert!(found.refused.as_ref().is_some_and(|why| why.contains("one mode")), "{found:?}");
    modes_agree("one-mode", &found.modes, &truth.modes);
    let finesse = found.finesse.unwrap() / truth.finesse;
    assert!((finesse - 1.0).abs() < 0.03, "{finesse}");
}

#[test]
fn every_capture_of_the_folder_has_a_test() {
    let mut names: Vec<String> = fs::read_dir(folder())
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .filter_map(|name| name.strip_suffix(".csv").map(str::to_owned))
        .filter(|name| name != "warm-up-axis")
        .collect();
    names.sort();
    let tested = "clipped creeping-ramp interleaved inverted low-finesse noisy off-axis one-mode plain power-law-ramp \
                  six-bit slow-detector two-modes walking";
    assert_eq!(names, tested.split(' ').collect::<Vec<_>>());
}

/// Writes the packed warm-up as the capture files it was, into `captures/`.
fn unpack(place: &Place) {
    let read = |name: &str| fs::read(folder().join(name)).unwrap();
    let text = |name: &str| String::from_utf8(read(name)).unwrap();
    let (axis, times, packed) = (text("warm-up-axis.csv"), text("warm-up-times.txt"), read("warm-up.bin"));
    let axis: Vec<&str> = axis.lines().skip(1).collect();
    let samples: Vec<i32> = packed.chunks_exact(4).map(|b| i32::from_le_bytes([b[0], b[1], b[2], b[3]])).collect();
    let captures: Vec<&[i32]> = samples.chunks_exact(2 * axis.len()).collect();
    assert_eq!((captures.len(), times.lines().count()), (240, 240));
    for (number, (capture, at)) in captures.iter().zip(times.lines()).enumerate() {
        let mut file = format!("# captured_at = {at}\ntime_s,ramp_V,photodiode_V,crossed_V\n");
        let (photodiode, crossed) = capture.split_at(axis.len());
        for (row, (a, b)) in axis.iter().zip(photodiode.iter().zip(crossed)) {
            file += &format!("{row},{},{}\n", f64::from(*a) / 1e8, f64::from(*b) / 1e8);
        }
        place.write(&format!("captures/c{number:05}.csv"), file);
    }
}

/// Value, standard uncertainty and note of a measurand's row; columns as in the head of `record.csv`.
struct Cell {
    value: f64,
    u: f64,
    note: String,
}

fn cell(rows: &[csv::StringRecord], measurand: &str) -> Cell {
    let row = rows.iter().find(|row| &row[9] == measurand).unwrap_or_else(|| panic!("no row {measurand}"));
    let number = |column: usize| row[column].parse::<f64>().unwrap_or(f64::NAN);
    Cell { value: number(10), u: number(12) / number(13), note: row[24].to_owned() }
}

/// Times in seconds that a note names: `… at 150.2 s …`.
fn times(note: &str) -> Vec<f64> {
    let words: Vec<&str> = note.split_whitespace().collect();
    let unit = |word: &str| word.trim_end_matches([',', ';', '.', ':', ')']) == "s";
    words.windows(2).filter(|pair| unit(pair[1])).filter_map(|pair| pair[0].parse().ok()).collect()
}

#[test]
fn a_warm_up_gives_spacing_walk_time_constant_hop_and_swap() {
    let place = Place::new();
    unpack(&place);
    let home = folder().join("home");
    let (home, station) = (home.to_str().unwrap().to_owned(), home.join("station.toml").display().to_string());
    let ran = place.run(&[
        "inspect",
        "IND-250",
        "--type",
        "open-250",
        "--home",
        &home,
        "--station",
        &station,
        "--captures",
        "captures",
        "--reports",
        "reports",
    ]);
    ran.is_calm();
    println!("{}", ran.out);
    let record = place.find("record.csv").unwrap_or_else(|| panic!("no record: {}{}", ran.out, ran.err));
    let rows: Vec<csv::StringRecord> =
        csv::Reader::from_path(record).unwrap().into_records().map(Result::unwrap).collect();
    let truth: Value = serde_json::from_str(&fs::read_to_string(folder().join("warm-up.json")).unwrap()).unwrap();
    let number = |value: &Value| value.as_f64().unwrap();
    let mut faults = Vec::new();
    // Key, truth in the row's unit, and the largest stated uncertainty that still says something.
    let wanted = [
        ("mode_spacing", number(&truth["mode_spacing_hz"]) / 1e6, 3.0),
        ("walk_cycles", number(&truth["walk_end_spacings"]), 0.05),
        ("warmup_tau", number(&truth["tau_s"]) / 60.0, 0.015),
    ];
    for (key, truth, u_at_most) in wanted {
        let Cell { value, u, note } = cell(&rows, key);
        // One part in 10⁵ beyond: the walk's law starts at first light, the first capture at 0 s to the millisecond.
        if !((value - truth).abs() <= COVERAGE * u + 1e-5 * truth && u <= u_at_most) {
            faults.push(format!("{key}: {value} with u {u} for {truth}; {note}"));
        }
    }
    for (key, at) in [("hop_count", number(&truth["hops"][0][0])), ("swap_count", number(&truth["swaps"][0]))] {
        let Cell { value, note, .. } = cell(&rows, key);
        // Two captures, 1.5 s apart there.
        let timed = times(&note).iter().any(|time| (time - at).abs() <= 3.0);
        if value != 1.0 || !timed {
            faults.push(format!("{key}: {value}, expected one at {at} s; note: {note}"));
        }
    }
    for (key, at) in [("mode_count_min", 0), ("mode_count_max", 1)] {
        let Cell { value, note, .. } = cell(&rows, key);
        if value != number(&truth["counts"][at]) {
            faults.push(format!("{key}: {value}, expected {}; {note}", truth["counts"][at]));
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
    ran.ends(0, &["pass, grade accepted"]);
}
