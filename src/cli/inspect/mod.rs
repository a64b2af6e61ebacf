//! `tubewright inspect SERIAL`: the recipe of one tube from the first question to the frozen record; without a serial, a day of them.
//! Must not decide anything: the run judges, this carries its verdict to the exit status.
//! Main function: [`run`].

mod bench;
mod day;
pub(super) mod earlier;
mod freeze;
mod inputs;
mod lit_since;
mod live;
mod opening;
mod outside;
mod run_id;
mod screen;
pub(super) mod serial;
mod show;
mod stop;
mod voice;

use std::path::PathBuf;

use chrono::{DateTime, FixedOffset};
use clap::{Args, ValueEnum};

pub(super) use self::inputs::{demo_station, faulty, is_simulated, read_scenario, read_text};
pub(super) use self::lit_since::lit_since;
pub(super) use self::serial::check as check_serial;
use self::{inputs::Inputs, opening::Opening, show::Show};
use super::{Ending, Failure, output};
use crate::disk::{Rack, RunFolder, Store};
use crate::driver::{Driver, Engine, Interrupted, Watcher, resume};
use crate::phrase::Language;
use crate::record::event::Event;
use crate::record::sheet::{Outcome, Sheet};
use crate::run::{Remark, Run};

/// How results are printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// Lines for people
    Text,
    /// One JSON object a line
    Json,
}

/// Arguments as given.
#[derive(Debug, Clone, Args)]
pub struct Arguments {
    /// Serial number of the tube, as scanned; left out with --scenario: every tube of the scenario
    #[arg(value_name = "SERIAL", required_unless_present = "scenario")]
    serial: Option<String>,
    /// Tube type: a folder below limits/
    #[arg(long = "type", value_name = "TYPE")]
    tube_type: Option<String>,
    /// Station file; without it the simulated demo bench
    #[arg(long, value_name = "FILE")]
    station: Option<PathBuf>,
    /// Folder of captured sweeps in place of an interferometer
    #[arg(long, value_name = "FOLDER", requires = "station")]
    captures: Option<PathBuf>,
    /// Ask a person at the terminal
    #[arg(long, conflicts_with = "answers")]
    ask: bool,
    /// Take the answers from a file
    #[arg(long, value_name = "FILE")]
    answers: Option<PathBuf>,
    /// Repeat a finished run of this serial: the cause, in words
    #[arg(long, value_name = "WHY")]
    retest: Option<String>,
    /// End the unfinished run of this serial, if nobody is at it: the reason, in words
    #[arg(long, value_name = "WHY", conflicts_with_all = ["retest", "scenario", "captures", "ask", "answers"])]
    stop: Option<String>,
    /// Folder that holds limits/ and reports/ (else TUBEWRIGHT_HOME, else the nearest parent with limits/)
    #[arg(long, value_name = "DIR")]
    home: Option<PathBuf>,
    /// Folder of records
    #[arg(long, value_name = "DIR")]
    reports: Option<PathBuf>,
    /// Simulated bench: most bench seconds in one second of wall time, such as 60x
    #[arg(long, value_name = "FACTOR", value_parser = pace)]
    pace: Option<f64>,
    /// Fixes everything that is drawn
    #[arg(long, value_name = "N")]
    seed: Option<u64>,
    /// Fixes when the run starts (RFC 3339)
    #[arg(long, value_name = "TIME", value_parser = moment)]
    start: Option<DateTime<FixedOffset>>,
    /// The tube burns already, in a rack: since a time of today (07:40), RFC 3339, or for an age ("40 min")
    #[arg(long, value_name = "TIME", conflicts_with = "captures")]
    lit_since: Option<String>,
    /// Scenario of the simulated bench: a file, else the demo day; without SERIAL all of its tubes, one after the other
    #[arg(long, value_name = "FILE", num_args = 0..=1, conflicts_with = "captures")]
    scenario: Option<Option<PathBuf>>,
    /// Language of the sheet and of the questions: en or de (else the station's)
    #[arg(long, value_name = "CODE", value_parser = language)]
    language: Option<Language>,
    /// How to print
    #[arg(long, value_enum, default_value = "text")]
    format: Format,
    #[command(flatten)]
    screen: screen::ScreenArguments,
}

fn pace(text: &str) -> Result<f64, String> {
    let number = text.trim_end_matches(['x', '×']).parse::<f64>().ok();
    number
        .filter(|number| number.is_finite() && *number > 0.0)
        .ok_or_else(|| format!("`{text}` is no pace; expected a factor above zero such as 60x"))
}

fn language(text: &str) -> Result<Language, String> {
    let known = || Language::CODES.map(|(code, _)| code).join(", ");
    Language::of_code(text).ok_or_else(|| format!("`{text}` is no language of a sheet; expected one of {}", known()))
}

fn moment(text: &str) -> Result<DateTime<FixedOffset>, String> {
    DateTime::parse_from_rfc3339(text)
        .map_err(|_| format!("`{text}` is no time; expected such as 2026-01-05T06:00:00Z (RFC 3339)"))
}

impl Arguments {
    /// Refuses for a whole day what is said of one tube.
    fn of_one_tube(&self) -> Result<(), Failure> {
        let given = [
            ("--type", self.tube_type.is_some()),
            ("--start", self.start.is_some()),
            ("--retest", self.retest.is_some()),
            ("--lit-since", self.lit_since.is_some()),
        ];
        match given.iter().find(|(_, given)| *given) {
            Some((option, _)) => Err(Failure::unusable(format!(
                "`{option}` is of one tube, and no SERIAL is given: say the SERIAL, or leave `{option}` out to inspect all \
                 tubes of the scenario"
            ))),
            None => Ok(()),
        }
    }

    /// The same for one tube of a day: without a pace of its own the bench goes as fast as it can.
    fn for_day(&self) -> Self {
        Self { pace: self.pace.or(Some(f64::INFINITY)), ..self.clone() }
    }
}

/// Inspects one tube, or all of a scenario.
pub fn run(arguments: Arguments) -> Result<Ending, Failure> {
    stop::listen();
    let Some(serial) = arguments.serial.clone() else {
        arguments.of_one_tube()?;
        return day::run(&arguments);
    };
    serial::check(&serial)?;
    if let Some(why) = &arguments.stop {
        let home = super::home::find(arguments.home, arguments.reports)?;
        return outside::stop(&Store::new(home.reports()), serial.trim(), why, arguments.format);
    }
    let inputs = Inputs::read(arguments, &serial)?;
    let mut show = Show::new(inputs.format, inputs.pace, inputs.screen.clone(), inputs.ask);
    inspect(&inputs, Some(&mut show)).map(|done| ending_of(&done.sheet))
}

/// A run that came to its end.
struct Done {
    sheet: Sheet,
    folder: PathBuf,
}

/// Sees nothing.
struct Unseen;

impl Watcher for Unseen {
    fn happened(&mut self, _: &Run, _: &Event, _: &[Remark]) {}
}

/// Drives the run of one tube to its end and freezes its record.
///
/// * `show`: who shows it; none shows nothing.
fn inspect(inputs: &Inputs, mut show: Option<&mut Show>) -> Result<Done, Failure> {
    let mut opening = Opening::decide(inputs)?;
    let engine = Engine::of(&opening.plan)
        .map_err(|error| Failure::unusable(format!("failed to read the station's columns: {error}")))?;
    let mut run = Run::open(opening.plan.clone(), opening.identity.clone());
    let (mut journal, events) = opening.folder()?;
    voice::same(inputs, &opening.identity, &events, journal.path())?;
    // On the bench it is no longer in the rack.
    let mut rack = Rack::read(inputs.store.reports()).map_err(|error| Failure::store(&error))?;
    if rack.since(&inputs.serial).is_some() {
        rack.change(&[], std::slice::from_ref(&inputs.serial)).map_err(|error| Failure::store(&error))?;
    }
    if let Some(show) = show.as_deref_mut() {
        show.begun(&run, journal.path());
        if let Some(repeat) = &opening.identity.repeats {
            show.say(&format!("Repeats run {} because: {}", repeat.run_id, repeat.reason));
        }
    }
    if let Err(why) = resume(&mut run, &mut opening.bench, &mut journal, &events) {
        return Err(interrupted(&why, journal.path()));
    }
    if let (Some(show), Some(last)) = (show.as_deref_mut(), events.last()) {
        if events.len() > 1 {
            show.taken_up(&run, last);
            bench::looked(inputs, &run).map_err(|trouble| interrupted(&trouble.into(), journal.path()))?;
        }
        show.happened(&run, last, &[]);
    }
    let armed = stop::Armed::new();
    let mut unseen = Unseen;
    let watcher: &mut dyn Watcher = match show.as_deref_mut() {
        Some(show) => show,
        None => &mut unseen,
    };
    let (bench, engine) = (&mut opening.bench, engine.as_ref());
    let driven = Driver { run: &mut run, bench, journal: &mut journal, engine, watcher }.drive();
    drop(armed);
    if let Some(show) = show.as_deref_mut() {
        show.clear();
    }
    if let Err(why) = driven {
        return Err(interrupted(&why, journal.path()));
    }
    let sheet = finish(&run, &mut journal, show)?;
    Ok(Done { sheet, folder: journal.path().to_owned() })
}

/// Freezes the record and shows how the tube ended.
fn finish(run: &Run, journal: &mut RunFolder, show: Option<&mut Show>) -> Result<Sheet, Failure> {
    let sheet = run.sheet();
    freeze::freeze(journal, &sheet)?;
    if sheet.verdict.outcome == Outcome::Stopped && !sheet.identity.from_captures {
        output::talk(
            "Stopped. Look whether the tube is still lit: only the supply's switch takes the high voltage off.",
        );
    }
    if let Some(show) = show {
        show.ended(&sheet, journal.path())?;
    }
    Ok(sheet)
}

fn ending_of(sheet: &Sheet) -> Ending {
    match sheet.verdict.outcome {
        Outcome::Pass => Ending::Accepted,
        Outcome::Fail => Ending::NotAccepted,
        Outcome::Hold => Ending::Hold,
        Outcome::Open | Outcome::Stopped => Ending::Unfinished,
    }
}

/// An interruption as an ending, with where the open sheet is kept.
fn interrupted(why: &Interrupted, path: &std::path::Path) -> Failure {
    let (ending, what) = match why {
        Interrupted::NoAnswer(_) => (Ending::Unfinished, "an answer is missing"),
        Interrupted::Instrument(_) => (Ending::Instrument, "an instrument failed"),
        Interrupted::Journal(_) => (Ending::Store, "the run could not be stored"),
        Interrupted::Stuck { .. } => (Ending::Unfinished, "the run does not go on"),
    };
    let kept = format!("the sheet stays open in `{}`: the same command goes on from there", path.display());
    Failure::new(ending, format!("{what}: {why}\n{kept}"))
}
