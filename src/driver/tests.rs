//! The loop on the brisk bench: what is on disk when, and how it ends when something fails.
//! Must not test a step's own arithmetic.

#![allow(clippy::unwrap_used, clippy::panic)]

use std::cell::RefCell;
use std::path::{Path, PathBuf};
use std::rc::Rc;

use super::*;
use crate::disk::{RunFolder, Store};
use crate::instruments::{NoInstrument, SimulatedBench};
use crate::phantom::Scenario;
use crate::record::event::{Event, Happening, Identity, Opened};
use crate::record::question::{Answer, Question};
use crate::record::sheet::Outcome;
use crate::run::{Plan, Remark, Run};
use crate::station::{Bench, CaptureRequest, CaptureSource, CapturedBytes, Interlock, Moment, Person, Want};

const RECIPE: &str = include_str!("../../fixtures/brisk/limits/brisk-150/recipe.toml");
const LIMITS: &str = include_str!("../../fixtures/brisk/limits/brisk-150/limits.toml");
const STATION: &str = include_str!("../../fixtures/brisk/bench.toml");
const SCENARIO: &str = include_str!("../../fixtures/brisk/scenario.toml");
const STARTED_AT: &str = "2026-03-02T08:00:00+00:00";

/// Remembers the kinds of what happened.
#[derive(Default)]
struct Kinds(Vec<&'static str>);

impl Watcher for Kinds {
    fn happened(&mut self, _: &Run, event: &Event, _: &[Remark]) {
        self.0.push(match event.what {
            Happening::MadeSafe => "made_safe",
            Happening::NotMadeSafe { .. } => "not_made_safe",
            Happening::Asked { .. } => "asked",
            Happening::Answered { .. } => "answered",
            Happening::CaptureLost { .. } => "lost",
            Happening::Stopped { .. } => "stopped",
            _ => "other",
        });
    }
}

struct Scene {
    _folder: tempfile::TempDir,
    path: PathBuf,
    plan: Plan,
    opened: Happening,
    at: Moment,
}

impl Scene {
    fn new() -> Self {
        let folder = tempfile::tempdir().unwrap();
        let identity = Identity {
            run_id: "run".into(),
            serial: "BRISK-1".into(),
            started_at: STARTED_AT.into(),
            simulated: true,
            ..Identity::default()
        };
        let opened = Opened { identity, recipe: RECIPE.into(), limits: LIMITS.into(), station: STATION.into() };
        Self {
            path: folder.path().join("run"),
            _folder: folder,
            plan: Plan::from_texts(RECIPE, LIMITS, STATION).unwrap(),
            opened: Happening::Opened(Box::new(opened)),
            at: Moment { wall: STARTED_AT.parse().unwrap(), elapsed_ms: 0 },
        }
    }

    fn bench(voice: Option<Box<dyn Person>>) -> Bench {
        let scenario = Scenario::parse("brisk", SCENARIO).unwrap();
        SimulatedBench::of_scenario(&scenario, "BRISK-1", None, None, f64::INFINITY).unwrap().bench_with(voice)
    }

    /// Opens or takes up the run and drives it.
    fn drive(&self, mut bench: Bench) -> (Result<(), Interrupted>, Run, Vec<&'static str>) {
        let Happening::Opened(opened) = &self.opened else { panic!("opened first") };
        let mut run = Run::open(self.plan.clone(), opened.identity.clone());
        let (mut folder, events) = if self.path.exists() {
            RunFolder::reopen(&self.path).unwrap()
        } else {
            let (folder, event) = RunFolder::create(&self.path, self.at, &self.opened).unwrap();
            (folder, vec![event])
        };
        let engine = Engine::of(&self.plan).unwrap();
        let mut kinds = Kinds::default();
        resume(&mut run, &mut bench, &mut folder, &events).unwrap();
        let driven = Driver {
            run: &mut run,
            bench: &mut bench,
            journal: &mut folder,
            engine: engine.as_ref(),
            watcher: &mut kinds,
        }
        .drive();
        (driven, run, kinds.0)
    }
}

/// Fails to answer after so many answers; looks at the disk whenever high voltage is asked for.
struct Shy {
    events: PathBuf,
    answers: usize,
    seen: Rc<RefCell<u32>>,
}

impl Person for Shy {
    fn initials(&self) -> String {
        "KT".into()
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        if question.high_voltage {
            let stored = Store::events_of(self.events.as_path()).unwrap();
            let last = &stored.last().unwrap().what;
            assert!(matches!(last, Happening::Asked { question: stored } if stored == question));
            *self.seen.borrow_mut() += 1;
        }
        if self.answers == 0 {
            return Err(Trouble::NoAnswer("gone".into()));
        }
        self.answers -= 1;
        Ok(match question.word.as_str() {
            "start_delay" => Answer::Number(0.6),
            "tries" => Answer::Whole(1),
            _ => Answer::CannotSay("not here".into()),
        })
    }
}

fn shy(path: &Path, answers: usize) -> (Box<dyn Person>, Rc<RefCell<u32>>) {
    let seen = Rc::new(RefCell::new(0));
    (Box::new(Shy { events: path.to_owned(), answers, seen: Rc::clone(&seen) }), seen)
}

#[test]
fn high_voltage_is_on_disk_before_it_is_asked_for_and_off_before_it_is_asked_again() {
    let scene = Scene::new();
    let (person, seen) = shy(&scene.path, 0);
    let (driven, ..) = scene.drive(Scene::bench(Some(person)));
    assert_eq!(driven, Err(Interrupted::NoAnswer("gone".into())));
    assert_eq!(*seen.borrow(), 1);
    let (person, seen) = shy(&scene.path, 100);
    let (driven, run, kinds) = scene.drive(Scene::bench(Some(person)));
    assert_eq!((driven, *seen.borrow()), (Ok(()), 1));
    assert_eq!(kinds[..3], ["made_safe", "asked", "answered"]);
    assert_eq!(run.wants(), Want::Finished);
}

/// A digitizer that is unplugged.
struct Unplugged;

impl CaptureSource for Unplugged {
    fn capture(&mut self, _: &CaptureRequest) -> Result<CapturedBytes, Trouble> {
        Err(Trouble::Instrument("unplugged".into()))
    }
}

#[test]
fn an_instrument_that_stays_away_leaves_the_run_open_and_it_goes_on_later() {
    let scene = Scene::new();
    let mut bench = Scene::bench(None);
    bench.captures = Box::new(Unplugged);
    let (driven, _, kinds) = scene.drive(bench);
    assert_eq!(driven, Err(Interrupted::Instrument("unplugged".into())));
    assert!(kinds.iter().filter(|kind| **kind == "lost").count() > 1);
    let (driven, run, _) = scene.drive(Scene::bench(None));
    assert_eq!(driven, Ok(()));
    assert_eq!(run.sheet().verdict.outcome, Outcome::Pass);
}

#[test]
fn what_a_bench_lacks_leaves_rows_empty_and_ends() {
    let scene = Scene::new();
    let mut bench = Scene::bench(None);
    bench.captures = Box::new(NoInstrument { reason: "no interferometer today".into() });
    let (driven, run, _) = scene.drive(bench);
    assert_eq!(driven, Ok(()));
    assert_eq!(run.sheet().verdict.outcome, Outcome::Hold);
}

/// Has had enough.
struct Stopper;

impl Person for Stopper {
    fn initials(&self) -> String {
        "KT".into()
    }

    fn answer(&mut self, _: &Question) -> Result<Answer, Trouble> {
        Err(Trouble::Stopped("coffee".into()))
    }
}

/// An interlock that says when it is used.
struct Switch(Rc<RefCell<u32>>);

impl Interlock for Switch {
    fn make_safe(&mut self) -> Result<(), Trouble> {
        *self.0.borrow_mut() += 1;
        Ok(())
    }
}

#[test]
fn a_person_who_stops_ends_the_run_with_high_voltage_off() {
    let scene = Scene::new();
    let mut bench = Scene::bench(Some(Box::new(Stopper)));
    let used = Rc::new(RefCell::new(0));
    bench.interlock = Box::new(Switch(Rc::clone(&used)));
    let (driven, run, kinds) = scene.drive(bench);
    assert_eq!(driven, Ok(()));
    assert!(kinds.contains(&"stopped"));
    assert_eq!(run.sheet().verdict.outcome, Outcome::Stopped);
    assert_eq!(*used.borrow(), 1);
}
