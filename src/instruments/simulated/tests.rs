//! Tests of the simulated bench.
//! Must not wait for a clock: the pace is infinite.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::record::{
    event::Happening,
    question::{Answer, Expects, Question},
};

fn bench() -> Bench {
    let scenario = Scenario::demo();
    SimulatedBench::of_scenario(&scenario, "DEMO-0003", None, None, f64::INFINITY).unwrap().bench()
}

fn request(number: u64, not_before_ms: u64) -> CaptureRequest {
    CaptureRequest { step: "warm".into(), number, not_before_ms, samples: 2000, keep: false, trace: false }
}

fn question(word: &str, high_voltage: bool, expects: Expects) -> Question {
    Question {
        step: "strike".into(),
        word: word.into(),
        text: String::new(),
        caution: String::new(),
        expects,
        high_voltage,
    }
}

fn start_delay() -> Question {
    question("start_delay", true, Expects::Number { ucum: "s".into(), lowest: 0.0, highest: 600.0 })
}

fn event(elapsed_ms: u64, what: Happening) -> Event {
    let elapsed_s = elapsed_ms as f64 / 1e3;
    Event { seq: 0, at: String::new(), elapsed_s, version: 1, what, before: String::new() }
}

#[test]
fn bench_time_is_what_the_bench_does() {
    let mut bench = bench();
    assert_eq!(bench.clock.now().elapsed_ms, 0);
    assert_eq!(bench.person.answer(&start_delay()), Ok(Answer::Number(0.7)));
    assert_eq!(bench.clock.now().elapsed_ms, 4000, "an answer costs 4 s");
    let capture = bench.captures.capture(&request(1, 10_000)).unwrap();
    assert_eq!((capture.taken_ms, capture.files[0].0.as_str()), (10_000, "c00001.csv"));
    assert_eq!(bench.clock.now().elapsed_ms, 10_025, "a capture costs its ramp");
    let reading = ReadingRequest { step: "warm".into(), what: ReadingKind::Power, not_before_ms: 0 };
    bench.meters.read(&reading).unwrap();
    assert_eq!(bench.clock.now().elapsed_ms, 11_025, "a reading costs 1 s");
    assert_eq!(bench.clock.now().wall.to_rfc3339(), "2026-03-02T09:45:11.025+00:00");
}

#[test]
fn the_head_says_when_and_what() {
    let mut bench = bench();
    bench.person.answer(&start_delay()).unwrap();
    bench.person.answer(&question("turn_45.0", false, Expects::Done)).unwrap();
    let text = String::from_utf8(bench.captures.capture(&request(17, 0)).unwrap().files.remove(0).1).unwrap();
    let head: Vec<&str> = text.lines().take(6).collect();
    assert_eq!(head[0], "# captured_at = 2026-03-02T09:45:08.000Z");
    assert_eq!((head[1], head[2]), ("# capture = 17", "# polarizer = 45.0 deg"));
    assert!(head[3].starts_with("# power = ") && head[3].ends_with(" mW") && head[4].ends_with(" mA"));
    assert_eq!((head[5], text.lines().count()), ("time_s,ramp_V,photodiode_V,crossed_V", 2006));
}

#[test]
fn light_comes_with_the_answer_and_goes_with_dropout_or_make_safe() {
    let power = |bench: &mut Bench| {
        bench.meters.read(&ReadingRequest { step: "s".into(), what: ReadingKind::Power, not_before_ms: 0 }).unwrap()
    };
    let mut bench = bench();
    assert!(power(&mut bench) < 1e-6, "dark before the strike");
    bench.person.answer(&start_delay()).unwrap();
    assert!(power(&mut bench) > 3e-3, "a 7 mW tube gives 75–85 % at switch-on");
    bench.person.answer(&question("block_beam", false, Expects::Done)).unwrap();
    assert!(power(&mut bench) < 1e-6);
    bench.person.answer(&question("open_beam", false, Expects::Done)).unwrap();
    assert!(power(&mut bench) > 3e-3);
    let amperes = Expects::Number { ucum: "mA".into(), lowest: 0.0, highest: 0.1 };
    bench.person.answer(&question("dropout_current", false, amperes)).unwrap();
    assert!(power(&mut bench) < 1e-6);
    bench.person.answer(&start_delay()).unwrap();
    bench.interlock.make_safe().unwrap();
    assert!(power(&mut bench) < 1e-6);
}

#[test]
fn a_bench_taken_up_again_gives_the_same_bytes() {
    let turn = question("turn_30.0", false, Expects::Done);
    let mut whole = bench();
    whole.person.answer(&start_delay()).unwrap();
    whole.captures.capture(&request(1, 60_000)).unwrap();
    whole.person.answer(&turn).unwrap();
    let answered = whole.clock.now().elapsed_ms;
    let wanted = whole.captures.capture(&request(2, 65_000)).unwrap();

    let answer = |word: &str, answer| Happening::Answered {
        step: "strike".into(),
        word: word.into(),
        answer,
        by: "simulated".into(),
    };
    let events = [
        event(0, Happening::Asked { question: start_delay() }),
        event(4000, answer("start_delay", Answer::Number(0.7))),
        event(60_025, Happening::Waited),
        event(60_025, Happening::Asked { question: turn }),
        event(answered, answer("turn_30.0", Answer::Done)),
    ];
    let mut again = bench();
    again.clock.resume(&events).unwrap();
    assert_eq!(again.clock.now().elapsed_ms, answered);
    assert_eq!(again.captures.capture(&request(2, 65_000)).unwrap(), wanted);
}

#[test]
fn the_technician_answers_from_the_truth() {
    let mut bench = bench();
    bench.person.answer(&start_delay()).unwrap();
    let volts = Expects::Number { ucum: "kV".into(), lowest: 0.0, highest: 12e3 };
    let Answer::Number(supply) = bench.person.answer(&question("run_voltage", false, volts.clone())).unwrap() else {
        unreachable!("a number was expected")
    };
    // 1.91 kV at the tube and 6 mA through 75 kΩ; panel meter noise is 0.1 %, five of which are allowed.
    assert!((supply / 2360.0 - 1.0).abs() < 5e-3, "{supply}");
    let probe = bench.person.answer(&question("start_voltage", false, volts)).unwrap();
    assert_eq!(probe, Answer::CannotSay("no high-voltage probe on this bench".into()));
    let look = question("choice", false, Expects::Choice(vec!["film".into(), "clean".into()]));
    assert_eq!(bench.person.answer(&look), Ok(Answer::Choice("clean".into())));
    assert_eq!(bench.person.initials(), "simulated");
}

#[test]
fn looks_follow_from_the_truth_and_the_press_test_needs_light() {
    let scenario = Scenario::demo();
    let look = |step: &str, words: &[&str]| Question {
        step: step.into(),
        ..question("choice", false, Expects::Choice(words.iter().map(|word| (*word).to_owned()).collect()))
    };
    let press = look("press_test", &["steady", "rises", "falls"]);
    let mut benches = ["DEMO-0002", "DEMO-0004", "DEMO-0008"]
        .map(|serial| SimulatedBench::of_scenario(&scenario, serial, None, None, f64::INFINITY).unwrap().bench());
    for bench in &mut benches {
        assert!(matches!(bench.person.answer(&press), Ok(Answer::CannotSay(_))), "dark before the strike");
        bench.person.answer(&start_delay()).unwrap();
    }
    let said = benches.map(|mut bench| {
        let colour = look("discharge", &["salmon", "deep red-orange"]);
        [&colour, &press].map(|question| match bench.person.answer(question) {
            Ok(Answer::Choice(word)) => word,
            other => unreachable!("{other:?}"),
        })
    });
    assert_eq!(said, [["salmon", "steady"], ["deep red-orange", "steady"], ["salmon", "rises"]]);
    // What the recipe has no word for is said, and not turned into another word.
    let mut bench = SimulatedBench::of_scenario(&scenario, "DEMO-0004", None, None, f64::INFINITY).unwrap().bench();
    let answer = bench.person.answer(&look("discharge", &["salmon", "pinkish"])).unwrap();
    assert_eq!(answer, Answer::CannotSay("what is seen, `deep red-orange`, is none of salmon, pinkish".into()));
}
