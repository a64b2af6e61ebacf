//! `tubewright inspect SERIAL`: the recipe of one tube from the first question to the frozen record.
//! Must not decide anything: the run judges, this carries its verdict to the exit status.
//! Main function: [`run`].

mod bench;
mod freeze;
mod inputs;
mod live;
mod opening;
mod run_id;
mod screen;
mod serial;
mod show;

use std::path::PathBuf;

use chrono::{DateTime, FixedOffset};
use clap::{Args, ValueEnum};

use self::{inputs::Inputs, opening::Opening, show::Show};
use super::{Ending, Failure};
use crate::driver::{Driver, Engine, Interrupted, Watcher as _, resume};
use crate::phrase::Language;
use crate::record::sheet::Outcome;
use crate::run::Run;

/// How results are printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// Lines for people
    Text,
    /// One JSON object a line
    Json,
}

/// Arguments as given.
#[derive(Debug, Args)]
pub struct Arguments {
    /// Serial number of the tube, as scanned
    #[arg(value_name = "SERIAL")]
    serial: String,
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
    /// Scenario of the simulated bench
    #[arg(long, value_name = "FILE", conflicts_with = "captures")]
    scenario: Option<PathBuf>,
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

/// Inspects one tube.
pub fn run(arguments: Arguments) -> Result<Ending, Failure> {
    serial::check(&arguments.serial)?;
    let inputs = Inputs::read(arguments)?;
    let mut opening = Opening::decide(&inputs)?;
    let engine = Engine::of(&opening.plan)
        .map_err(|error| Failure::unusable(format!("failed to read the station's columns: {error}")))?;
    let mut run = Run::open(opening.plan.clone(), opening.identity.clone());
    let mut show = Show::new(inputs.format, inputs.pace, inputs.screen.clone(), inputs.ask);
    let (mut journal, events) = opening.folder()?;
    show.begun(&run, journal.path());
    if let Err(why) = resume(&mut run, &mut opening.bench, &mut journal, &events) {
        return Err(interrupted(&why, journal.path()));
    }
    if let Some(last) = events.last() {
        if events.len() > 1 {
            show.taken_up(&run, last);
            bench::looked(&inputs, &run).map_err(|trouble| interrupted(&trouble.into(), journal.path()))?;
        }
        show.happened(&run, last, &[]);
    }
    let driven = Driver {
        run: &mut run,
        bench: &mut opening.bench,
        journal: &mut journal,
        engine: engine.as_ref(),
        watcher: &mut show,
    }
    .drive();
    show.clear();
    if let Err(why) = driven {
        return Err(interrupted(&why, journal.path()));
    }
    let sheet = run.sheet();
    freeze::freeze(&mut journal, &sheet)?;
    show.ended(&sheet, journal.path())?;
    Ok(match sheet.verdict.outcome {
        Outcome::Pass => Ending::Accepted,
        Outcome::Fail => Ending::NotAccepted,
        Outcome::Hold => Ending::Hold,
        Outcome::Open | Outcome::Stopped => Ending::Unfinished,
    })
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
