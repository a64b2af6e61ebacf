//! Bad input to the built program: what it says, how it ends, and that it leaves nothing half-written.
//! Must not look into the library.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod program;

use std::fs;
use std::process::{Command, Stdio};
use std::thread;
use std::time::{Duration, Instant};

use program::{PROGRAM, Place, Ran, brisk, fixture, listing};

/// A station whose interferometer is a folder of captures.
const FOLDER_STATION: &str = r#"
station   = "captures"
time_zone = "Europe/Lisbon"
[interferometer]
source = "folder"
fsr = "6.4 GHz"
fsr_u = "0.3 %"
"#;

/// A place with captures of a sound tube in `captures/`, and a station file for them.
fn with_captures(more: &[&str]) -> Place {
    let place = Place::new();
    place.write("station.toml", FOLDER_STATION);
    let arguments =
        ["simulate", "captures", "--type", "quad-375", "--captures", "2", "--samples", "6000", "--after", "600s"];
    place.run(&[&arguments[..], more].concat()).ends(0, &[]);
    place
}

/// The first capture of a place.
fn first_capture(place: &Place) -> String {
    let name = listing(place.path()).into_iter().find(|line| line.contains(".csv ")).unwrap();
    name.rsplit_once(' ').unwrap().0.to_owned()
}

fn measure(place: &Place, capture: &str) -> Ran {
    place.run(&["measure", capture, "--fsr", "6.4GHz", "--fsr-u", "0.3%", "--format", "json"])
}

/// The one JSON object of a measurement.
fn object(ran: &Ran) -> serde_json::Value {
    assert_eq!(ran.out.lines().count(), 1, "{}", ran.out);
    serde_json::from_str(ran.out.trim()).unwrap()
}

/// Replaces a column of the samples of a capture.
fn rewrite(place: &Place, capture: &str, change: impl Fn(usize, &mut Vec<String>)) {
    let text = fs::read_to_string(place.join(capture)).unwrap();
    let mut row = 0;
    let lines = text.lines().map(|line| {
        if line.starts_with(|c: char| c.is_ascii_digit() || c == '-') {
            let mut cells: Vec<String> = line.split(',').map(str::to_owned).collect();
            change(row, &mut cells);
            row += 1;
            cells.join(",")
        } else {
            line.to_owned()
        }
    });
    let text = lines.collect::<Vec<_>>().join("\n") + "\n";
    fs::write(place.join(capture), text).unwrap();
}

#[test]
fn an_unknown_type_is_named_with_those_there_are() {
    let place = Place::new();
    let ran = place.inspect("BRISK-1", &["--type", "brisk-105"]);
    ran.ends(30, &["unknown tube type `brisk-105`", "expected one of brisk-150", "nearest known type: brisk-150"]);
    ran.leaves_nothing();
    for path in ["../brisk", "/etc", ".", ""] {
        place.inspect("BRISK-1", &["--type", path]).ends(30, &["unknown tube type"]).leaves_nothing();
    }
}

#[test]
fn a_serial_that_cannot_be_one_is_refused() {
    let place = Place::new();
    let cases = [
        ("a\u{7}b", "U+0007"),
        ("a\nb", "U+000A"),
        ("", "empty"),
        (&"x".repeat(65), "65 characters"),
        (&"🔬".repeat(64), "256 bytes"),
    ];
    for (serial, why) in cases {
        place.inspect(serial, &[]).ends(30, &[why, "expected 1 to 64 printable characters"]).leaves_nothing();
    }
    place.inspect("BRISK-9", &[]).ends(30, &["has no tube `BRISK-9`", "BRISK-1"]).leaves_nothing();
}

#[test]
fn a_serial_with_path_characters_never_becomes_a_path() {
    for serial in ["../../outside", "..", "/etc/passwd", "a/b", &"é".repeat(64)] {
        let place = with_captures(&[]);
        let arguments = ["--type", "brisk-150", "--station", "station.toml", "--captures", "captures"];
        let ran = place.inspect(serial, &arguments);
        ran.is_calm();
        assert!(matches!(ran.status, Some(20 | 21)), "{}", ran.err);
        let new: Vec<&String> = ran.after.iter().filter(|line| !ran.before.contains(line)).collect();
        assert!(new.iter().all(|line| line.starts_with("reports/")), "{new:?}");
        assert!(place.find("record.csv").is_some(), "{serial} has no record");
    }
}

#[test]
fn a_capture_that_is_missing_or_empty_is_refused_and_the_others_are_measured() {
    let place = with_captures(&[]);
    place.write("empty.csv", "");
    let capture = first_capture(&place);
    let ran = place.run(&["measure", "absent.csv", &capture, "empty.csv", "--fsr", "6.4GHz", "--format", "json"]);
    ran.ends(30, &["cannot read `absent.csv`", "the file is empty"]).leaves_nothing();
    let lines: Vec<serde_json::Value> = ran.out.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!(lines.len(), 3);
    assert_eq!(lines[1]["capture"], capture.as_str());
    assert!(lines[1]["refused"].is_null() && lines[1]["mode_spacing_hz"].is_number(), "{}", lines[1]);
    assert!(lines[0]["refused"].is_string() && lines[0]["mode_spacing_hz"].is_null(), "{}", lines[0]);
}

#[test]
fn captures_that_cannot_be_read_give_hold() {
    let place = with_captures(&[]);
    for capture in listing(&place.join("captures")).iter().filter(|line| line.contains(".csv ")) {
        fs::write(place.join("captures").join(capture.rsplit_once(' ').unwrap().0), "").unwrap();
    }
    let arguments = ["--type", "open-500", "--station", "station.toml", "--captures", "captures"];
    let home = env!("CARGO_MANIFEST_DIR");
    let ran = place.inspect("R-1", &[&arguments[..], &["--home", home]].concat());
    ran.ends(21, &["hold", "the file is empty"]).leaves_one_record();
}

#[test]
fn a_folder_without_captures_or_without_its_station_is_refused() {
    let place = Place::new();
    place.write("station.toml", FOLDER_STATION);
    place.write("captures/notes.md", "nothing");
    let common = ["--type", "brisk-150", "--station", "station.toml", "--captures"];
    place.inspect("R-1", &[&common[..], &["captures"]].concat()).ends(30, &["holds no capture"]).leaves_nothing();
    place.inspect("R-1", &[&common[..], &["absent"]].concat()).ends(30, &["cannot read", "absent"]).leaves_nothing();
    let scenario = ["inspect", "R-1", "--type", "brisk-150", "--station", "station.toml"];
    place.run(&scenario).ends(30, &["`--captures FOLDER`"]).leaves_nothing();
    place.write("blind.toml", "station = \"b\"\ntime_zone = \"Europe/Lisbon\"\n");
    place.write("captures/c1.csv", "1,2\n");
    let blind = ["--type", "brisk-150", "--station", "blind.toml", "--captures", "captures"];
    place.inspect("R-1", &blind).ends(30, &["has no [interferometer]"]).leaves_nothing();
}

#[test]
fn numbers_that_are_none_are_refused_or_left_out_with_a_word() {
    let place = with_captures(&[]);
    let capture = first_capture(&place);
    rewrite(&place, &capture, |row, cells| {
        if (3000..3005).contains(&row) {
            cells[2] = "NaN".to_owned();
        }
    });
    let ran = measure(&place, &capture);
    ran.is_calm();
    ran.leaves_nothing();
    let text = object(&ran).to_string();
    assert!(text.contains("number") || text.contains("NaN"), "{text}");
    rewrite(&place, &capture, |_, cells| cells[2..].fill("NaN".to_owned()));
    measure(&place, &capture).ends(30, &["refused"]).leaves_nothing();
}

#[test]
fn one_order_alone_has_no_scale() {
    // Less than an order, but enough that the modes are in it: in a shorter ramp there may be noise alone.
    let place = with_captures(&["--orders", "0.8"]);
    let ran = measure(&place, &first_capture(&place));
    ran.ends(30, &[]).leaves_nothing();
    let object = object(&ran);
    assert!(object["mode_spacing_hz"].is_null());
    let why = object["refused"].as_str().unwrap();
    assert!(why.contains("scale") || why.contains("repeat"), "{why}");
}

#[test]
fn a_dark_tube_is_refused_by_measure_and_fails_in_inspect() {
    let place = with_captures(&[]);
    let capture = first_capture(&place);
    // Sound captures without their light: what is left in both photodiodes is noise.
    let dark = |row: usize| format!("{:.4}", 0.05 + 0.001 * ((row * 7919) % 13) as f64);
    rewrite(&place, &capture, |row, cells| cells[2..].fill(dark(row)));
    measure(&place, &capture).ends(30, &["no peak stands above the noise"]).leaves_nothing();
    Place::new().inspect("BRISK-2", &[]).ends(20, &["dark"]).leaves_one_record();
}

#[test]
fn clipped_peaks_are_measured_with_a_word_or_refused() {
    let place = with_captures(&[]);
    let capture = first_capture(&place);
    let text = fs::read_to_string(place.join(&capture)).unwrap();
    let column = |line: &str| line.split(',').nth(2).and_then(|cell| cell.parse::<f64>().ok());
    let highest = text.lines().filter_map(column).fold(f64::MIN, f64::max);
    rewrite(&place, &capture, |_, cells| {
        let value: f64 = cells[2].parse().unwrap();
        cells[2] = format!("{}", value.min(0.6 * highest));
    });
    let ran = measure(&place, &capture);
    ran.is_calm();
    ran.leaves_nothing();
    assert!(object(&ran).to_string().contains("clip"), "{}", ran.out);
}

#[test]
fn a_report_path_below_a_plain_file_is_refused() {
    let place = Place::new();
    place.write("plain", "here first");
    for path in ["plain", "plain/below", "plain/below/it"] {
        place.inspect("BRISK-1", &["--reports", path]).ends(32, &["plain", "`--reports`"]).leaves_nothing();
    }
    assert_eq!(fs::read(place.join("plain")).unwrap(), b"here first");
}

#[test]
fn a_disk_that_is_full_leaves_whole_lines_and_the_same_record_later() {
    let undisturbed = Place::new();
    undisturbed.inspect("BRISK-1", &[]).ends(0, &[]);
    let expected = fs::read(undisturbed.find("record.csv").unwrap()).unwrap();
    let place = Place::new();
    let arguments = brisk("BRISK-1", &[]);
    // Files cannot grow beyond 64 blocks: writing fails as on a full disk. The signal that goes with it is ignored.
    let script = format!("trap '' XFSZ; ulimit -f 64; exec {PROGRAM} \"$@\"");
    let output =
        Command::new("sh").args(["-c", &script, "sh"]).args(&arguments).current_dir(place.path()).output().unwrap();
    let ran = place.ran(Vec::new(), output);
    ran.ends(32, &["could not be stored", "events.jsonl", "the same command"]);
    let events = fs::read(place.find("events.jsonl").unwrap()).unwrap();
    assert_eq!(events.last(), Some(&b'\n'), "the torn line was cut off");
    assert!(place.find("record.csv").is_none());
    place.inspect("BRISK-1", &[]).ends(0, &[]);
    assert!(fs::read(place.find("record.csv").unwrap()).unwrap() == expected);
}

#[test]
fn results_that_cannot_be_written_are_said() {
    let full = std::path::Path::new("/dev/full");
    if !full.exists() {
        println!("no /dev/full here: skipped");
        return;
    }
    let place = with_captures(&[]);
    let mut command = place.command(&["measure", &first_capture(&place), "--fsr", "6.4GHz"]);
    let output = command.stdout(fs::OpenOptions::new().write(true).open(full).unwrap()).output().unwrap();
    place.ran(Vec::new(), output).ends(32, &["cannot write to standard output"]);
}

#[test]
fn an_answer_file_with_a_wrong_key_is_refused_or_leaves_the_sheet_open() {
    let place = Place::new();
    let wrong = fixture("answers.toml").replace("technician", "tecnician");
    let file = place.write("wrong.toml", wrong);
    let ran = place.inspect("BRISK-1", &["--answers", &file]);
    ran.ends(30, &["tecnician", "technician", ":1:"]).leaves_nothing();
    let wrong = fixture("answers.toml").replace("run_voltage", "run_volts");
    let file = place.write("wrong.toml", wrong);
    place.inspect("BRISK-1", &["--answers", &file]).ends(22, &["`run_voltage = …`", "run_volts", "stays open"]);
    assert!(place.find("events.jsonl").is_some() && place.find("record.csv").is_none());
    // The same sheet goes on as soon as the answer is there.
    let file = place.write("right.toml", fixture("answers.toml"));
    place.inspect("BRISK-1", &["--answers", &file]).ends(0, &["taken up again", "pass"]);
    assert_eq!(listing(&place.join("reports/2026/BRISK-1")).iter().filter(|l| l.contains("events")).count(), 1);
}

#[test]
fn an_answer_file_without_any_one_line_names_what_is_missing() {
    let text = fixture("answers.toml");
    let lines: Vec<&str> = text.lines().collect();
    // What the program takes from elsewhere when the line is missing.
    let optional = ["tube_type", "time_to_answer"];
    let full = Place::new();
    full.inspect("BRISK-1", &["--answers", &full.write("answers.toml", &text)]).ends(0, &["pass"]);
    for (index, line) in lines.iter().enumerate().filter(|(_, line)| !line.trim().is_empty()) {
        let place = Place::new();
        let rest: Vec<&str> = lines.iter().enumerate().filter(|(i, _)| *i != index).map(|(_, line)| *line).collect();
        let file = place.write("answers.toml", rest.join("\n"));
        let ran = place.inspect("BRISK-1", &["--answers", &file]);
        let key = line.split(" =").next().unwrap();
        if optional.contains(&key) {
            ran.ends(0, &["pass"]);
        } else if key.starts_with('[') {
            ran.is_calm();
            assert!(matches!(ran.status, Some(22 | 30)), "without `{line}`: {:?}\n{}", ran.status, ran.err);
        } else {
            ran.ends(22, &[key]);
        }
        assert_eq!(place.find("record.csv").is_some(), ran.status == Some(0), "without `{line}`");
    }
}

#[test]
fn a_real_bench_without_answers_keeps_the_sheet_open() {
    let place = Place::new();
    let station = "station = \"b\"\ntime_zone = \"Europe/Lisbon\"\n";
    place.write("station.toml", station);
    let arguments = ["inspect", "R-1", "--type", "twin-150", "--station", "station.toml", "--reports", "reports"];
    place.run(&arguments).ends(22, &["`steps.strike.", "`--ask`", "stays open"]);
    assert!(place.find("events.jsonl").is_some() && place.find("record.csv").is_none());
    let paced = [&arguments[..], &["--pace", "10x"]].concat();
    place.run(&paced).ends(30, &["only that has a pace"]).leaves_nothing();
}

#[test]
fn two_runs_of_one_serial_at_once_are_not_allowed() {
    let place = Place::new();
    let slow = brisk("BRISK-1", &["--pace", "1x"]);
    let slow: Vec<&str> = slow.iter().map(String::as_str).collect();
    let mut first =
        place.command(&slow).stdin(Stdio::null()).stdout(Stdio::null()).stderr(Stdio::null()).spawn().unwrap();
    let began = Instant::now();
    while place.find("events.jsonl").is_none() && began.elapsed() < Duration::from_secs(60) {
        thread::sleep(Duration::from_millis(20));
    }
    let second = place.inspect("BRISK-1", &[]);
    let process = format!("process {}", first.id());
    first.kill().unwrap();
    first.wait().unwrap();
    second.ends(32, &["`BRISK-1` is already being inspected", &process]);
    // The lock went with its process.
    place.inspect("BRISK-1", &[]).ends(0, &["taken up again"]);
}

#[test]
fn an_overdue_certificate_gives_hold() {
    let place = Place::new();
    let text = fixture("bench.toml").replacen("due = 2027-01-12", "due = 2026-03-01", 2);
    let station = place.write("overdue.toml", text);
    place.inspect("BRISK-1", &["--station", &station]).ends(21, &["hold", "was due 2026-03-01"]).leaves_one_record();
}

#[test]
fn the_demo_tube_on_the_bench_whose_meter_lapsed_gives_hold() {
    let place = Place::new();
    // Home is the folder itself: the types, the station and the scenario are those compiled in.
    let ran = place.run(&["inspect", "DEMO-0012", "--pace", "1e9x", "--format", "json"]);
    ran.ends(21, &["SIM-0012", "was due 2026-03-01"]).leaves_one_record();
    let lines: Vec<serde_json::Value> = ran.out.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!(lines.last().unwrap()["verdict"], "hold");
    assert!(place.join(lines.last().unwrap()["record_pdf"].as_str().unwrap()).is_file());
    assert!(lines.iter().any(|line| line["mode_spacing_hz"].is_number()));
}

#[test]
fn a_station_file_with_faults_lists_them_all() {
    let place = Place::new();
    let text = fixture("bench.toml").replace("Lisbon", "Lisbonne").replace("\"1 %\"", "\"1 mV\"");
    let station = place.write("faulty.toml", text);
    let ran = place.inspect("BRISK-1", &["--station", &station]);
    ran.ends(30, &["faulty.toml:2:", "Europe/Lisbon", "`mV` is not a unit of a ratio"]).leaves_nothing();
}

#[test]
fn changed_events_are_found_out() {
    let place = Place::new();
    let answers = fixture("answers.toml").replace("run_voltage", "run_volts");
    let file = place.write("answers.toml", answers);
    place.inspect("BRISK-1", &["--answers", &file]).ends(22, &[]);
    let path = place.find("events.jsonl").unwrap();
    let text = fs::read_to_string(&path).unwrap();
    fs::write(&path, text.replacen("\"number\":0.6", "\"number\":0.5", 1)).unwrap();
    place.inspect("BRISK-1", &[]).ends(32, &["events.jsonl", "does not follow from the line before"]).leaves_nothing();
}

#[test]
fn wrong_usage_ends_in_two() {
    let place = Place::new();
    for arguments in [&["inspect"][..], &["measure", "x.csv"], &["inspect", "A", "--pace", "fast"], &["nothing"]] {
        place.run(arguments).ends(2, &["error:"]).leaves_nothing();
    }
}

#[test]
fn a_person_at_the_terminal_is_asked_again_after_a_wrong_answer() {
    use std::io::Write as _;
    let place = Place::new();
    let arguments = brisk("BRISK-1", &["--ask"]);
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let typed = "KT\nmuch\n0.6\n1\nskip: no probe\n4.0 mA\n1.281\n3.0\nclean\n";
    let mut command = place.command(&arguments);
    let mut child = command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    child.stdin.take().unwrap().write_all(typed.as_bytes()).unwrap();
    let ran = place.ran(Vec::new(), child.wait_with_output().unwrap());
    ran.ends(0, &["Your initials", "does not start with a number", "no probe", "pass"]);
    assert!(fs::read_to_string(place.find("record.csv").unwrap()).unwrap().contains(",KT,"));
}
