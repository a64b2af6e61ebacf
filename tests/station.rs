//! A bench judged by its reference tubes, with the built program: when it holds, what it says, what it keeps.
//! Must not look into the library.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod program;

use program::{Place, Ran, fixture};

/// A reference tube of the brisk bench; `{}` is what it should read.
const REFERENCE: &str = r#"
[[reference]]
serial = "REF-A"
type = "brisk-150"
values = { power = { value = "VALUE", within = "5 %" } }
"#;
const TUBE: &str = r#"
[[reference]]
serial = "REF-A"
type = "brisk-150"
bench = "brisk"
"#;

/// The brisk bench with a reference tube that should read a power. Its true power is 0.9 mW.
fn place(power: &str) -> Place {
    let place = Place::new();
    place.write("bench.toml", fixture("bench.toml") + &REFERENCE.replace("VALUE", power));
    place.write("scenario.toml", fixture("scenario.toml") + TUBE);
    place
}

fn inspect(place: &Place, serial: &str, start: &str, more: &[&str]) -> Ran {
    let own = ["--station", "bench.toml", "--scenario", "scenario.toml", "--pace", "1000000x", "--start", start];
    place.inspect(serial, &[&own, more].concat())
}

fn station(place: &Place, at: &str, more: &[&str]) -> Ran {
    let own = ["station", "--station", "bench.toml", "--scenario", "scenario.toml", "--reports", "reports", "--at", at];
    place.run(&[&own, more].concat())
}

#[test]
fn a_shift_of_a_bench_with_one_reference_tube() {
    let place = place("0.90 mW");
    // Nobody checked it: the tube is measured, and held.
    let held = inspect(&place, "BRISK-1", "2026-03-02T06:10:00Z", &[]);
    held.ends(21, &["No verdict will be given", "Reference tube REF-A was never checked here: inspect it first."]);
    let check = inspect(&place, "REF-A", "2026-03-02T06:20:00Z", &[]);
    check.ends(0, &["the bench reads it in bounds"]);
    let record = place.find("record.csv").map(|_| {
        let folder = place.join("reports/2026/REF-A");
        let run = std::fs::read_dir(folder).unwrap().next().unwrap().unwrap().path();
        std::fs::read_to_string(run.join("record.csv")).unwrap()
    });
    assert!(record.unwrap().contains("Reference tube of brisk: judges the bench, not the tube."));
    // A run within the shift counts, even one whose sheet was opened by hand later.
    let checked = ["--retest", "the bench is checked now"];
    inspect(&place, "BRISK-1", "2026-03-02T13:30:00Z", &checked).ends(0, &["pass, grade prime"]);
    // Without its end check the shift is not closed; the new one asks for its own.
    let next = inspect(&place, "BRISK-1", "2026-03-02T14:05:00Z", &["--retest", "measured again after the shift"]);
    next.ends(
        21,
        &[
            "REF-A is due since 2026-03-02 14:00, the start of the shift; its last check was 2026-03-02 06:20",
            "has no end check of reference tube REF-A",
        ],
    );
    let shown = station(&place, "2026-03-02T14:30:00Z", &["--chart", "chart.pdf"]);
    shown.ends(
        21,
        &[
            "Gives no verdicts: Reference tube REF-A is due",
            "DUE since 2026-03-02 14:00",
            "power, mW:",
            "Runs since the last good check",
            "316 days left",
            "before 2026-03-03 06:00, the end of the shift: REF-A",
        ],
    );
    let chart = std::fs::read(place.join("chart.pdf")).unwrap();
    assert!(chart.starts_with(b"%PDF"), "a PDF");
    // Of the two runs after the check, one was held: both rest on the next check.
    assert_eq!(shown.out.matches("BRISK-1").count(), 2, "{}", shown.out);
    let json = station(&place, "2026-03-02T13:59:00Z", &["--format", "json"]);
    json.ends(0, &["\"state\":\"good\"", "\"kind\":\"check\"", "\"gives_verdicts\":true"]);
    assert!(json.out.lines().all(|line| line.starts_with('{') && line.ends_with('}')), "{}", json.out);
}

#[test]
fn a_bench_that_reads_its_reference_tube_wrong_judges_no_tube() {
    let place = place("0.80 mW");
    let check = inspect(&place, "REF-A", "2026-03-02T06:20:00Z", &[]);
    check.ends(20, &["the bench reads it out of bounds", "above 0.84 mW"]);
    let held = inspect(&place, "BRISK-1", "2026-03-02T07:00:00Z", &[]);
    held.ends(21, &["REF-A was out of bounds at 2026-03-02 06:20", "and 0.0400 mW is allowed", "inspect it again"]);
    station(&place, "2026-03-02T07:30:00Z", &[]).ends(21, &["OUT OF BOUNDS", "BRISK-1"]);
}

#[test]
fn a_reference_tube_of_another_type_or_an_unknown_one_is_refused() {
    let place = place("0.90 mW");
    let start = "2026-03-02T06:20:00Z";
    let other = inspect(&place, "REF-A", start, &["--type", "twin-150"]);
    other.ends(30, &["`REF-A` is a reference tube of brisk, of type `brisk-150`"]).leaves_nothing();
    place.write(
        "bench.toml",
        fixture("bench.toml") + &REFERENCE.replace("brisk-150", "brisk-15").replace("VALUE", "1 mW"),
    );
    let unknown = inspect(&place, "REF-A", start, &[]);
    unknown.ends(30, &["unknown tube type `brisk-15`", "brisk-150"]).leaves_nothing();
}

#[test]
fn bad_input_leaves_nothing() {
    let place = place("0.90 mW");
    let start = "2026-03-02T06:20:00Z";
    let future = inspect(&place, "BRISK-1", start, &["--lit-since", "06:30"]);
    future.ends(30, &["--lit-since is 2026-03-02 06:30, after the start of the run"]).leaves_nothing();
    let odd = inspect(&place, "BRISK-1", start, &["--lit-since", "a while"]);
    odd.ends(30, &["expected a time of today such as 07:40"]).leaves_nothing();
    station(&place, start, &["--chart", "chart.svg"]).ends(30, &["expected `--chart FILE.pdf`"]).leaves_nothing();
    place.run(&["rack", "take", "X", "--reports", "reports"]).ends(30, &["`X` is not in the rack"]).leaves_nothing();
    place.run(&["rack", "add", "X", "--at", "noon", "--reports", "reports"]).ends(30, &["RFC 3339"]).leaves_nothing();
    place.write("bench.toml", fixture("bench.toml").replace("[\"06:00\", \"14:00\"]", "[\"14:00\", \"06:00\"]"));
    station(&place, start, &[]).ends(30, &["bench.toml:3:", "`shifts` has 06:00 after 14:00"]);
}

#[test]
fn a_tube_goes_from_the_rack_to_the_bench() {
    let place = Place::new();
    let rack = |action: &[&str]| place.run(&[&["rack"], action, &["--reports", "reports"]].concat());
    rack(&["add", "BRISK-1", "other", "--at", "2026-03-02T07:59:35Z"]).ends(0, &["BRISK-1  burning since 2026-03-02"]);
    // Brisk: 20 s of time constant, so that 25 s in the rack leave 3.4 spacings to walk.
    let run = place.inspect("BRISK-1", &["--start", "2026-03-02T08:00:00Z"]);
    run.ends(0, &["taken from the rack, burning since 2026-03-02 07:59"]);
    assert!(!run.out.contains("Tries to start: 1"), "{}", run.out);
    let left = rack(&["list"]);
    left.ends(0, &["other"]);
    assert!(!left.out.contains("BRISK-1"), "on the bench it is no longer in the rack: {}", left.out);
    rack(&["take", "other"]).ends(0, &[]);
}

#[test]
fn a_tube_put_into_the_rack_now_goes_to_the_simulated_bench() {
    let place = Place::new();
    let rack = |action: &[&str]| place.run(&[&["rack"], action, &["--reports", "reports"]].concat());
    // The scenario's clock is in March; by the clock on the wall the tube burns since 40 minutes.
    rack(&["add", "BRISK-1", "--at", "40 min"]).ends(0, &["BRISK-1  burning since"]);
    let run = place.inspect("BRISK-1", &[]);
    run.is_calm();
    assert!(run.out.contains("taken from the rack, burning since 2026-03-02 07:"), "{}{}", run.err, run.out);
    // Of today in the station's zone, as `--lit-since` takes it.
    rack(&["add", "other", "--at", "00:00"]).ends(0, &["T00:00:00"]);
    rack(&["add", "X", "--at=-5 min"]).ends(30, &["--at is", "after now at"]).leaves_nothing();
}

#[test]
fn what_is_said_of_one_tube_is_refused_for_a_day() {
    let place = place("0.90 mW");
    let of_one = [
        ["--type", "brisk-150"],
        ["--start", "2026-03-02T08:00:00Z"],
        ["--retest", "why not"],
        ["--lit-since", "40 min"],
    ];
    for [option, value] in of_one {
        let day = place.run(&["inspect", "--scenario", "scenario.toml", option, value, "--reports", "reports"]);
        day.ends(30, &[&format!("`{option}` is of one tube, and no SERIAL is given")]).leaves_nothing();
    }
}
