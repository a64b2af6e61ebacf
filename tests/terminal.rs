//! What the built program writes while a run goes on: lines without control characters where there is no terminal.
//! Must not need a terminal: what is drawn on one is tried as lines, beside the code that makes them.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod program;

use std::io::Write as _;
use std::process::Stdio;

use program::{Place, Ran, brisk, listing};

/// No escape, no return of the carriage, nothing else that moves a cursor.
#[track_caller]
fn is_plain(ran: &Ran) {
    for said in [&ran.out, &ran.err] {
        let odd: Vec<char> = said.chars().filter(|c| c.is_control() && *c != '\n').collect();
        assert!(odd.is_empty(), "{odd:?} in {said}");
    }
}

/// `inspect --ask` of BRISK-1 with these lines typed into a pipe.
fn asked(place: &Place, typed: &str) -> Ran {
    let before = listing(place.path());
    let arguments = brisk("BRISK-1", &["--ask"]);
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let mut command = place.command(&arguments);
    command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
    let mut child = command.spawn().unwrap();
    child.stdin.take().unwrap().write_all(typed.as_bytes()).unwrap();
    place.ran(before, child.wait_with_output().unwrap())
}

#[test]
fn without_a_terminal_there_are_lines_only_whatever_colour_is_wanted() {
    for more in [&[][..], &["--plain"], &["--color", "always"], &["--color", "never"], &["--format", "json"]] {
        let place = Place::new();
        let ran = place.inspect("BRISK-1", more);
        is_plain(ran.ends(0, &["BRISK-1"]));
        assert!(ran.err.contains("[2/"), "progress in lines: {}", ran.err);
    }
}

#[test]
fn each_row_is_printed_once_and_a_run_taken_up_does_not_repeat_them() {
    let place = Place::new();
    let first = asked(&place, "KT\n0,6\n1\n-\n");
    is_plain(first.ends(22, &["the input ended", "Start delay: 0.60 ± 0.10 s"]));
    // Who began it goes on with it; the initials are known.
    let second = asked(&place, "4.0\n1.281\n3\n1\n");
    is_plain(second.ends(0, &["taken up again after", "rows so far", "Look first"]));
    let once = |line: &str| first.out.matches(line).count() + second.out.matches(line).count();
    for line in ["Start delay: ", "Tries to start: ", "Mode spacing: ", "Power: ", "Run current: "] {
        assert_eq!(once(line), 1, "{line}\n{}\n{}", first.out, second.out);
    }
}

#[test]
fn answers_are_taken_as_hands_type_them() {
    let place = Place::new();
    // A comma for the point, `-` for no instrument, a value out of range, `?`, a digit for a choice.
    let ran = asked(&place, "KT\n0,6\n1\n-\n4,0\n?\n13000\n1,281\n3\n\n9\n1\n");
    is_plain(ran.ends(0, &["no value (no instrument for it at this bench)", "Run current: 4.000", "1 clean", "pass"]));
    // Questions are broken into lines: they are read here as one.
    let lines = ran.err.lines().map(|line| line.trim_start_matches(['|', 'x', '!', ' ']));
    let said = lines.collect::<Vec<_>>().join(" ");
    for words in [
        "`13000` is outside what is possible; expected a voltage from 0 kV to 20 kV",
        "A comma may stand for the point",
        "Nothing was typed",
        "found `9`; expected one of clean, film, burn, crack",
    ] {
        assert!(said.contains(words), "{words} in {said}");
    }
    assert_eq!(said.matches("`stop: why` ends the run").count(), 2, "once at first, once by `?`: {said}");
    let caution = ran.err.find("Start pulses").or(ran.err.find("start pulses"));
    assert!(caution.is_some_and(|at| ran.err.find("+> in s").is_some_and(|prompt| at < prompt)), "{}", ran.err);
}

#[test]
fn control_characters_that_are_typed_never_reach_the_terminal() {
    let place = Place::new();
    let ran = asked(&place, "KT\n0.6\n1\nskip: no\u{1b}[2J probe\nstop: \u{1b}]0;x\u{7}\n");
    is_plain(ran.ends(22, &["no value (no\u{fffd}[2J probe)", "stopped"]));
}

/// A bench without instruments: whoever runs it takes the high voltage off, and says so.
#[test]
fn a_person_at_a_real_bench_says_that_it_is_safe() {
    let place = Place::new();
    let station = "station = \"bare\"\ntime_zone = \"Europe/Lisbon\"\nshifts = [\"06:00\"]\n";
    let station = place.write("bare.toml", station);
    let home = format!("{}/fixtures/brisk", env!("CARGO_MANIFEST_DIR"));
    let arguments = [
        "inspect",
        "T-1",
        "--type",
        "brisk-150",
        "--station",
        &station,
        "--home",
        &home,
        "--reports",
        "reports",
        "--ask",
    ];
    let run = |typed: &str| {
        let before = listing(place.path());
        let mut command = place.command(&arguments);
        command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
        let mut child = command.spawn().unwrap();
        child.stdin.take().unwrap().write_all(typed.as_bytes()).unwrap();
        place.ran(before, child.wait_with_output().unwrap())
    };
    // The input ends where Enter is waited for: the sheet stays open.
    let open = run("KT\n0.6\n1\n-\n1\n");
    open.ends(22, &["Supply off, tube dark, charge taken off, then Enter", "before the bench was said to be safe"]);
    run("\n").ends(21, &["taken up again", "insulated tool", "hold"]);
}
