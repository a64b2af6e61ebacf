//! The command line: one file per command; how each ends becomes the exit status.
//! Must not decide anything about a tube.
//! Main function: [`run`].

pub mod check;
mod checks;
mod ending;
mod history;
mod home;
mod inspect;
mod measure;
mod output;
mod rack;
pub mod simulate;
mod station;

pub use ending::{Ending, Failure};

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

use self::simulate::SimulateError;
use crate::limits::nearest;

/// Test station for helium-neon laser tubes: warm up, sweep, measure, judge, record.
#[derive(Debug, Parser)]
#[command(name = "tubewright", version, about, disable_help_subcommand = true)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Run the recipe for one tube, judge it, leave record.csv and record.pdf
    Inspect(Box<inspect::Arguments>),
    /// Measure captured sweeps and print what was found; no record
    Measure(measure::Arguments),
    /// Read limits, recipes and station files; say everything that is wrong, with line and column
    Check {
        #[command(flatten)]
        arguments: check::CheckArgs,
        /// Folder that holds limits/ (else TUBEWRIGHT_HOME, else the nearest parent with limits/)
        #[arg(long, value_name = "DIR")]
        home: Option<PathBuf>,
    },
    /// Every run of a tube side by side, what changed between them, and what was done to it meanwhile
    History(history::Arguments),
    /// Show a bench: certificates, reference tubes with their chart, what is due, whether it gives verdicts
    Station(station::Arguments),
    /// Keep which tubes burn in the rack since when
    Rack(rack::Arguments),
    /// Write captures of a simulated tube, sound or faulty, and the truth about it
    Simulate(Box<simulate::SimulateArgs>),
}

/// Runs the command that the process was given.
///
/// Returns the exit status of its ending. Wrong usage ends in 2, said by the reader of arguments itself.
pub fn run() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(mut error) => {
            name_the_nearest(&mut error);
            // Nobody to tell if this fails too.
            let _ = error.print();
            return ExitCode::from(u8::try_from(error.exit_code()).unwrap_or(2));
        }
    };
    let ended = match arguments.command {
        Command::Inspect(arguments) => inspect::run(*arguments),
        Command::Measure(arguments) => measure::run(&arguments),
        Command::Check { arguments, home } => check(&arguments, home),
        Command::History(arguments) => history::run(arguments),
        Command::Station(arguments) => station::run(&arguments),
        Command::Rack(arguments) => rack::run(arguments),
        Command::Simulate(arguments) => simulate(&arguments),
    };
    let ending = ended.unwrap_or_else(|failure| {
        output::talk(&format!("tubewright: {}", failure.message));
        failure.ending
    });
    ExitCode::from(ending.status())
}

/// An option that does not exist: names the nearest that does, transposed letters included.
fn name_the_nearest(error: &mut clap::Error) {
    use clap::{
        CommandFactory as _,
        error::{ContextKind, ContextValue, ErrorKind},
    };
    let (ErrorKind::UnknownArgument, Some(ContextValue::String(found))) =
        (error.kind(), error.get(ContextKind::InvalidArg))
    else {
        return;
    };
    let program = Arguments::command();
    let command = std::env::args().nth(1).and_then(|name| program.find_subcommand(name));
    let options = command.into_iter().flat_map(|command| command.get_arguments().filter_map(clap::Arg::get_long));
    if let Some(near) = nearest(found.trim_start_matches('-'), options) {
        error.insert(ContextKind::SuggestedArg, ContextValue::String(format!("--{near}")));
    }
}

/// Prints every fault; any makes the files unusable.
fn check(arguments: &check::CheckArgs, home: Option<PathBuf>) -> Result<Ending, Failure> {
    let home = home::find(home, None)?;
    let mut text = Vec::new();
    let faults = check::check(arguments, home.folder(), &mut text)
        .map_err(|error| Failure::new(Ending::Store, format!("cannot write the faults: {error}")))?;
    output::result(String::from_utf8_lossy(&text).trim_end())?;
    Ok(if faults == 0 { Ending::Accepted } else { Ending::Unusable })
}

/// Says what `simulate` wrote, and maps what went wrong.
fn simulate(arguments: &simulate::SimulateArgs) -> Result<Ending, Failure> {
    match simulate::run(arguments) {
        Ok(simulate::Simulated { written, lost }) => {
            let folder = arguments.folder.display();
            output::talk(&format!("{written} captures written to `{folder}`, {lost} lost on purpose"));
            Ok(Ending::Accepted)
        }
        Err(error) => {
            let ending = match &error {
                SimulateError::UnknownType { .. } | SimulateError::Impossible { .. } => Ending::Unusable,
                SimulateError::InTheWay(_) | SimulateError::Disk { .. } => Ending::Store,
            };
            Err(Failure::new(ending, error.to_string()))
        }
    }
}
