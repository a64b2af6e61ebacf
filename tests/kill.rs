//! A run killed at random instants, then started by the same command again, ends in the same record.
//! Must not wait for anything but the program.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod program;

use std::fs;
use std::process::Stdio;
use std::thread;
use std::time::{Duration, Instant};

use program::{Place, brisk};
use rand_chacha::ChaCha8Rng;
use rand_core::{RngCore as _, SeedableRng as _};

/// Any seed must do; a fixed one makes a failure come again (as far as the machine's timing allows).
const SEED: u64 = 20_260_302;
/// Instants at which a process is killed.
const KILLS: u32 = 50;
/// Kills of one run before it is let through: later instants are reached only by runs that live on.
const KILLS_A_RUN: u32 = 5;

const RECORD: [&str; 4] = ["record.csv", "budget.csv", "record.csv-metadata.json", "record.pdf"];

/// The four files of the record in a folder.
fn record(place: &Place) -> Vec<Vec<u8>> {
    RECORD.iter().map(|name| fs::read(place.find(name).unwrap_or_else(|| panic!("no {name}"))).unwrap()).collect()
}

/// Names of what is left, without lengths: the events of an interrupted run hold more lines.
fn names(listing: &[String]) -> Vec<&str> {
    listing.iter().map(|line| line.rsplit_once(' ').unwrap().0).collect()
}

#[test]
fn a_run_killed_at_fifty_random_instants_ends_in_the_same_record() {
    let undisturbed = Place::new();
    let began = Instant::now();
    let reference = undisturbed.inspect("BRISK-1", &[]);
    let whole_ms = u64::try_from(began.elapsed().as_millis()).unwrap().max(20);
    reference.ends(0, &[]);
    let expected = record(&undisturbed);
    let mut random = ChaCha8Rng::seed_from_u64(SEED);
    let (mut kills, mut resumed) = (0, 0);
    while kills < KILLS {
        let place = Place::new();
        let arguments = brisk("BRISK-1", &[]);
        let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
        for _ in 0..KILLS_A_RUN {
            let mut command = place.command(&arguments);
            let mut child = command.stdin(Stdio::null()).stdout(Stdio::null()).stderr(Stdio::null()).spawn().unwrap();
            thread::sleep(Duration::from_millis(random.next_u64() % (whole_ms * 6 / 10)));
            child.kill().unwrap();
            kills += 1;
            if child.wait().unwrap().success() {
                break;
            }
        }
        if place.find("record.csv").is_none() {
            place.run(&arguments).ends(0, &[]);
        }
        assert!(record(&place) == expected, "after {kills} kills the record is another");
        assert_eq!(names(&program::listing(place.path())), names(&reference.after));
        let events = fs::read_to_string(place.find("events.jsonl").unwrap()).unwrap();
        resumed += events.matches("\"kind\":\"resumed\"").count();
    }
    // Kills before the first event or after the last leave nothing to take up; not all may be of those.
    assert!(resumed > 10, "only {resumed} of {kills} kills came amid a run: the test no longer tests");
}

#[test]
fn events_cut_at_any_byte_end_in_the_same_record() {
    let place = Place::new();
    place.inspect("BRISK-1", &[]).ends(0, &[]);
    let expected = record(&place);
    let path = place.find("events.jsonl").unwrap();
    let events = fs::read(&path).unwrap();
    let mut random = ChaCha8Rng::seed_from_u64(SEED + 1);
    for _ in 0..8 {
        let cut = usize::try_from(random.next_u64()).unwrap() % events.len();
        fs::write(&path, &events[..cut]).unwrap();
        fs::remove_file(path.with_file_name("record.csv")).unwrap();
        place.inspect("BRISK-1", &[]).ends(0, &[]);
        assert!(record(&place) == expected, "cut after byte {cut} of {}", events.len());
    }
}

#[test]
fn a_run_fed_from_captures_goes_on_with_the_next_capture() {
    let place = Place::new();
    let station = program::fixture("bench.toml").replacen("\"simulated\"", "\"folder\"", 1);
    place.write("station.toml", station);
    // Without times of their own: order and time of the captures are the program's.
    let simulate = ["simulate", "captures", "--type", "twin-150", "--captures", "120", "--samples", "1500"];
    place.run(&simulate).ends(0, &[]);
    for entry in fs::read_dir(place.join("captures")).unwrap() {
        let path = entry.unwrap().path();
        let text = fs::read_to_string(&path).unwrap();
        fs::write(&path, text.replace("# captured_at", "# taken")).unwrap();
    }
    let more = ["--type", "brisk-150", "--station", "station.toml", "--captures", "captures"];
    let more = [&more[..], &["--seed", "1", "--start", "2026-03-02T08:00:00Z"]].concat();
    let first = place.inspect("C-1", &more);
    let status = first.status.unwrap();
    assert!([0, 20, 21].contains(&status), "{}", first.err);
    let expected = record(&place);
    let path = place.find("events.jsonl").unwrap();
    let events = fs::read(&path).unwrap();
    let mut random = ChaCha8Rng::seed_from_u64(SEED + 2);
    for _ in 0..6 {
        let cut = usize::try_from(random.next_u64()).unwrap() % events.len();
        fs::write(&path, &events[..cut]).unwrap();
        fs::remove_file(path.with_file_name("record.csv")).unwrap();
        place.inspect("C-1", &more).ends(status, &[]);
        assert!(record(&place) == expected, "cut after byte {cut} of {}", events.len());
    }
}
