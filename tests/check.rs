//! Every file of `limits/` and of the demo reads without a fault; planted faults are all reported.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::{fs, path::Path};

use tubewright::{
    cli::check::{CheckArgs, check, check_texts},
    limits::Limits,
    recipe::Recipe,
    station::file::StationFile,
};

fn text(path: &str) -> String {
    fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join(path)).unwrap()
}

const TYPES: [&str; 5] = ["twin-150", "plate-250", "quad-375", "open-500", "open-800"];

#[test]
fn the_types_of_the_demo_have_no_fault() {
    for tube_type in TYPES {
        let recipe = Recipe::parse("recipe.toml", &text(&format!("limits/{tube_type}/recipe.toml"))).unwrap();
        let limits = text(&format!("limits/{tube_type}/limits.toml"));
        let limits = Limits::parse_for("limits.toml", &limits, &recipe.fillable()).unwrap();
        // ± 2 % about the nominal spacing, written with one decimal of a megahertz.
        let bounds = (limits.limits[0].lower.of("").unwrap(), limits.limits[0].upper.of("").unwrap());
        assert!((bounds.0 / recipe.nominal_spacing - 0.98).abs() < 3e-4, "{tube_type}");
        assert!((bounds.1 / recipe.nominal_spacing - 1.02).abs() < 3e-4, "{tube_type}");
    }
}

#[test]
fn the_benches_of_the_demo_have_no_fault_and_one_is_overdue() {
    let day = chrono::NaiveDate::from_ymd_opt(2026, 3, 2).unwrap();
    let bench = |name: &str| StationFile::parse(name, &text(&format!("fixtures/demo/{name}.toml"))).unwrap();
    assert!(bench("bench-1").overdue_on(day).is_empty());
    let overdue = bench("bench-2").overdue_on(day);
    let overdue: Vec<String> = overdue.iter().map(|sentence| sentence.english()).collect();
    assert_eq!(overdue, ["The certificate SIM-0012 of the power meter was due 2026-03-01."]);
    assert!(bench("bench-2").overdue_on(day.pred_opt().unwrap()).is_empty(), "it holds on its last day");
}

fn reports(files: &[(&str, &str)]) -> String {
    check_texts(files).iter().map(|fault| format!("{fault}\n")).collect()
}

#[test]
fn nine_faults_give_nine_reports_in_file_order() {
    let text = text("fixtures/check/nine.toml");
    assert_eq!(check_texts(&[("nine.toml", &text)]).len(), 9);
    insta::assert_snapshot!(reports(&[("nine.toml", &text)]), @r#"
    nine.toml:1:12: `revision` is the number 0; expected a whole number from 1 to 1000000
    nine.toml:4:12: `rule` is `gaurded`; expected shared, guarded, or a conformance probability above 50 % and below 100 % such as "95 %"
      nearest known word: guarded
    nine.toml:7:13: unknown measurand `mode_spaceing`; expected a key of the catalogue, or `visual.` and a look
      nearest known word: mode_spacing
    nine.toml:14:34: unknown grade `alignement`; expected one of prime, alignment
      nearest known word: alignment
    nine.toml:20:13: the lower bound is above the upper; expected it below
    nine.toml:27:13: `upper`: `mm` is not a unit of a time; expected one of s, ms, µs, min, h
    nine.toml:28:1: unknown key `severety` in limit 4; expected one of measurand, lower, upper, wanted, rule, severity, reject, outside, rack
      nearest known word: severity
    nine.toml:33:13: `upper` is the number 1.0; expected a time in quotes with its unit, such as "1.0 s"
    nine.toml:40:13: `severity` is `trivial`; expected one of critical, major, minor
      nearest known word: critical
    "#);
}

#[test]
fn broken_syntax_is_one_report() {
    let text = text("fixtures/check/broken.toml");
    insta::assert_snapshot!(reports(&[("broken.toml", &text)]), @r#"broken.toml:2:48: broken syntax: invalid basic string, expected `"`"#);
}

#[test]
fn faults_of_a_recipe() {
    let text = r#"
revision = 1
nominal_spacing = "999.3 mm"
wavelength = "632.991 nm"
retest = 1
[[step]]
name = "warm"
do = "dwel"
[[step]]
name = "comb"
do = "comb"
from = "warn"
[[step]]
name = "noise"
do = "noise"
lowest = "60 Hz"
[[step]]
name = "comb"
do = "sweep"
captures = "five"
[[step]]
name = "watching"
do = "watch"
from = "comb"
[[step]]
name = "look"
do = "look"
ask = "What colour"
choices = ["pink", "pink"]
"#;
    insta::assert_snapshot!(reports(&[("recipe.toml", text)]), @r#"
    recipe.toml:3:19: `nominal_spacing`: `mm` is not a unit of a frequency; expected one of Hz, kHz, MHz, GHz, THz
    recipe.toml:5:1: unknown key `retest` in the file; expected one of revision, nominal_spacing, wavelength, mode_floor, retests, step
      nearest known word: retests
    recipe.toml:8:6: unknown step `dwel`; expected one of strike, dwell, sweep, comb, envelope, polarizer, watch, power, noise, supply, beam, look
      nearest known word: dwell
    recipe.toml:12:8: `from` names `warn`, no earlier step; expected an earlier dwell or sweep step
      nearest known word: warm
    recipe.toml:16:10: `lowest` is the text "60 Hz"; expected a frequency from 1 Hz to 40 Hz, below the mains
    recipe.toml:18:8: two steps are named `comb`; expected each name once
    recipe.toml:20:12: `captures` is the text "five"; expected a whole number from 1 to 100000
    recipe.toml:24:8: `from` names `comb`, a comb step; expected an earlier dwell step
      nearest known word: warm
    recipe.toml:29:11: `choices` has one word; expected at least two to choose from
    recipe.toml:29:20: `pink` stands twice in `choices`; expected it once
    "#);
}

#[test]
fn faults_of_a_station_and_of_answers() {
    let station = r#"
station = "bench-1"
time_zone = "Europe/Lisabon"
shifts = ["6 am"]
[interferometer]
source = "simulate"
fsr = "6.4 GHz"
fsr_u = "80 %"
columns = "time=1,foto=2"
certificate = { number = "SIM-0001", date = 2026-01-12, due = 2025-01-12, in = "water" }
[power_meter]
source = "typed"
factor = -1.0
certificate = { number = 5, date = "2026-01-12" }
[spply]
source = "typed"
"#;
    let answers = r#"
technitian = "KT"
time_to_answer = "4 m"
[steps.strike]
tries = -1
done = false
"#;
    insta::assert_snapshot!(reports(&[("station.toml", station), ("answers.toml", answers)]), @r#"
    station.toml:3:13: unknown time zone `Europe/Lisabon`; expected an IANA name such as Europe/Lisbon
      nearest known word: Europe/Lisbon
    station.toml:4:11: `6 am` is no time of day; expected hours and minutes such as "06:00"
    station.toml:6:10: unknown source `simulate`; expected one of simulated, folder, profile:<name>
      nearest known word: simulated
    station.toml:8:9: `fsr_u` is the text "80 %"; expected a share from 0 % to 20 %, with its sign: `0.3 %`
    station.toml:9:11: unknown channel `foto` in `columns`; expected one of time, ramp, photodiode, crossed
    station.toml:10:63: `due` 2025-01-12 is before `date` 2026-01-12; expected it after
    station.toml:10:80: `in` is `water`; expected one of air, vacuum
    station.toml:11:1: [power_meter] has no `u`; expected one
    station.toml:13:10: `factor` is the number -1.0; expected a ratio above zero
    station.toml:14:15: the certificate has no `due`; expected one
    station.toml:14:26: `number` is the number 5; expected text in quotes
    station.toml:14:36: `date` is the text "2026-01-12"; expected a day such as 2026-01-12, without quotes
    station.toml:15:2: unknown key `spply` in the file; expected one of station, language, time_zone, shifts, interferometer, power_meter, supply, polarizer, light_detector, reference
      nearest known word: supply
    answers.toml:2:1: unknown key `technitian` in the file; expected one of technician, tube_type, retest, time_to_answer, lit_since, steps
      nearest known word: technician
    answers.toml:3:18: `time_to_answer`: `m` is not a unit of a time; expected one of s, ms, µs, min, h
    answers.toml:5:9: `tries` is the number -1; expected a whole number from 0 to 4294967295
    answers.toml:6:8: `done` is false; expected true, or no line at all
    "#);
}

#[test]
fn a_limit_that_no_step_fills_is_a_fault_of_the_limits_file() {
    let recipe = text("limits/twin-150/recipe.toml");
    let limits = r#"
revision = 1
title = "t"
grades = ["one"]
rule = "99.9 %"
[[limit]]
measurand = "extinction"
lower = 500
severity = "major"
reject = "x"
[[limit]]
measurand = "visual.output_miror"
wanted = "clean"
severity = "major"
reject = "x"
[[limit]]
measurand = "visual.getter"
wanted = ["bright", "milk"]
severity = "major"
reject = "x"
"#;
    let files = [("a/limits.toml", limits), ("a/recipe.toml", recipe.as_str())];
    insta::assert_snapshot!(reports(&files), @r#"
    a/limits.toml:7:13: `extinction` is limited, but no step of the recipe fills it; expected one that a step fills
    a/limits.toml:12:13: `visual.output_miror` is limited, but no step of the recipe fills it; expected one that a step fills
      nearest known word: visual.output_mirror
    a/limits.toml:18:10: `milk` is no choice of that look; expected one of bright, milky, brown, none
      nearest known word: milky
    "#);
    assert_eq!(reports(&[("a/limits.toml", limits), ("b/recipe.toml", recipe.as_str())]), "", "another type's recipe");
}

#[test]
fn folders_are_searched_and_unreadable_paths_reported() {
    let home = Path::new(env!("CARGO_MANIFEST_DIR"));
    let run = |paths: &[&Path]| {
        let mut out = Vec::new();
        let args = CheckArgs { paths: paths.iter().map(|path| path.to_path_buf()).collect() };
        let n = check(&args, Some(home), &mut out).unwrap();
        (n, String::from_utf8(out).unwrap())
    };
    assert_eq!(run(&[]), (0, "0 faults in 10 files\n".to_owned()));
    assert_eq!(run(&[&home.join("fixtures/demo/bench-1.toml")]), (0, "0 faults in 1 file\n".to_owned()));
    let (n, said) = run(&[&home.join("fixtures/check"), Path::new("no/such/file.toml")]);
    assert_eq!(n, 11, "nine, one of the broken syntax, one unreadable:\n{said}");
    assert!(said.contains("no/such/file.toml:1:1: the file cannot be read: "), "{said}");
    assert!(said.ends_with("11 faults in 2 files\n"), "{said}");
}

#[test]
fn no_text_makes_the_readers_panic() {
    // Every prefix of sound files, and each with a byte's place taken by a sign that opens something.
    for (name, path) in [
        ("limits.toml", "limits/twin-150/limits.toml"),
        ("recipe.toml", "limits/twin-150/recipe.toml"),
        ("station.toml", "fixtures/demo/bench-1.toml"),
    ] {
        let text = text(path);
        for (at, _) in text.char_indices().step_by(7) {
            let _ = check_texts(&[(name, &text[..at])]);
            for sign in ["\"", "[", "{", "=", "é", "0", "\0", "\n"] {
                let spoilt = format!("{}{sign}{}", &text[..at], &text[at..]);
                for fault in check_texts(&[(name, &spoilt)]) {
                    assert!(fault.line >= 1 && fault.column >= 1, "{fault}");
                }
            }
        }
    }
}

#[test]
fn half_a_tube_type_is_a_fault() {
    let home = tempfile::tempdir().unwrap();
    let folder = home.path().join("limits/half-150");
    fs::create_dir_all(&folder).unwrap();
    fs::write(folder.join("limits.toml"), text("limits/twin-150/limits.toml")).unwrap();
    let mut out = Vec::new();
    let args = CheckArgs { paths: vec![home.path().join("limits")] };
    assert_eq!(check(&args, Some(home.path()), &mut out).unwrap(), 1);
    let out = String::from_utf8(out).unwrap();
    assert!(out.contains("a tube type with `limits.toml` but no `recipe.toml`; expected both"), "{out}");
}
