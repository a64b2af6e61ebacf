//! The bench that the inputs describe, and who answers at it.
//! Must not touch an instrument yet.
//! Main function: [`build`].

use std::io;

use chrono::{DateTime, FixedOffset};

use super::{
    inputs::Inputs,
    stop::{Lines, StopKey},
};
use crate::cli::{Ending, Failure};
use crate::instruments::{
    FilePerson, HandInterlock, NoInstrument, Nobody, Screen, SimulatedBench, SimulatedOptions, TerminalPerson,
    WallClock, Zoned, folder_bench,
};
use crate::phrase::terminal as phrase;
use crate::run::Run;
use crate::station::{Bench, Person, Trouble, Want};

/// Why a question is passed over where only captures are looked at.
const CAPTURES_ONLY: &str = "captures only: nobody at a bench";
/// Said of a bench without what is wanted.
const NOT_ON_THIS_BENCH: &str = "not on this bench";

/// Blank answers after which nobody is there.
const INITIALS_TRIES: usize = 3;

/// A person at this terminal; initials not known yet.
pub(super) fn terminal(screen: &Screen) -> TerminalPerson {
    // Lines are read one at a time through the one buffer of the process: a second terminal loses nothing of a pipe.
    let input = Box::new(Lines::over(screen.clone()));
    TerminalPerson::new(String::new(), input, Box::new(io::stderr()), screen.clone())
}

/// Builds the bench.
///
/// * `earlier`: how many runs of this serial came before.
/// * `started_at`: when the run was opened.
/// * `lit_since`: since when the tube burns already, if a rack warmed it.
/// * `technician`: initials; filled in if empty.
pub(super) fn build(
    inputs: &Inputs,
    earlier: usize,
    started_at: DateTime<FixedOffset>,
    lit_since: Option<DateTime<FixedOffset>>,
    technician: &mut String,
) -> Result<Bench, Failure> {
    let bench = of_source(inputs, earlier, started_at, lit_since, technician)?;
    let clock = Box::new(Zoned::over(bench.clock, inputs.station.1.time_zone));
    Ok(Bench { clock, interlock: Box::new(StopKey { inner: bench.interlock, screen: inputs.screen.clone() }), ..bench })
}

fn of_source(
    inputs: &Inputs,
    earlier: usize,
    started_at: DateTime<FixedOffset>,
    lit_since: Option<DateTime<FixedOffset>>,
    technician: &mut String,
) -> Result<Bench, Failure> {
    let person = person(inputs, technician)?;
    if let Some(folder) = &inputs.captures {
        let nobody = || Box::new(Nobody::PassesOver(CAPTURES_ONLY.to_owned()));
        return Ok(folder_bench(folder.clone(), started_at, person.unwrap_or_else(|| nobody())));
    }
    if inputs.scenario.is_some() {
        let bench = simulated(inputs, earlier, started_at, technician, person.is_none())?;
        let age = lit_since.and_then(|since| u64::try_from((started_at - since).num_milliseconds()).ok());
        return Ok(age.map_or(bench.clone(), |age| bench.lit_for(age)).bench_with(person));
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
fn person(inputs: &Inputs, technician: &mut String) -> Result<Option<Box<dyn Person>>, Failure> {
    if inputs.ask {
        let mut person = terminal(&inputs.screen);
        if technician.is_empty() {
            *technician = initials(&mut person)?;
        }
        person.set_initials(technician.clone());
        return Ok(Some(Box::new(person)));
    }
    let Some(answers) = inputs.answers.as_ref() else { return Ok(None) };
    if technician.is_empty() {
        *technician = answers.technician.clone().unwrap_or_default();
    }
    let pass_over = inputs.captures.is_some().then(|| CAPTURES_ONLY.to_owned());
    Ok(Some(Box::new(FilePerson::new(answers.clone(), pass_over))))
}

/// The initials of who measures, asked again a few times: a record without a name is none.
fn initials(person: &mut TerminalPerson) -> Result<String, Failure> {
    (0..INITIALS_TRIES).find_map(|_| person.ask_line("Your initials, such as KT")).ok_or_else(|| {
        let message = "an answer is missing: your initials were left blank; expected letters such as KT: \
                       nothing was begun, give the same command again";
        Failure::new(Ending::Unfinished, message)
    })
}

fn simulated(
    inputs: &Inputs,
    earlier: usize,
    started_at: DateTime<FixedOffset>,
    technician: &mut String,
    own_technician: bool,
) -> Result<SimulatedBench, Failure> {
    let unknown = || Failure::unusable(format!("the simulated bench has no tube `{}`", inputs.serial));
    let scenario = inputs.scenario.as_ref().ok_or_else(unknown)?;
    let world = scenario.world(&inputs.serial, inputs.seed).ok_or_else(unknown)?.again(earlier as u64);
    if own_technician && technician.is_empty() {
        *technician = scenario.technician.clone();
    }
    let of_answers = inputs.answers.as_ref().map(|answers| (answers.time_to_answer_s * 1000.0).round() as u64);
    let options = SimulatedOptions {
        started_at,
        pace: inputs.pace.unwrap_or(f64::INFINITY),
        time_to_answer_ms: of_answers.unwrap_or(scenario.time_to_answer_ms),
    };
    Ok(SimulatedBench::new(world, options))
}
