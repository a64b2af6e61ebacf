//! Stored events, from the first day on: every prefix folds to the same wants and the same sheet, and they say when they
//! were changed. `TUBEWRIGHT_MAKE_FIXTURES=1 cargo test --test prefix` makes the stored events again.
//! Must not measure: what is stored is all there is.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic, missing_docs)]

#[path = "path/bench.rs"]
mod bench;

use bench::{Brisk, text};
use chrono::DateTime;
use tubewright::{
    disk::{ChainFault, RunFolder, read_chain},
    driver::Interrupted,
    phantom::Incident,
    record::{
        event::{EVENT_VERSION, Event, Happening},
        question::{Answer, Question},
        sheet::Sheet,
    },
    run::{At, Plan, Run},
    station::{Person, Trouble, Want},
};

/// Each has a `.toml` of its own with what it must end in.
const STORED: [&str; 3] = ["twin", "quad", "plate"];
/// A stored file is read in every test run and by people: no longer than this, bytes.
const LONGEST: usize = 400_000;

// ---- making them -------------------------------------------------------------------------------------------------

/// Steps behind those of the brisk recipes, so that every kind of happening is stored.
fn more_steps(polarization: &str) -> String {
    format!(
        r#"
[[step]]
name = "comb"
do = "comb"
from = "warm"

[[step]]
name = "power"
do = "power"
from = "warm"

[[step]]
name = "polarizer"
do = "polarizer"
polarization = "{polarization}"

[[step]]
name = "supply"
do = "supply"
dropout = true

[[step]]
name = "output_mirror"
do = "look"
ask = "Output mirror under the lamp"
choices = ["clean", "film", "burn", "crack"]
"#
    )
}

/// A brisk type with every step, its captures 250 ms apart: a line of a quad is about 3 kB.
fn whole(brisk: Brisk, polarization: &str) -> Brisk {
    let recipe = ["100 ms", "125 ms", "200 ms"].iter().fold(brisk.recipe.clone(), |recipe, every| {
        let key = if *every == "125 ms" { "every" } else { "early_every" };
        recipe.replace(&format!("\n{key} = \"{every}\""), &format!("\n{key} = \"250 ms\""))
    });
    let brisk = Brisk { recipe: recipe + &more_steps(polarization), ..brisk };
    brisk.with(|tube| {
        tube.walk_cycles = 8.0;
        tube.warmup_tau = 12.0;
    })
}

/// A technician who is called away before high voltage is on, or stops the run at the polarizer.
struct CalledAway {
    before_high_voltage: bool,
}

impl Person for CalledAway {
    fn initials(&self) -> String {
        "KT".into()
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        match (question.step.as_str(), question.word.as_str()) {
            _ if self.before_high_voltage && question.high_voltage => Err(Trouble::NoAnswer("called away".into())),
            ("strike", "tries") => Ok(Answer::Whole(1)),
            ("strike", "start_delay") => Ok(Answer::Number(0.6)),
            ("polarizer", _) => Err(Trouble::Stopped("fire drill".into())),
            _ => Ok(Answer::CannotSay("not here".into())),
        }
    }
}

/// The bytes of `events.jsonl` as the program makes them.
fn made(name: &str) -> Vec<u8> {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("run");
    let (brisk, seed) = match name {
        "twin" => (whole(Brisk::twin(), "random"), 31),
        "quad" => {
            let hop = |at, size| Incident::Hop { at, size };
            let quad = whole(Brisk::quad(), "random").with(|tube| {
                tube.incidents = vec![
                    hop(11.1, 150e6),
                    Incident::Lost { at: 8.9, lasts: 0.3 },
                    Incident::Swap { at: 14.6 },
                    Incident::Knock { at: 18.0, to: 0.5, lasts: 1.0 },
                ];
            });
            (quad, 32)
        }
        "plate" => (whole(Brisk::plate(), "linear"), 33),
        other => panic!("`{other}` is not made here"),
    };
    let (at, opened) = brisk.opening(seed);
    let (mut journal, first) = RunFolder::create(&path, at, &opened).unwrap();
    if name == "plate" {
        // Interrupted while high voltage was asked for, taken up again, and stopped in the end.
        let away = |before_high_voltage| Some(Box::new(CalledAway { before_high_voltage }) as Box<dyn Person>);
        let driven = brisk.drive_on(seed, &mut journal, &[first], away(true));
        assert!(matches!(driven, Err(Interrupted::NoAnswer(_))));
        drop(journal);
        let (mut journal, events) = RunFolder::reopen(&path).unwrap();
        brisk.drive_on(seed, &mut journal, &events, away(false)).unwrap();
    } else {
        brisk.drive_on(seed, &mut journal, &[first], None).unwrap();
    }
    std::fs::read(path.join("events.jsonl")).unwrap()
}

/// The bytes of a stored file, made first where the environment asks for it.
fn stored(name: &str) -> Vec<u8> {
    static MAKING: std::sync::Mutex<()> = std::sync::Mutex::new(());
    let path = format!("{}/fixtures/events/{name}.jsonl", env!("CARGO_MANIFEST_DIR"));
    if std::env::var_os("TUBEWRIGHT_MAKE_FIXTURES").is_some_and(|wanted| wanted == "1") {
        // Tests run side by side: one writes, the others find what they would have written.
        let _guard = MAKING.lock();
        let bytes = made(name);
        if std::fs::read(&path).ok().as_ref() != Some(&bytes) {
            std::fs::write(&path, bytes).unwrap();
        }
    }
    std::fs::read(&path).unwrap()
}

// ---- folding them ------------------------------------------------------------------------------------------------

fn events(name: &str) -> Vec<Event> {
    read_chain(&stored(name)).unwrap().events
}

/// A run opened as the first event says, with nothing taken yet.
fn fresh(events: &[Event]) -> Run {
    let Happening::Opened(opened) = &events[0].what else { panic!("opened first") };
    Run::open(Plan::from_texts(&opened.recipe, &opened.limits, &opened.station).unwrap(), opened.identity.clone())
}

fn take(run: &mut Run, event: &Event) {
    let wall = DateTime::parse_from_rfc3339(&event.at).unwrap();
    run.take(&event.what, At { wall, elapsed_ms: (event.elapsed_s * 1e3).round() as u64 });
}

/// Whether a happening is an answer to what was wanted.
fn meets(want: &Want, happening: &Happening) -> bool {
    match (want, happening) {
        // These come from outside, whatever is wanted.
        (want, Happening::Resumed | Happening::Stopped { .. }) => *want != Want::Finished,
        (Want::Answer(question), Happening::Asked { question: asked }) => question == asked,
        (Want::Answer(question), Happening::Answered { step, word, .. }) => {
            (&question.step, &question.word) == (step, word)
        }
        (Want::Capture(request), Happening::Captured(captured)) => {
            (&request.step, request.number) == (&captured.step, captured.number)
        }
        (Want::Capture(request), Happening::CaptureLost { step, number, .. }) => {
            (&request.step, request.number) == (step, *number)
        }
        (Want::Light(request), Happening::Light(light)) => {
            (&request.step, request.number, request.lit) == (&light.step, light.number, light.lit)
        }
        (Want::Reading(request), Happening::Reading { step, what, .. }) => {
            &request.step == step && request.what.word() == what
        }
        (Want::WaitUntil { .. }, Happening::Waited) | (Want::MakeSafe, Happening::MadeSafe) => true,
        _ => false,
    }
}

#[test]
fn every_prefix_folds_to_the_same_wants_and_sheet() {
    for name in STORED {
        let events = events(name);
        // The original: one run that lived through all of it, and was asked after each event.
        let mut original = fresh(&events);
        let lived: Vec<(Want, Sheet)> = events
            .iter()
            .map(|event| {
                take(&mut original, event);
                (original.wants(), original.sheet())
            })
            .collect();
        assert_eq!(lived.last().unwrap().0, Want::Finished, "{name}");
        for n in 1..=events.len() {
            let mut run = fresh(&events);
            events[..n].iter().for_each(|event| take(&mut run, event));
            assert_eq!(run.wants(), lived[n - 1].0, "{name}, after {n} events");
            assert_eq!(run.sheet(), lived[n - 1].1, "{name}, after {n} events");
        }
    }
}

/// The stored events bear witness to what the run that stored them wanted; the run of today must want the same, or a
/// folder of then cannot be gone on with.
#[test]
fn each_stored_event_meets_what_the_run_wants_today() {
    for name in STORED {
        let events = events(name);
        let mut run = fresh(&events);
        take(&mut run, &events[0]);
        for event in &events[1..] {
            let want = run.wants();
            assert!(meets(&want, &event.what), "{name}, event {}: wanted {want:?}, stored {:?}", event.seq, event.what);
            take(&mut run, event);
        }
    }
}

#[test]
fn they_end_as_the_notes_beside_them_say() {
    for name in STORED {
        let events = events(name);
        let mut run = fresh(&events);
        events.iter().for_each(|event| take(&mut run, event));
        let sheet = run.sheet();
        let notes: toml::Table = text(&format!("events/{name}.toml")).parse().unwrap();
        let expected = notes["expected"].as_table().unwrap();
        assert_eq!(sheet.verdict.outcome.word(), expected["outcome"].as_str().unwrap(), "{name}: {:?}", sheet.verdict);
        let kinds = |kind: &str| {
            let tag = format!("\"what\":{{\"kind\":\"{kind}\"");
            i64::try_from(String::from_utf8(stored(name)).unwrap().matches(&tag).count()).unwrap()
        };
        for kind in ["resumed", "stopped", "made_safe", "capture_lost"] {
            assert_eq!(kinds(kind), expected[kind].as_integer().unwrap(), "{name}: events of kind {kind}");
        }
        for (key, times) in [("hops_at_s", hops(&sheet)), ("swaps_at_s", swaps(&sheet))] {
            let planted: Vec<f64> = expected[key].as_array().unwrap().iter().map(|at| at.as_float().unwrap()).collect();
            let tolerance = notes["tolerance"]["time_s"].as_float().unwrap();
            assert_eq!(times.len(), planted.len(), "{name}: {key} {times:?}");
            let near = times.iter().zip(&planted).all(|(found, planted)| (found - planted).abs() <= tolerance);
            assert!(near, "{name}: {key} {times:?}, planted {planted:?}");
        }
    }
}

fn hops(sheet: &Sheet) -> Vec<f64> {
    sheet.walk_chart.iter().flat_map(|chart| chart.hops.iter().map(|hop| hop.0)).collect()
}

fn swaps(sheet: &Sheet) -> Vec<f64> {
    sheet.walk_chart.iter().flat_map(|chart| chart.swaps.clone()).collect()
}

// ---- proving them ------------------------------------------------------------------------------------------------

#[test]
fn they_are_small_and_their_chain_holds() {
    for name in STORED {
        let bytes = stored(name);
        assert!(bytes.len() <= LONGEST, "{name} has {} bytes", bytes.len());
        let chain = read_chain(&bytes).unwrap();
        assert_eq!(chain.whole, bytes.len() as u64, "{name} ends in a torn line");
        assert!(chain.events.len() > 50);
        assert!(chain.events.iter().all(|event| event.version <= EVENT_VERSION));
    }
}

#[test]
fn a_newer_form_is_refused_with_what_to_do() {
    for name in STORED {
        let text = String::from_utf8(stored(name)).unwrap();
        let lines = text.lines().count();
        for line in [1, lines / 2, lines] {
            // The lines before it are sound; it is refused for its form, not for its hash.
            let newer: String = text
                .split_inclusive('\n')
                .enumerate()
                .map(|(index, text)| match index + 1 == line {
                    true => text.replacen("\"version\":1,", "\"version\":2,", 1),
                    false => text.to_owned(),
                })
                .collect();
            let fault = read_chain(newer.as_bytes()).unwrap_err();
            assert_eq!(fault, ChainFault::Newer { line, found: 2 }, "{name}");
            let words = fault.to_string();
            assert!(words.contains(&format!("line {line} ")) && words.contains("use a newer one"), "{words}");
        }
    }
}

/// The line that a fault names, from 1.
fn line_of(fault: &ChainFault) -> usize {
    match fault {
        ChainFault::NotAnEvent { line, .. } | ChainFault::Newer { line, .. } | ChainFault::Broken { line, .. } => *line,
        ChainFault::NotOpened => 1,
    }
}

/// Bytes changed in each line, spread over its length.
const CHANGED: usize = 5;

#[test]
fn one_changed_byte_is_found_and_the_line_named() {
    for name in STORED {
        let bytes = stored(name);
        let mut start = 0;
        let lines: Vec<&[u8]> = bytes.split_inclusive(|&byte| byte == b'\n').collect();
        // The hash of a line stands in the next one: the last is proved by the record that is made of it.
        for (index, line) in lines[..lines.len() - 1].iter().enumerate() {
            for k in 0..CHANGED {
                let place = start + (line.len() - 1) * k / CHANGED;
                let mut changed = bytes.clone();
                changed[place] ^= 1;
                let fault = read_chain(&changed).expect_err(&format!("{name}: byte {place} changed unseen"));
                let named = line_of(&fault);
                // Either the line itself can no longer be one, or the next does not follow from it.
                let number = index + 1;
                assert!(named == number || named == number + 1, "{name}: line {number} changed, {fault}");
                assert!(fault.to_string().contains(&format!("line {named} ")), "{fault}");
            }
            start += line.len();
        }
    }
}
