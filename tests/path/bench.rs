//! Drives a run over the simulated bench in this process, from a truth that the test chooses to the sheet.
//! Must not share physics with `phantom` or maths with the engine: it only carries one to the other.
//! Main types: [`Brisk`], [`Driven`].

#![allow(dead_code, clippy::unwrap_used, clippy::panic)]

use tubewright::{
    driver::{Driver, Engine, Interrupted, Watcher, resume},
    instruments::{SimulatedBench, SimulatedOptions},
    phantom::{BenchTruth, Scenario, TubeTruth, World},
    record::{
        event::{Event, Happening, Identity, Opened},
        sheet::{Row, Sheet, Value},
    },
    run::{Plan, Remark, Run},
    station::{CapturedBytes, Durability, Journal, JournalError, Moment, Person},
};

const STARTED_AT: &str = "2026-03-02T08:00:00+00:00";

/// A brisk type: its texts, and what is true of a sound tube of it.
#[derive(Clone)]
pub struct Brisk {
    pub name: &'static str,
    pub recipe: String,
    pub limits: String,
    pub station: String,
    pub truth: TubeTruth,
    pub bench: BenchTruth,
    /// How long the tube burnt already in a rack; none: it is struck.
    pub lit_for_s: Option<f64>,
}

/// What a run left.
pub struct Driven {
    pub events: Vec<Event>,
    pub sheet: Sheet,
}

impl Brisk {
    pub fn twin() -> Self {
        let truth = TubeTruth { walk_cycles: 12.0, warmup_tau: 20.0, ..demo("twin-150") };
        Self::of("brisk-twin", truth)
    }

    pub fn plate() -> Self {
        let truth = TubeTruth { walk_cycles: 12.0, warmup_tau: 20.0, ..demo("plate-250") };
        Self::of("brisk-plate", truth)
    }

    pub fn quad() -> Self {
        let truth = TubeTruth { walk_cycles: 12.0, warmup_tau: 20.0, ..demo("quad-375") };
        Self::of("brisk-quad", truth)
    }

    /// The same with something else true of the tube.
    pub fn with(self, change: impl FnOnce(&mut TubeTruth)) -> Self {
        let mut brisk = self;
        change(&mut brisk.truth);
        brisk
    }

    fn of(name: &'static str, truth: TubeTruth) -> Self {
        let scenario = Scenario::demo();
        Self {
            name,
            recipe: text(&format!("brisk-types/limits/{name}/recipe.toml")),
            limits: text(&format!("brisk-types/limits/{name}/limits.toml")),
            station: text("demo/bench-1.toml"),
            // The output rises and the walk has no fast part unless a test says so.
            truth: TubeTruth { power_tau: 20.0, fast_cycles: 0.0, ..truth },
            bench: scenario.benches["bench-1"].clone(),
            lit_for_s: None,
        }
    }

    /// Runs the recipe from the strike to the last row, as fast as it goes, nothing stored but in memory.
    pub fn drive(&self, seed: u64) -> Driven {
        let mut journal = Memory::default();
        let (at, opened) = self.opening(seed);
        let first = journal.append(at, &opened, Durability::Now).unwrap();
        self.drive_on(seed, &mut journal, &[first], None).unwrap()
    }

    /// The first event of a run.
    pub fn opening(&self, seed: u64) -> (Moment, Happening) {
        let opened = Opened {
            identity: self.identity(seed),
            recipe: self.recipe.clone(),
            limits: self.limits.clone(),
            station: self.station.clone(),
        };
        (Moment { wall: STARTED_AT.parse().unwrap(), elapsed_ms: 0 }, Happening::Opened(Box::new(opened)))
    }

    fn lit_since(&self) -> Option<String> {
        let start: chrono::DateTime<chrono::FixedOffset> = STARTED_AT.parse().unwrap();
        let ago = |seconds: f64| start - chrono::TimeDelta::milliseconds((seconds * 1e3) as i64);
        self.lit_for_s.map(|seconds| ago(seconds).to_rfc3339())
    }

    fn identity(&self, seed: u64) -> Identity {
        Identity {
            run_id: format!("{}-{seed}", self.name),
            serial: format!("BRISK-{seed}"),
            tube_type: self.name.into(),
            technician: "KT".into(),
            started_at: STARTED_AT.into(),
            time_zone: "Europe/Lisbon".into(),
            simulated: true,
            program_version: "0.1.0".into(),
            lit_since: self.lit_since(),
            ..Identity::default()
        }
    }

    /// Goes on behind stored events until the run is finished or interrupted.
    ///
    /// * `voice`: who answers in place of the bench's own technician.
    pub fn drive_on(
        &self,
        seed: u64,
        journal: &mut dyn Journal,
        stored: &[Event],
        voice: Option<Box<dyn Person>>,
    ) -> Result<Driven, Interrupted> {
        let options =
            SimulatedOptions { started_at: STARTED_AT.parse().unwrap(), pace: f64::INFINITY, time_to_answer_ms: 2000 };
        let bench = SimulatedBench::new(World::new(&self.truth, &self.bench, seed), options);
        let lit_for = |seconds: f64| (seconds * 1e3) as u64;
        let mut bench = self.lit_for_s.map_or(bench.clone(), |s| bench.lit_for(lit_for(s))).bench_with(voice);
        let plan = Plan::from_texts(&self.recipe, &self.limits, &self.station).unwrap();
        let engine = Engine::of(&plan).unwrap();
        let mut run = Run::open(plan, self.identity(seed));
        resume(&mut run, &mut bench, journal, stored)?;
        let mut events = Gathered(stored.to_vec());
        Driver { run: &mut run, bench: &mut bench, journal, engine: engine.as_ref(), watcher: &mut events }.drive()?;
        Ok(Driven { events: events.0, sheet: run.sheet() })
    }
}

impl Driven {
    pub fn row(&self, key: &str) -> &Row {
        self.sheet.rows.iter().find(|row| row.measurand == key).unwrap_or_else(|| panic!("no row {key}"))
    }

    /// (value, standard uncertainty, expanded uncertainty) of a row, SI.
    #[track_caller]
    pub fn number(&self, key: &str) -> (f64, f64, f64) {
        match self.row(key).value {
            Value::Number { value, u, expanded, .. } => (value, u, expanded),
            ref other => panic!("{key}: {other:?}"),
        }
    }

    #[track_caller]
    pub fn count(&self, key: &str) -> u64 {
        match self.row(key).value {
            Value::Count { value, .. } => value,
            ref other => panic!("{key}: {other:?}"),
        }
    }

    /// Hops on the sheet: (s since first light, Hz).
    pub fn hops(&self) -> &[(f64, f64)] {
        self.sheet.walk_chart.as_ref().map_or(&[], |chart| &chart.hops)
    }

    /// Swaps on the sheet, s since first light.
    pub fn swaps(&self) -> &[f64] {
        self.sheet.walk_chart.as_ref().map_or(&[], |chart| &chart.swaps)
    }
}

/// Truth of a sound demo tube.
fn demo(name: &str) -> TubeTruth {
    Scenario::demo().types[name].clone()
}

/// Text of a fixture.
pub fn text(name: &str) -> String {
    std::fs::read_to_string(format!("{}/fixtures/{name}", env!("CARGO_MANIFEST_DIR"))).unwrap()
}

/// A journal without a disk.
#[derive(Default)]
pub struct Memory(u64);

impl Journal for Memory {
    fn append(&mut self, at: Moment, what: &Happening, _: Durability) -> Result<Event, JournalError> {
        self.0 += 1;
        Ok(Event {
            seq: self.0 - 1,
            at: at.wall.to_rfc3339(),
            elapsed_s: at.elapsed_ms as f64 / 1e3,
            version: tubewright::record::event::EVENT_VERSION,
            what: what.clone(),
            before: String::new(),
        })
    }

    fn keep(&mut self, number: u64, _: &CapturedBytes) -> Result<Vec<String>, JournalError> {
        Ok(vec![format!("{number}.csv")])
    }
}

struct Gathered(Vec<Event>);

impl Watcher for Gathered {
    fn happened(&mut self, _: &Run, event: &Event, _: &[Remark]) {
        self.0.push(event.clone());
    }
}
