//! The life of runs and tubes: a day, retests, stops, interruptions, history, and clocks that jump.
//! Must not look into the library but for clocks, which no child process can be given.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod program;

use std::fs;
use std::process::{Command, Stdio};
use std::thread;
use std::time::{Duration, Instant};

use program::{Place, brisk, fixture, listing};
use serde_json::Value as Json;

const RECORD: [&str; 4] = ["record.csv", "budget.csv", "record.csv-metadata.json", "record.pdf"];

/// The run folders of a serial, in the order of their ids.
fn folders(place: &Place, serial: &str) -> Vec<std::path::PathBuf> {
    let mut found = Vec::new();
    for year in fs::read_dir(place.join("reports")).unwrap().map(|entry| entry.unwrap().path()) {
        let runs = fs::read_dir(year.join(serial)).into_iter().flatten();
        found.extend(runs.map(|entry| entry.unwrap().path()));
    }
    found.sort();
    found
}

fn text(folder: &std::path::Path, name: &str) -> String {
    fs::read_to_string(folder.join(name)).unwrap()
}

fn history(place: &Place, serial: &str, more: &[&str]) -> program::Ran {
    place.run(&[&["history", serial, "--reports", "reports"][..], more].concat())
}

#[test]
fn a_day_leaves_what_each_serial_leaves_by_itself_and_runs_nothing_twice() {
    let day = Place::new();
    let arguments: Vec<String> = brisk("BRISK-1", &[]).into_iter().filter(|it| it != "BRISK-1").collect();
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let ran = day.run(&arguments);
    ran.ends(20, &["Tube 2 of 2: BRISK-2", "BRISK-1  pass, prime", "BRISK-2  fail, dark"]);
    let alone = Place::new();
    alone.inspect("BRISK-2", &[]).ends(20, &[]);
    alone.inspect("BRISK-1", &[]).ends(0, &[]);
    for serial in ["BRISK-1", "BRISK-2"] {
        let (day, alone) = (folders(&day, serial), folders(&alone, serial));
        assert_eq!((day.len(), alone.len()), (1, 1));
        for name in RECORD.iter().chain(&["events.jsonl"]) {
            assert!(fs::read(day[0].join(name)).unwrap() == fs::read(alone[0].join(name)).unwrap(), "{serial}/{name}");
        }
    }
    let again = day.run(&[&arguments[..], &["--format", "json"]].concat());
    again.ends(20, &["finished already: fail, dark"]).leaves_nothing();
    let lines: Vec<Json> = again.out.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!((lines.len(), &lines[0]["grade"], &lines[1]["reject_code"]), (2, &"prime".into(), &"dark".into()));
    // A day that was cut short goes on with the tube at hand.
    let events = folders(&day, "BRISK-1")[0].clone();
    let bytes = fs::read(events.join("events.jsonl")).unwrap();
    fs::write(events.join("events.jsonl"), &bytes[..bytes.len() / 2]).unwrap();
    fs::remove_file(events.join("record.csv")).unwrap();
    day.run(&arguments).ends(20, &["taken up again", "BRISK-1  pass, prime"]);
}

#[test]
fn a_finished_run_is_repeated_only_for_a_cause_and_only_as_often_as_the_recipe_allows() {
    let place = Place::new();
    place.inspect("BRISK-1", &["--retest", "no run yet"]).ends(30, &["no finished run"]).leaves_nothing();
    place.inspect("BRISK-1", &[]).ends(0, &[]);
    let first = folders(&place, "BRISK-1")[0].clone();
    let kept: Vec<Vec<u8>> = RECORD.iter().map(|name| fs::read(first.join(name)).unwrap()).collect();
    let refused = place.inspect("BRISK-1", &[]);
    refused
        .ends(34, &["2026-03-02  pass, prime", "inspect BRISK-1 --retest", "`retests = 1`, 0 used"])
        .leaves_nothing();
    place.inspect("BRISK-1", &["--retest", "  "]).ends(30, &["blank"]).leaves_nothing();
    let why = "the meter's lens was fogged";
    place.inspect("BRISK-1", &["--retest", why]).ends(0, &[why]);
    let second = folders(&place, "BRISK-1")[1].clone();
    let id = first.file_name().unwrap().to_str().unwrap();
    for name in ["record.csv", "record.csv-metadata.json"] {
        let text = text(&second, name);
        assert!(text.contains(id) && text.contains(why), "{name}: {text}");
    }
    // It is another run: later than the first, with other noise, of the same tube.
    assert_ne!(text(&first, "budget.csv"), text(&second, "budget.csv"));
    let refused = place.inspect("BRISK-1", &["--retest", "once more"]);
    refused.ends(34, &["1 used of `retests = 1`", "--add rework"]).leaves_nothing();
    let now: Vec<Vec<u8>> = RECORD.iter().map(|name| fs::read(first.join(name)).unwrap()).collect();
    assert!(now == kept, "the first record is not touched");
    // A rework makes another tube of it: a run, and then again a retest.
    history(&place, "BRISK-1", &["--add", "rework", "--date", "2026-03-02", "--note", "new output mirror"])
        .ends(0, &[]);
    place.inspect("BRISK-1", &[]).ends(0, &["rework on 2026-03-02: new output mirror"]);
    place.inspect("BRISK-1", &[]).ends(34, &["0 used"]);
    let answers = place.write("answers.toml", format!("retest = \"fogged again\"\n{}", fixture("answers.toml")));
    place.inspect("BRISK-1", &["--answers", &answers]).ends(0, &["fogged again"]);
    place.inspect("BRISK-1", &["--retest", "no"]).ends(34, &["1 used"]);
}

#[test]
fn a_hold_is_followed_without_using_up_a_retest() {
    let place = Place::new();
    let overdue =
        place.write("overdue.toml", fixture("bench.toml").replacen("due = 2027-01-12", "due = 2026-03-01", 2));
    place.inspect("BRISK-1", &["--station", &overdue]).ends(21, &["was due 2026-03-01"]);
    place.inspect("BRISK-1", &[]).ends(34, &["a hold is no verdict"]).leaves_nothing();
    place.inspect("BRISK-1", &["--retest", "meter calibrated"]).ends(0, &["meter calibrated"]);
    place.inspect("BRISK-1", &["--retest", "beam was clipped"]).ends(0, &["beam was clipped"]);
    place.inspect("BRISK-1", &["--retest", "no more"]).ends(34, &["1 used"]).leaves_nothing();
}

/// A run left open at its first missing answer.
fn left_open(place: &Place) -> String {
    let file = place.write("open.toml", fixture("answers.toml").replace("run_voltage", "run_volts"));
    place.inspect("BRISK-1", &["--answers", &file]).ends(22, &["stays open"]);
    file
}

#[test]
fn a_run_is_stopped_from_outside_and_the_next_one_names_it() {
    let place = Place::new();
    place
        .run(&["inspect", "BRISK-1", "--reports", "reports", "--stop", "x"])
        .ends(30, &["no unfinished run"])
        .leaves_nothing();
    left_open(&place);
    let stop = |why: &str| place.run(&["inspect", "BRISK-1", "--reports", "reports", "--stop", why]);
    stop(" ").ends(30, &["blank"]).leaves_nothing();
    stop("fire drill").ends(22, &["stopped", "fire drill", "still lit", "Charge stays"]);
    let folder = &folders(&place, "BRISK-1")[0];
    let events = text(folder, "events.jsonl");
    assert!(
        events.contains("\"kind\":\"stopped\"") && events.contains("\"kind\":\"not_made_safe\""),
        "a stop from outside does not claim that somebody switched off"
    );
    // What was measured is kept, the rest says why it is empty.
    let record = text(folder, "record.csv");
    assert!(record.contains(",stopped,") && record.contains("stopped before it was measured"), "{record}");
    assert!(record.lines().any(|line| line.contains(",warmup_tau,0.33")), "{record}");
    stop("again").ends(30, &["no unfinished run"]).leaves_nothing();
    // A stop was no verdict: no retest is used, and the sheet says what went before.
    place.inspect("BRISK-1", &[]).ends(0, &["that run was stopped: fire drill"]);
    place.inspect("BRISK-1", &["--retest", "fogged"]).ends(0, &["fogged"]);
}

#[test]
fn a_process_at_work_is_not_stopped_from_outside_and_a_signal_leaves_the_sheet_open() {
    let undisturbed = Place::new();
    undisturbed.inspect("BRISK-1", &[]).ends(0, &[]);
    let place = Place::new();
    let slow = brisk("BRISK-1", &["--pace", "20x"]);
    let slow: Vec<&str> = slow.iter().map(String::as_str).collect();
    let events = || place.find("events.jsonl").map_or(String::new(), |path| fs::read_to_string(path).unwrap());
    for signal in ["-INT", "-TERM"] {
        let before = events();
        let mut command = place.command(&slow);
        let child = command.stdin(Stdio::null()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
        let began = Instant::now();
        // New events: only the process that holds the serial writes them.
        let captured = || events().len() > before.len() && events()[before.len()..].contains("captured");
        while !captured() && began.elapsed() < Duration::from_secs(60) {
            thread::sleep(Duration::from_millis(20));
        }
        let outside = place.run(&["inspect", "BRISK-1", "--reports", "reports", "--stop", "x"]);
        outside.ends(32, &["already being inspected"]);
        assert!(Command::new("kill").args([signal, &child.id().to_string()]).status().unwrap().success());
        let ran = place.ran(Vec::new(), child.wait_with_output().unwrap());
        ran.ends(22, &["the same command goes on from there", "may still be lit"]);
        assert!(place.find("record.csv").is_none());
    }
    place.inspect("BRISK-1", &[]).ends(0, &["taken up again"]);
    for name in RECORD {
        let (one, other) = (undisturbed.find(name).unwrap(), place.find(name).unwrap());
        assert!(fs::read(one).unwrap() == fs::read(other).unwrap(), "{name}");
    }
}

#[test]
fn a_sheet_begun_by_a_person_is_not_finished_by_the_simulated_technician() {
    let place = Place::new();
    left_open(&place);
    place.inspect("BRISK-1", &[]).ends(30, &["was begun by KT", "`--answers FILE`", "--stop"]).leaves_nothing();
    let file = place.write("right.toml", fixture("answers.toml"));
    place.inspect("BRISK-1", &["--answers", &file]).ends(0, &["taken up again"]);
}

#[test]
fn a_name_left_blank_is_asked_for_in_words() {
    let place = Place::new();
    let file = place.write("blank.toml", fixture("answers.toml").replace("\"KT\"", "\" \""));
    place.inspect("BRISK-1", &["--answers", &file]).ends(30, &["`technician` is the text \" \""]).leaves_nothing();
    let file = place.write("none.toml", fixture("answers.toml").replace("technician = \"KT\"", ""));
    place.inspect("BRISK-1", &["--answers", &file]).ends(22, &["`technician = \"KT\"`"]).leaves_nothing();
    let arguments = brisk("BRISK-1", &["--ask"]);
    let mut command = place.command(&arguments.iter().map(String::as_str).collect::<Vec<_>>());
    let mut child = command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    std::io::Write::write_all(&mut child.stdin.take().unwrap(), b"\n \n\n").unwrap();
    let ran = place.ran(Vec::new(), child.wait_with_output().unwrap());
    ran.ends(22, &["your initials were left blank", "letters such as KT"]);
    assert!(place.find("events.jsonl").is_none(), "nothing was begun");
}

#[test]
fn history_shows_runs_beside_each_other_and_what_changed() {
    let place = Place::new();
    place.inspect("BRISK-1", &[]).ends(0, &[]);
    // The same tube with a ninth less light.
    let scenario =
        place.write("dim.toml", fixture("scenario.toml").replace("power = \"0.9 mW\"", "power = \"0.8 mW\""));
    place.inspect("BRISK-1", &["--scenario", &scenario, "--retest", "mirror cleaned"]).ends(0, &[]);
    history(&place, "BRISK-1", &["--add", "sold", "--date", "2026-03-05", "--note", "to the demo shelf"]).ends(0, &[]);
    let shown = history(&place, "BRISK-1", &[]);
    shown.ends(0, &[]).leaves_nothing();
    let out = &shown.out;
    assert_eq!(out.matches("about one row in twenty changes by chance").count(), 1, "{out}");
    for words in [
        "2 runs",
        "repeats run 1 because: mirror cleaned",
        "2026-03-05  sold: to the demo shelf",
        "run 2",
        "limits revision 1",
    ] {
        assert!(out.contains(words), "`{words}`: {out}");
    }
    let from = out.find("From run 1 to run 2").unwrap();
    let changed: Vec<&str> = out[from..].lines().skip(1).map(|line| line.trim().split(':').next().unwrap()).collect();
    // The meter is the same: a ninth of the power is far beyond the scatter. Voltage and spacing stayed.
    assert!(changed.contains(&"Power"), "{out}");
    assert!(!changed.contains(&"Mode spacing") && !changed.contains(&"Run voltage at the tube"), "{out}");
    let json = history(&place, "BRISK-1", &["--format", "json"]);
    let lines: Vec<Json> = json.out.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!(lines.iter().filter(|line| line["run"].is_number()).count(), 2);
    assert!(
        lines[0]["values"]["mode_spacing_hz"].as_f64().is_some_and(|hz| (hz - 999.3e6).abs() < 1e7),
        "{}",
        lines[0]
    );
    assert!(lines[0]["values"]["mode_spacing_u_hz"].as_f64().is_some_and(|u| (1e6..1e7).contains(&u)), "{}", lines[0]);
    let power = lines.iter().find(|line| line["change"] == "power_w").unwrap();
    let difference = power["difference_si"].as_f64().unwrap();
    assert!((-1.2e-4..-0.8e-4).contains(&difference), "{power}");
    let csv = history(&place, "BRISK-1", &["--format", "csv"]).out;
    let widths: Vec<usize> = csv::Reader::from_reader(csv.as_bytes()).records().map(|row| row.unwrap().len()).collect();
    assert!(widths.len() > 30 && widths.iter().all(|n| *n == 16), "{csv}");
}

#[test]
fn history_names_what_it_leaves_out_and_goes_on() {
    let place = Place::new();
    history(&place, "BRISK-1", &[]).ends(30, &["no run"]).leaves_nothing();
    place.inspect("BRISK-1", &[]).ends(0, &[]);
    place.inspect("BRISK-1", &["--retest", "fogged"]).ends(0, &[]);
    place.write("reports/2026/BRISK-1/019cad00-0000-7000-8000-000000000000/events.jsonl", "{\"seq\":0,");
    history(&place, "BRISK-1", &[]).ends(0, &["2 runs", "1 left out", "no run was ever opened here"]).leaves_nothing();
    // Such a folder is in nobody's way.
    place.inspect("BRISK-1", &[]).ends(34, &[]);
    let record = folders(&place, "BRISK-1")[1].join("record.csv");
    fs::write(&record, fs::read_to_string(&record).unwrap().replacen(",pass,", ",fail,", 1)).unwrap();
    let shown = history(&place, "BRISK-1", &[]);
    shown.ends(33, &["1 run\n", "2 left out", "record.csv was changed after it was frozen"]).leaves_nothing();
    // An unfinished run is shown as far as it went.
    let open = Place::new();
    left_open(&open);
    history(&open, "BRISK-1", &[]).ends(0, &["not finished", "Warm-up time constant"]).leaves_nothing();
}

#[test]
fn what_is_noted_about_a_tube_is_checked_and_never_changes() {
    let place = Place::new();
    let add = |kind: &str, date: &str, note: &str| {
        history(&place, "BRISK-1", &["--add", kind, "--date", date, "--note", note])
    };
    add("rework", "2026-03-04", "x").ends(30, &["no run"]).leaves_nothing();
    place.inspect("BRISK-1", &[]).ends(0, &[]);
    let cases = [
        ("rewrok", "2026-03-04", "x", "nearest known word: rework"),
        ("rework", "2026-02-30", "x", "is no day"),
        ("rework", "4.3.2026", "x", "is no day"),
        ("rework", "2999-01-01", "x", "still to come"),
        ("rework", "2026-03-04", " ", "blank"),
        ("rework", "2026-03-04", "a\nb", "on one line"),
    ];
    for (kind, date, note, why) in cases {
        let listed = listing(&place.join("reports")).len();
        add(kind, date, note).ends(30, &[why]);
        assert_eq!(listing(&place.join("reports")).len(), listed, "{why}");
    }
    add("return", "2026-03-06", "dim, says the customer").ends(0, &["Noted"]);
    add("rework", "2026-03-04", "ballast, noted late").ends(0, &["Noted"]);
    let out = history(&place, "BRISK-1", &[]).out;
    let (late, early) = (out.find("2026-03-06  return").unwrap(), out.find("2026-03-04  rework").unwrap());
    assert!(early < late, "in the order in which it happened: {out}");
    let path = place.join("reports/life/BRISK-1.jsonl");
    let life = fs::read_to_string(&path).unwrap();
    assert_eq!(life.lines().count(), 2);
    fs::write(&path, life.replacen("dim, says", "dim, said", 1)).unwrap();
    history(&place, "BRISK-1", &[]).ends(33, &["line 2 does not follow", "1 left out", "pass, prime"]);
    place.inspect("BRISK-1", &["--retest", "x"]).ends(32, &["line 2 does not follow"]);
}

#[test]
fn a_run_over_a_change_of_summer_time_and_over_midnight_counts_time_as_ever() {
    let plain = Place::new();
    plain.inspect("BRISK-1", &["--start", "2026-03-24T10:00:00Z"]).ends(0, &[]);
    let values = |place: &Place| {
        let record = fs::read(place.find("record.csv").unwrap()).unwrap();
        let rows = csv::Reader::from_reader(&record[..]).into_records().map(Result::unwrap).collect::<Vec<_>>();
        rows.iter().map(|row| format!("{} {} {}", &row[9], &row[10], &row[12])).collect::<Vec<_>>()
    };
    // Summer time began in Lisbon on 2026-03-29 at 01:00 UTC and ended on 2026-10-25 at 01:00 UTC.
    let cases = [
        ("2026-03-29T00:59:40Z", "2026-03-29T00:59:40.000+00:00", "+01:00", "2026"),
        ("2026-10-25T00:59:40Z", "2026-10-25T01:59:40.000+01:00", "+00:00", "2026"),
        ("2026-12-31T23:59:40Z", "2026-12-31T23:59:40.000+00:00", "+00:00", "2026"),
        // In summer Lisbon's day begins an hour before that of Greenwich; New Year is in winter, so is a westerly zone's.
        ("2027-01-01T00:00:10Z", "2027-01-01T00:00:10.000+00:00", "+00:00", "2027"),
    ];
    for (start, stored, last_offset, year) in cases {
        let place = Place::new();
        place.inspect("BRISK-1", &["--start", start]).ends(0, &[]);
        let path = place.find("events.jsonl").unwrap();
        assert!(path.starts_with(place.join(&format!("reports/{year}"))), "{}", path.display());
        let events: Vec<Json> =
            fs::read_to_string(&path).unwrap().lines().map(|line| serde_json::from_str(line).unwrap()).collect();
        assert_eq!(events[0]["at"], stored);
        assert!(events.last().unwrap()["at"].as_str().unwrap().ends_with(last_offset), "{start}");
        let at = |event: &Json| chrono::DateTime::parse_from_rfc3339(event["at"].as_str().unwrap()).unwrap();
        for pair in events.windows(2) {
            let (wall, elapsed) = (
                (at(&pair[1]) - at(&pair[0])).as_seconds_f64(),
                pair[1]["elapsed_s"].as_f64().unwrap() - pair[0]["elapsed_s"].as_f64().unwrap(),
            );
            assert!(wall >= 0.0 && (wall - elapsed).abs() < 0.002, "{start}: {} to {}", pair[0], pair[1]);
        }
        assert_eq!(values(&place), values(&plain), "{start}");
    }
    // New Year comes to Auckland thirteen hours earlier.
    let place = Place::new();
    let station = place.write("auckland.toml", fixture("bench.toml").replace("Europe/Lisbon", "Pacific/Auckland"));
    place.inspect("BRISK-1", &["--station", &station, "--start", "2026-12-31T12:00:00Z"]).ends(0, &[]);
    assert!(place.join("reports/2027/BRISK-1").is_dir());
    assert!(!place.join("reports/2026").exists());
}

mod set_clock {
    use tubewright::{
        disk::RunFolder,
        driver::{Driver, Engine, Watcher, resume},
        instruments::SimulatedBench,
        phantom::Scenario,
        record::event::{Event, Happening, Identity, Opened},
        run::{Plan, Remark, Run},
        station::{Clock, Moment, Trouble},
    };

    use super::fixture;

    /// A bench's clock whose wall is set back by an hour once, in the middle.
    struct SetBack {
        inner: Box<dyn Clock>,
        told: bool,
    }

    impl Clock for SetBack {
        fn now(&mut self) -> Moment {
            self.inner.now()
        }
        fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble> {
            self.inner.wait_until(elapsed_ms)
        }
        fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
            self.inner.resume(events)
        }
        fn was_set(&mut self) -> Option<f64> {
            let due = !self.told && self.inner.now().elapsed_ms > 20_000;
            self.told |= due;
            due.then_some(-3600.0)
        }
    }

    struct Unseen;
    impl Watcher for Unseen {
        fn happened(&mut self, _: &Run, _: &Event, _: &[Remark]) {}
    }

    #[test]
    fn the_sheet_says_by_how_much_the_clock_was_set_back() {
        let texts = ["limits/brisk-150/recipe.toml", "limits/brisk-150/limits.toml", "bench.toml"].map(fixture);
        let [recipe, limits, station] = texts;
        let plan = Plan::from_texts(&recipe, &limits, &station).unwrap();
        let started_at = "2026-03-02T08:00:00+00:00";
        let identity =
            Identity { run_id: "run".into(), started_at: started_at.into(), simulated: true, ..Identity::default() };
        let scenario = Scenario::parse("brisk", &fixture("scenario.toml")).unwrap();
        let mut bench = SimulatedBench::of_scenario(&scenario, "BRISK-1", None, None, f64::INFINITY).unwrap().bench();
        bench.clock = Box::new(SetBack { inner: bench.clock, told: false });
        let folder = tempfile::tempdir().unwrap();
        let opened = Happening::Opened(Box::new(Opened { identity: identity.clone(), recipe, limits, station }));
        let at = Moment { wall: started_at.parse().unwrap(), elapsed_ms: 0 };
        let (mut journal, first) = RunFolder::create(&folder.path().join("run"), at, &opened).unwrap();
        let engine = Engine::of(&plan).unwrap();
        let mut run = Run::open(plan, identity);
        resume(&mut run, &mut bench, &mut journal, &[first]).unwrap();
        Driver {
            run: &mut run,
            bench: &mut bench,
            journal: &mut journal,
            engine: engine.as_ref(),
            watcher: &mut Unseen,
        }
        .drive()
        .unwrap();
        let said: Vec<_> = run
            .sheet()
            .remarks
            .iter()
            .map(|remark| remark.english())
            .filter(|remark| remark.contains("clock"))
            .collect();
        assert_eq!(said, ["The clock on the wall was set back by 3600 s: times on this sheet go on from before."]);
        assert_eq!(run.sheet().verdict.outcome, tubewright::record::sheet::Outcome::Pass);
    }
}
