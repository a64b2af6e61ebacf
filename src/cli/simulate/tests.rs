//! Tests of `simulate`.
//! Must not leave anything behind: folders are temporary.
#![allow(clippy::unwrap_used)]
use clap::Parser;

use super::*;

#[derive(Parser)]
struct Program {
    #[command(flatten)]
    args: SimulateArgs,
}

fn args(folder: &Path, more: &[&str]) -> SimulateArgs {
    let folder = folder.to_str().unwrap();
    Program::try_parse_from(["simulate", folder].iter().chain(more)).unwrap().args
}

fn listing(folder: &Path) -> Vec<(String, Vec<u8>)> {
    let mut files: Vec<_> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap())
        .map(|entry| (entry.file_name().into_string().unwrap(), fs::read(entry.path()).unwrap()))
        .collect();
    files.sort();
    files
}

#[test]
fn the_same_seed_gives_the_same_bytes() {
    let home = tempfile::tempdir().unwrap();
    let write = |name: &str, seed: &str| {
        let folder = home.path().join(name);
        run(&args(&folder, &["--captures", "3", "--seed", seed, "--hop", "600ms=50MHz"])).unwrap();
        listing(&folder)
    };
    let first = write("a", "7");
    assert_eq!(first.len(), 4);
    assert!(first == write("b", "7"));
    assert!(first != write("c", "8"));
}

#[test]
fn nothing_is_written_over() {
    let home = tempfile::tempdir().unwrap();
    fs::write(home.path().join("c00001.csv"), "mine").unwrap();
    let refused = run(&args(home.path(), &["--captures", "3"]));
    assert!(matches!(refused, Err(SimulateError::InTheWay(path)) if path.ends_with("c00001.csv")));
    assert_eq!(listing(home.path()), [("c00001.csv".to_owned(), b"mine".to_vec())]);
}

#[test]
fn a_lost_capture_is_missing_and_the_truth_says_so() {
    let home = tempfile::tempdir().unwrap();
    let made = run(&args(home.path(), &["--captures", "4", "--lose", "600ms", "--type", "twin-150"])).unwrap();
    assert_eq!(made, Simulated { written: 3, lost: 1 });
    let names: Vec<String> = listing(home.path()).into_iter().map(|(name, _)| name).collect();
    assert_eq!(names, ["c00000.csv", "c00001.csv", "c00003.csv", "truth.json"]);
}

#[test]
fn impossible_numbers_are_refused_by_name() {
    let home = tempfile::tempdir().unwrap();
    let folder = home.path().join("new");
    let refused = run(&args(&folder, &["--finesse", "1"])).unwrap_err().to_string();
    assert!(refused.starts_with("`--finesse` is 1 in SI units; expected 2 or more"), "{refused}");
    assert!(!folder.exists());
}

#[test]
fn faults_change_the_captures_and_the_truth_says_how() {
    let home = tempfile::tempdir().unwrap();
    let made = |name: &str, more: &[&str]| {
        let folder = home.path().join(name);
        run(&args(&folder, &[&["--captures", "2", "--type", "plate-250"][..], more].concat())).unwrap();
        let truth: serde_json::Value = serde_json::from_slice(&fs::read(folder.join(TRUTH)).unwrap()).unwrap();
        (fs::read(folder.join("c00001.csv")).unwrap(), truth)
    };
    let (sound, truth) = made("sound", &[]);
    assert_eq!((&truth["helium_share"], &truth["discharge"]), (&1.0.into(), &"salmon".into()));
    let faults = ["--fault", "helium-lost=45%", "--fault", "walked-mirror = 0.1 mrad"];
    let (captured, truth) = made("faulty", &faults);
    assert!(captured != sound);
    assert_eq!((&truth["helium_share"], &truth["discharge"]), (&0.55.into(), &"deep red-orange".into()));
    assert_eq!((&truth["mirror_tilt_rad"], &truth["press_test"]), (&1e-4.into(), &"rises".into()));
    assert!(truth["power_w"].as_f64().unwrap() < 0.5 * 2.5e-3, "{truth}");
    // Zero of a fault is no fault: the same bytes.
    let (same, _) = made("zero", &["--fault", "wear=0%", "--fault", "draught=0K"]);
    assert!(same == sound);
}

#[test]
fn faults_that_cannot_be_are_refused_with_what_can() {
    for (given, words) in [
        ("helium-lots=3%", "the nearest known one is `helium-lost`"),
        ("wear", "`wear` has no amount"),
        ("wear=150%", "expected 0 to 100 %"),
        ("draught=3 MHz", "is not a unit of a temperature"),
    ] {
        let refused = Program::try_parse_from(["simulate", "x", "--fault", given]).map(|it| it.args.captures);
        let words_found = refused.unwrap_err().to_string();
        assert!(words_found.contains(words), "{given}: {words_found}");
    }
}

#[test]
fn help_and_readme_know_every_kind_of_fault() {
    let help = <Program as clap::CommandFactory>::command().render_long_help().to_string();
    let readme = include_str!("../../../README.md");
    for kind in FAULT_KINDS {
        assert!(help.contains(kind.word) && help.contains(kind.range), "{} in --help", kind.word);
        assert!(readme.contains(&format!("`{}`", kind.word)), "{} in README", kind.word);
    }
}
