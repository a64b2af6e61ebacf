//! The bench that the inputs describe, and who answers at it.
//! Must not touch an instrument yet.
//! Main function: [`build`].

use std::io;

use chrono::{DateTime, FixedOffset};

use super::inputs::Inputs;
use crate::cli::Failure;
use crate::instruments::{
    FilePerson, HandInterlock, NoInstrument, Nobody, Screen, SimulatedBench, SimulatedOptions, TerminalPerson,
    WallClock, folder_bench,
};
use crate::phrase::terminal as phrase;
use crate::run::Run;
use crate::station::{Bench, Person, Trouble, Want};

/// Why a question is passed over where only captures are looked at.
const CAPTURES_ONLY: &str = "captures only: nobody at a bench";
/// Said of a bench without what is wanted.
const NOT_ON_THIS_BENCH: &str = "not on this bench";

/// A person at this terminal; initials not known yet.
pub(super) fn terminal(screen: &Screen) -> TerminalPerson {
    // Byte by byte through the one buffer of the process: a second terminal loses nothing of a pipe, and none holds its lock.
    let input = Box::new(io::BufReader::with_capacity(1, io::stdin()));
    TerminalPerson::new(String::new(), input, Box::new(io::stderr()), screen.clone())
}

/// Builds the bench.
///
/// * `started_at`: when the run was opened.
/// * `technician`: initials; filled in if empty.
pub(super) fn build(
    inputs: &Inputs,
    started_at: DateTime<FixedOffset>,
    technician: &mut String,
) -> Result<Bench, Failure> {
    let person = person(inputs, technician);
    if let Some(folder) = &inputs.captures {
        let nobody = || Box::new(Nobody::PassesOver(CAPTURES_ONLY.to_owned()));
        return Ok(folder_bench(folder.clone(), started_at, person.unwrap_or_else(|| nobody())));
    }
    if inputs.scenario.is_some() {
        return simulated(inputs, started_at, person, technician);
    }
    let none = || Box::new(NoInstrument { reason: NOT_ON_THIS_BENCH.to_owned() });
    let hint = "give `--ask` to answer at this terminal, or `--answers FILE`".to_owned();
    Ok(Bench {
        clock: Box::new(WallClock::start(inputs.station.1.time_zone)),
        captures: none(),
        meters: none(),
        person: person.unwrap_or_else(|| Box::new(Nobody::LeavesOpen(hint))),
        interlock: if inputs.ask { Box::new(HandInterlock::new(terminal(&inputs.screen))) } else { none() },
    })
}

/// Waits until a person at a real bench has looked at supply and tube, before a run goes on that was interrupted.
///
/// Where high voltage has to come off anyway, the interlock asks. Errors: the input ended.
pub(super) fn looked(inputs: &Inputs, run: &Run) -> Result<(), Trouble> {
    let at_a_bench = inputs.ask && inputs.captures.is_none() && !inputs.simulated();
    if !at_a_bench || matches!(run.wants(), Want::MakeSafe | Want::Finished) {
        return Ok(());
    }
    terminal(&inputs.screen).wait_for(&phrase::LOOKED)
}

/// Who was named to answer: a person here, or a file.
fn person(inputs: &Inputs, technician: &mut String) -> Option<Box<dyn Person>> {
    if inputs.ask {
        let mut person = terminal(&inputs.screen);
        if technician.is_empty() {
            *technician = person.ask_line("Your initials").unwrap_or_default();
        }
        person.set_initials(technician.clone());
        return Some(Box::new(person));
    }
    let answers = inputs.answers.as_ref()?;
    if technician.is_empty() {
        *technician = answers.technician.clone().unwrap_or_default();
    }
    let pass_over = inputs.captures.is_some().then(|| CAPTURES_ONLY.to_owned());
    Some(Box::new(FilePerson::new(answers.clone(), pass_over)))
}

fn simulated(
    inputs: &Inputs,
    started_at: DateTime<FixedOffset>,
    person: Option<Box<dyn Person>>,
    technician: &mut String,
) -> Result<Bench, Failure> {
    let unknown = || Failure::unusable(format!("the simulated bench has no tube `{}`", inputs.serial));
    let scenario = inputs.scenario.as_ref().ok_or_else(unknown)?;
    let world = scenario.world(&inputs.serial, inputs.seed).ok_or_else(unknown)?;
    if person.is_none() && technician.is_empty() {
        *technician = scenario.technician.clone();
    }
    let of_answers = inputs.answers.as_ref().map(|answers| (answers.time_to_answer_s * 1000.0).round() as u64);
    let options = SimulatedOptions {
        started_at,
        pace: inputs.pace.unwrap_or(f64::INFINITY),
        time_to_answer_ms: of_answers.unwrap_or(scenario.time_to_answer_ms),
    };
    Ok(SimulatedBench::new(world, options).bench_with(person))
}
