//! The demo scenario as a technician's day: twelve tubes, every ending, for the reasons that are true of them.
//! Must not look into the library: the built program is run, and what it leaves is read.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod program;

use std::fs;
use std::sync::Mutex;
use std::thread;

use program::Place;
use serde_json::Value as Json;

/// A tube of the day: serial, ending, grade or reject code, and what its reason must say.
struct Expected {
    serial: &'static str,
    verdict: &'static str,
    /// Grade of a pass, code of a fail, empty for a hold.
    word: &'static str,
    reason: &'static [&'static str],
}

const fn tube(
    serial: &'static str,
    verdict: &'static str,
    word: &'static str,
    reason: &'static [&'static str],
) -> Expected {
    Expected { serial, verdict, word, reason }
}

/// The table of the scenario. A reason names the measurand and which way it is off.
const DAY: [Expected; 12] = [
    tube("DEMO-0001", "pass", "prime", &[]),
    tube("DEMO-0002", "pass", "prime", &[]),
    tube("DEMO-0003", "pass", "prime", &[]),
    tube("DEMO-0004", "fail", "dim", &["Power 0.2", "below 0.30 mW", "helium lost"]),
    tube("DEMO-0005", "fail", "off-axis", &["Off-axis light", "above 2 %"]),
    tube("DEMO-0006", "pass", "alignment", &["prime", "swaps"]),
    tube("DEMO-0007", "fail", "wrong-length", &["Mode spacing 42", "above 407.7 MHz", "wrong type or label"]),
    tube("DEMO-0008", "fail", "dim", &["Power", "below 0.90 mW", "mirror walked off"]),
    tube("DEMO-0009", "pass", "alignment", &["prime", "0.50 mW", "not by its expanded uncertainty"]),
    tube("DEMO-0010", "hold", "", &["did not settle"]),
    tube("DEMO-0011", "hold", "", &["Mains ripple", "repeat on another supply"]),
    tube("DEMO-0012", "hold", "", &["was due 2026-03-01"]),
];

/// Longest first: those whose comb is crowded and whose dwell is long.
const ORDER: [usize; 12] = [9, 4, 2, 6, 11, 1, 7, 0, 3, 5, 8, 10];

/// Runs every serial by itself into one folder, two at a time: the day would take twice as long on two cores.
fn each_by_itself(place: &Place) {
    let queue = Mutex::new(ORDER.iter().rev().copied().collect::<Vec<_>>());
    thread::scope(|scope| {
        for _ in 0..2 {
            scope.spawn(|| {
                while let Some(next) = { queue.lock().unwrap().pop() } {
                    let mut command = place.command(&["inspect", DAY[next].serial, "--pace", "1e9x"]);
                    let output = command.output().unwrap();
                    assert!(output.status.code().is_some_and(|code| code < 30), "{}: {output:?}", DAY[next].serial);
                }
            });
        }
    });
}

#[test]
fn twelve_tubes_come_to_their_endings_for_their_reasons() {
    let place = Place::new();
    each_by_itself(&place);
    // All are finished: the day lists them and runs none again.
    let listed = place.run(&["inspect", "--scenario", "--format", "json"]);
    listed.ends(21, &["finished already"]).leaves_nothing();
    let lines: Vec<Json> = listed.out.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!(lines.len(), DAY.len());
    let mut wrong = Vec::new();
    for (line, tube) in lines.iter().zip(&DAY) {
        assert_eq!(line["serial"], tube.serial, "the scenario's order");
        let word = match tube.verdict {
            "pass" => line["grade"].as_str(),
            "fail" => line["reject_code"].as_str(),
            _ => Some(""),
        };
        let reason = line["reason"].as_str().unwrap();
        let said = tube.reason.iter().all(|words| reason.contains(words));
        if line["verdict"] != tube.verdict || word != Some(tube.word) || !said {
            wrong.push(format!(
                "{}: expected {}, {}, {:?}\n  {line}",
                tube.serial, tube.verdict, tube.word, tube.reason
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    what_eyes_and_hands_found(&lines);
    // On paper it is the same, and the highest of the endings is the status.
    let paper = place.run(&["inspect", "--scenario"]);
    paper.ends(
        21,
        &["Two days at a repair bench: 12 of 12 tubes", "DEMO-0006  pass, alignment", "DEMO-0007  fail, wrong-length"],
    );
}

/// Looks that stand in the record beside the measured reason.
fn what_eyes_and_hands_found(lines: &[Json]) {
    let record =
        |at: usize| fs::read_to_string(format!("{}/record.csv", lines[at]["folder"].as_str().unwrap())).unwrap();
    let fourth = record(3);
    let colour = fourth.lines().find(|line| line.contains("visual.discharge")).unwrap();
    assert!(colour.contains("deep red-orange") && colour.contains("colour"), "{colour}");
    let eighth = record(7);
    assert!(eighth.lines().any(|line| line.contains("visual.press_test") && line.contains("rises")), "{eighth}");
}
