//! The scenario file: which tubes come to which simulated bench, and what is true of them.
//! Must not open a file: it takes text.
//! Main types: [`Scenario`], [`ScenarioTube`], [`ScenarioError`].

mod keys;
mod read;
mod reader;

use std::{collections::BTreeMap, fmt};

use chrono::{DateTime, FixedOffset};
use chrono_tz::Tz;

use super::{bench::BenchTruth, tube::TubeTruth, world::World};
pub use reader::ScenarioFault;
pub(super) use reader::nearest_word;

/// A simulated bench, or several, and the tubes that come to it.
#[derive(Debug, Clone, PartialEq)]
pub struct Scenario {
    /// In words.
    pub title: String,
    /// Where its clock starts.
    pub started_at: DateTime<FixedOffset>,
    /// Zone of the bench.
    pub time_zone: Tz,
    /// Seed of everything random.
    pub seed: u64,
    /// Initials of its own technician.
    pub technician: String,
    /// What an answer costs in bench time, ms.
    pub time_to_answer_ms: u64,
    /// Benches by name.
    pub benches: BTreeMap<String, BenchTruth>,
    /// Sound tubes by type.
    pub types: BTreeMap<String, TubeTruth>,
    /// Tubes in file order.
    pub tubes: Vec<ScenarioTube>,
    /// Reference tubes of the benches, in file order.
    pub references: Vec<ScenarioTube>,
}

/// One tube of a scenario.
#[derive(Debug, Clone, PartialEq)]
pub struct ScenarioTube {
    /// Serial number.
    pub serial: String,
    /// Type.
    pub tube_type: String,
    /// Supplier, or empty.
    pub supplier: String,
    /// Lot, or empty.
    pub lot: String,
    /// Condition on receipt, or empty.
    pub condition: String,
    /// Date of receipt, or empty.
    pub received: String,
    /// Bench it comes to.
    pub bench: String,
    /// When its run is opened.
    pub started_at: DateTime<FixedOffset>,
    /// What is true of it, its faults included.
    pub truth: TubeTruth,
}

/// What is wrong in a scenario file, in file order.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub struct ScenarioError {
    /// Name of the file.
    pub name: String,
    /// Every fault.
    pub faults: Vec<ScenarioFault>,
}

impl fmt::Display for ScenarioError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (i, fault) in self.faults.iter().enumerate() {
            let end = if i == 0 { "" } else { "\n" };
            write!(f, "{end}{}:{}:{}: {}", self.name, fault.line, fault.column, fault.message)?;
        }
        Ok(())
    }
}

/// The demo scenario, compiled in.
const DEMO: &str = include_str!("../../../fixtures/demo/scenario.toml");

impl Scenario {
    /// Reads a scenario.
    ///
    /// * `name`: name of the file, for messages.
    /// * `text`: its text.
    ///
    /// Errors hold every fault with line and column.
    pub fn parse(name: &str, text: &str) -> Result<Self, ScenarioError> {
        read::scenario(text).map_err(|mut faults| {
            faults.sort();
            ScenarioError { name: name.to_owned(), faults }
        })
    }

    /// The demo scenario.
    pub fn demo() -> Self {
        // A test proves that the demo parses; the empty scenario is never reached.
        Self::parse("demo scenario", DEMO).unwrap_or_default()
    }

    /// The tube with a serial.
    pub fn tube(&self, serial: &str) -> Option<&ScenarioTube> {
        self.tubes.iter().chain(&self.references).find(|tube| tube.serial == serial)
    }

    /// A tube on its bench.
    ///
    /// * `seed`: in place of the scenario's own.
    ///
    /// Returns none for an unknown serial.
    pub fn world(&self, serial: &str, seed: Option<u64>) -> Option<World> {
        let tube = self.tube(serial)?;
        let bench = self.benches.get(&tube.bench)?;
        Some(World::new(&tube.truth, bench, seed.unwrap_or(self.seed) ^ fnv(serial)))
    }
}

impl Default for Scenario {
    fn default() -> Self {
        Self {
            title: String::new(),
            started_at: DateTime::UNIX_EPOCH.fixed_offset(),
            time_zone: Tz::UTC,
            seed: 1,
            technician: "KT".to_owned(),
            time_to_answer_ms: 4000,
            benches: BTreeMap::new(),
            types: BTreeMap::new(),
            tubes: Vec::new(),
            references: Vec::new(),
        }
    }
}

/// FNV-1a, 64 bits (Fowler, Noll, Vo; draft-eastlake-fnv): gives each serial noise of its own.
fn fnv(text: &str) -> u64 {
    text.bytes().fold(0xcbf2_9ce4_8422_2325, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn the_demo_parses_and_has_its_twelve_tubes() {
        let demo = Scenario::parse("scenario.toml", DEMO).unwrap();
        let serials: Vec<String> = (1..=12).map(|k| format!("DEMO-{k:04}")).collect();
        assert_eq!(demo.tubes.iter().map(|tube| tube.serial.clone()).collect::<Vec<_>>(), serials);
        assert!(serials.iter().all(|serial| demo.world(serial, None).is_some()));
        assert_eq!(demo.started_at.to_rfc3339(), "2026-03-02T08:00:00+00:00");
        assert_eq!(demo.tube("DEMO-0012").map(|tube| tube.bench.as_str()), Some("bench-2"));
    }

    #[test]
    fn every_fault_is_reported_with_its_place() {
        let text = "started_at = 2026-03-02T08:00:00Z\ntime_zone = \"Europe/Lisbn\"\n[bench.b]\nfinese = 3\n\
                    [type.t]\npower = \"3 MHz\"\n[[tube]]\nserial = \"X\"\ntype = \"u\"\nbench = \"b\"\n\
                    power = \"9 W\"\nincident = [{ kind = \"hopp\", at = \"1 s\" }]\n";
        let error = Scenario::parse("s.toml", text).unwrap_err().to_string();
        let lines: Vec<&str> = error.lines().map(|line| line.split(": ").next().unwrap_or("")).collect();
        let places = ["s.toml:2:13", "s.toml:4:1", "s.toml:6:9", "s.toml:9:8", "s.toml:11:9", "s.toml:12:22"];
        assert_eq!(lines, places, "{error}");
        assert!(error.contains("`finesse`") && error.contains("`MHz` is not a unit of a power"), "{error}");
    }

    #[test]
    fn faults_change_what_all_the_other_keys_say() {
        let text = "started_at = 2026-03-02T08:00:00Z\n[bench.b]\n[type.t]\npower = \"1 mW\"\n[[tube]]\nserial = \"X\"\n\
                    faults = [\"helium-lost = 20 %\", \"draught = 1 K\"]\ntype = \"t\"\nbench = \"b\"\npower = \"2 mW\"\n";
        let tube = |text: &str| Scenario::parse("s.toml", text).unwrap().tubes[0].truth.clone();
        let (sound, faulty) = (tube(&text.replace("faults", "#")), tube(text));
        assert_eq!((sound.power, sound.draught_cycles), (2e-3, 0.0));
        assert!(faulty.power < 1.5e-3 && faulty.draught_cycles > 1.0, "{faulty:?}");
        let later = tube(&(text.replace("faults", "#") + "faults = [\"helium-lost = 20 %\", \"draught = 1 K\"]\n"));
        assert_eq!(later, faulty, "wherever they stand");
    }

    #[test]
    fn what_is_wrong_with_faults_is_reported_where_it_stands() {
        let with = |faults: &str| {
            let text = format!(
                "started_at = 2026-03-02T08:00:00Z\n[bench.b]\n[type.t]\n[[tube]]\nserial = \"X\"\n\
                                type = \"t\"\nbench = \"b\"\nfaults = {faults}\n"
            );
            Scenario::parse("s.toml", &text).unwrap_err().to_string()
        };
        let error = with("[\"wear = 10 %\", \"wearr = 1 %\", \"wear = 200 %\", 3]");
        let lines: Vec<&str> = error.lines().collect();
        assert!(lines[0].starts_with("s.toml:8:26: `wearr` is no kind of fault"), "{error}");
        assert!(lines[1].starts_with("s.toml:8:41: `wear` is 200 %; expected 0 to 100 %"), "{error}");
        assert_eq!((lines[2], lines.len()), ("s.toml:8:57: `faults` must be a text in quotes", 3));
        assert!(with("\"wear = 1 %\"").contains("`faults` must be a list"));
    }

    #[test]
    fn broken_syntax_is_one_fault_with_its_place() {
        let error = Scenario::parse("s.toml", "title = \"x\"\nseed = = 3\n").unwrap_err();
        assert_eq!((error.faults.len(), error.faults[0].line), (1, 2));
    }
}
