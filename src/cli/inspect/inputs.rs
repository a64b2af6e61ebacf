//! Arguments of `inspect` made ready to use: every file read and parsed, nothing written.
//! Must not open a run.
//! Main type: [`Inputs`].

use std::fmt::Display;
use std::path::Path;

use chrono::{DateTime, FixedOffset, Utc};

use super::{Arguments, Format};
use crate::cli::{Ending, Failure, home};
use crate::disk::{Home, Rack, Store, demo_bench, said};
use crate::instruments::{CaptureFolder, Screen};
use crate::phantom::Scenario;
use crate::phrase::Language;
use crate::station::{
    answers::Answers,
    file::{Source, StationFile},
};

/// The station where none is named and no scenario says another.
const DEMO_BENCH: &str = "bench-1";
/// Bench seconds in a wall second on the simulated bench, unless said otherwise.
const PACE: f64 = 60.0;

/// Everything that was given, read and parsed.
pub(super) struct Inputs {
    pub serial: String,
    pub tube_type: Option<String>,
    pub home: Home,
    pub store: Store,
    /// Text of the station file, and what it says.
    pub station: (String, StationFile),
    /// The scenario of a simulated bench.
    pub scenario: Option<Scenario>,
    pub captures: Option<CaptureFolder>,
    pub answers: Option<Answers>,
    pub ask: bool,
    /// Why a finished run is to be repeated: as given, else as the answer file says.
    pub retest: Option<String>,
    /// Ceiling on bench time; none on a bench that is not simulated.
    pub pace: Option<f64>,
    pub seed: Option<u64>,
    /// Where the run is shown and people are asked.
    pub screen: Screen,
    pub start: Option<DateTime<FixedOffset>>,
    /// Since when the tube burns already, as given, and where; none if it is struck here.
    pub lit_since: Option<(&'static str, String)>,
    /// Language, if it was asked for.
    pub language: Option<Language>,
    pub format: Format,
}

impl Inputs {
    /// Reads and parses what the arguments name.
    pub fn read(arguments: Arguments, serial: &str) -> Result<Self, Failure> {
        // A scanner's stray blank is no part of a serial number.
        let serial = serial.trim();
        let home = home::find(arguments.home, arguments.reports)?;
        let scenario = match &arguments.scenario {
            Some(Some(path)) => Some(read_scenario(path)?),
            Some(None) => Some(Scenario::demo()),
            None => None,
        };
        let (name, text) = match &arguments.station {
            Some(path) => (path.display().to_string(), read_text(path)?),
            None => demo_station(scenario.as_ref(), serial)?,
        };
        let station = StationFile::parse(&name, &text).map_err(|faults| faulty("station file", &faults))?;
        let captures = arguments.captures.as_deref().map(CaptureFolder::open).transpose();
        let captures = captures.map_err(|error| Failure::unusable(error.to_string()))?;
        let simulated = captures.is_none() && is_simulated(&station, &name)?;
        let scenario = match (simulated, scenario) {
            (true, scenario) => Some(scenario.unwrap_or_else(Scenario::demo)),
            (false, None) => None,
            (false, Some(_)) => {
                return Err(Failure::unusable(format!("`{name}` is no simulated bench: leave out `--scenario`")));
            }
        };
        if !simulated && arguments.pace.is_some() {
            return Err(Failure::unusable(format!(
                "`{name}` is no simulated bench, and only that has a pace: leave out `--pace`"
            )));
        }
        if captures.is_some() && station.interferometer.is_none() {
            return Err(Failure::unusable(format!(
                "`{name}` has no [interferometer]; expected one, since captures need its free spectral range `fsr`"
            )));
        }
        let screen = arguments.screen.screen(arguments.language.unwrap_or(station.language));
        let answers = arguments.answers.as_deref().map(read_answers).transpose()?;
        let of_answers = || answers.as_ref().and_then(|answers| answers.retest.clone());
        let retest = arguments.retest.or_else(of_answers);
        let store = Store::new(home.reports());
        let rack = Rack::read(store.reports()).map_err(|error| Failure::store(&error))?;
        let of_option = arguments.lit_since.map(|text| ("--lit-since", text));
        let of_answers = || Some(("`lit_since` of the answers", answers.as_ref()?.lit_since.clone()?));
        // The clock of a scenario is its own: there the tube is as old as it is by the clock on the wall.
        let own_clock = simulated && arguments.start.is_none();
        let of_rack = || {
            let since = rack.since(serial)?;
            let text = if own_clock { age(since) } else { None }.unwrap_or_else(|| since.to_owned());
            Some(("since when it burns, by `tubewright rack list`,", text))
        };
        let lit_since = of_option.or_else(of_answers).or_else(of_rack).filter(|_| captures.is_none());
        Ok(Self {
            retest,
            serial: serial.to_owned(),
            lit_since,
            tube_type: arguments.tube_type,
            store,
            home,
            station: (text, station),
            scenario,
            captures,
            answers,
            ask: arguments.ask,
            pace: simulated.then(|| arguments.pace.unwrap_or(PACE)),
            seed: arguments.seed,
            screen,
            start: arguments.start,
            language: arguments.language,
            format: arguments.format,
        })
    }

    /// Everything comes from the simulated bench.
    pub fn simulated(&self) -> bool {
        self.scenario.is_some()
    }
}

/// How long ago that is, as a technician would say it: "2400 s".
fn age(since: &str) -> Option<String> {
    let since = DateTime::parse_from_rfc3339(since).ok()?;
    Some(format!("{} s", (Utc::now().fixed_offset() - since).num_seconds()))
}

/// The compiled-in station file of the bench on which the scenario has this tube.
pub(in crate::cli) fn demo_station(scenario: Option<&Scenario>, serial: &str) -> Result<(String, String), Failure> {
    let demo;
    let scenario = match scenario {
        Some(scenario) => scenario,
        None => {
            demo = Scenario::demo();
            &demo
        }
    };
    let bench = scenario.tube(serial).map_or(DEMO_BENCH, |tube| tube.bench.as_str());
    match demo_bench(bench) {
        Some(text) => Ok((format!("{bench}.toml"), text.to_owned())),
        None => Err(Failure::unusable(format!(
            "the scenario puts `{serial}` on `{bench}`, whose station file the program does not bring with it: \
             give it with `--station FILE`"
        ))),
    }
}

/// Whether captures come from the simulated bench; a source that needs something more is said.
pub(in crate::cli) fn is_simulated(station: &StationFile, name: &str) -> Result<bool, Failure> {
    match station.interferometer.as_ref().map(|interferometer| &interferometer.source) {
        Some(Source::Simulated) => Ok(true),
        Some(Source::Folder) => {
            Err(Failure::unusable(format!("`{name}` takes captures from a folder: name it with `--captures FOLDER`")))
        }
        Some(Source::Profile(profile)) => Err(Failure::unusable(format!(
            "`{name}` names the instrument profile `{profile}`, which this version cannot use: \
             record captures and give `--captures FOLDER`"
        ))),
        Some(Source::Typed) | None => Ok(false),
    }
}

pub(in crate::cli) fn read_text(path: &Path) -> Result<String, Failure> {
    std::fs::read_to_string(path)
        .map_err(|error| Failure::unusable(format!("cannot read `{}`: {}", path.display(), said(&error))))
}

pub(in crate::cli) fn read_scenario(path: &Path) -> Result<Scenario, Failure> {
    Scenario::parse(&path.display().to_string(), &read_text(path)?)
        .map_err(|error| Failure::unusable(format!("the scenario cannot be used:\n{error}")))
}

fn read_answers(path: &Path) -> Result<Answers, Failure> {
    let answers = Answers::parse(&path.display().to_string(), &read_text(path)?)
        .map_err(|faults| faulty("answer file", &faults))?;
    // A blank one is a fault of the file already.
    if answers.technician.is_none() {
        let message = format!(
            "an answer is missing: `{}` has no `technician`; expected `technician = \"KT\"`, the initials of who measures",
            path.display()
        );
        return Err(Failure::new(Ending::Unfinished, message));
    }
    Ok(answers)
}

/// Every fault of a file, a line each.
pub(in crate::cli) fn faulty(what: &str, faults: &[impl Display]) -> Failure {
    let lines: Vec<String> = faults.iter().map(ToString::to_string).collect();
    Failure::unusable(format!("the {what} cannot be used:\n{}", lines.join("\n")))
}
