//! Which run it will be: an unfinished one of this serial taken up again, or a new one with plan and identity.
//! Must not write before everything is known to be usable.
//! Main type: [`Opening`].

use std::path::PathBuf;

use chrono::{DateTime, Datelike as _, FixedOffset, Utc};

use super::{
    bench, earlier,
    inputs::{Inputs, faulty},
    lit_since::{RUN, lit_since},
    run_id::run_id,
};
use crate::cli::checks::{checks_of, last_of_each};
use crate::cli::{Failure, output};
use crate::disk::{FoundRun, RunFolder, SerialLock, TypeTexts, life_of};
use crate::limits::{Limits, nearest};
use crate::recipe::Recipe;
use crate::record::event::{Event, Happening, Identity, Opened, Repeat, RunKind};
use crate::record::reference::ReferenceCheck;
use crate::run::Plan;
use crate::station::standing::unclosed;
use crate::station::{Bench, Moment};

/// A run about to be driven.
pub(super) struct Opening {
    pub plan: Plan,
    pub identity: Identity,
    pub bench: Bench,
    path: PathBuf,
    /// The first event of a new run; none if it is taken up again.
    first: Option<(Moment, Happening)>,
    _lock: SerialLock,
}

impl Opening {
    /// Finds the type, parses the plan, takes the serial.
    pub fn decide(inputs: &Inputs) -> Result<Self, Failure> {
        let runs = inputs.store.runs_of(&inputs.serial).map_err(|error| Failure::store(&error))?;
        // Before the lock, so that input which cannot be used leaves nothing behind.
        let is_open = |run: &&FoundRun| !run.frozen;
        let planned = if runs.iter().any(|run| is_open(&run)) { None } else { Some(new_plan(inputs, &runs)?) };
        let since = Utc::now().format("%Y-%m-%dT%H:%M:%SZ").to_string();
        let lock =
            SerialLock::take(inputs.store.reports(), &inputs.serial, &since).map_err(|error| Failure::store(&error))?;
        // Another process may have finished its run meanwhile.
        let runs = inputs.store.runs_of(&inputs.serial).map_err(|error| Failure::store(&error))?;
        match (runs.iter().rfind(is_open), planned) {
            (Some(open), _) => Self::again(inputs, &runs, open, lock),
            (None, Some(planned)) => Self::anew(inputs, planned, &runs, lock),
            (None, None) => Self::anew(inputs, new_plan(inputs, &runs)?, &runs, lock),
        }
    }

    fn again(inputs: &Inputs, runs: &[FoundRun], open: &FoundRun, lock: SerialLock) -> Result<Self, Failure> {
        let Opened { identity, recipe, limits, station } = &open.opened;
        let other = |what: &str| {
            Err(Failure::unusable(format!(
                "`{}` is unfinished and {what}; give the command it was started with, or end it with `--stop \"why\"`",
                open.path.display()
            )))
        };
        if inputs.tube_type.as_ref().is_some_and(|given| *given != identity.tube_type) {
            return other(&format!("of type `{}`", identity.tube_type));
        }
        if identity.from_captures != inputs.captures.is_some() {
            return other(if identity.from_captures { "was fed from captures" } else { "was not fed from captures" });
        }
        if identity.simulated != inputs.simulated() {
            return other(if identity.simulated { "is on a simulated bench" } else { "is on a real bench" });
        }
        let repeated = identity.repeats.as_ref().map(|repeat| repeat.reason.as_str());
        if inputs.retest.as_ref().is_some_and(|why| Some(why.trim()) != repeated) {
            return other(if repeated.is_some() { "repeats another for another cause" } else { "repeats none" });
        }
        if inputs.language.is_some_and(|given| given != identity.language()) {
            return other(&format!("has its sheet in language `{}`", identity.language().code()));
        }
        let plan = Plan::from_texts(recipe, limits, station).map_err(|faults| faulty("stored plan", &faults))?;
        let started_at = DateTime::parse_from_rfc3339(&identity.started_at).unwrap_or_default();
        let before = runs.iter().filter(|run| run.opened.identity.run_id < identity.run_id).count();
        let lit_since = identity.lit_since.as_deref().and_then(|since| DateTime::parse_from_rfc3339(since).ok());
        let bench = bench::build(inputs, before, started_at, lit_since, &mut identity.technician.clone())?;
        Ok(Self { plan, identity: identity.clone(), bench, path: open.path.clone(), first: None, _lock: lock })
    }

    /// * `runs`: of this serial, those that there are already.
    fn anew(inputs: &Inputs, planned: Planned, runs: &[FoundRun], lock: SerialLock) -> Result<Self, Failure> {
        let Planned { tube_type, texts, plan, repeats, started_at, lit_since } = planned;
        let (station_text, station) = &inputs.station;
        let reference = station.reference(&inputs.serial).is_some();
        let run_kind = if reference { RunKind::Reference } else { RunKind::Product };
        let reference_checks = if reference { None } else { Some(bench_checks(inputs, started_at)?) };
        let mut technician = String::new();
        let bench = bench::build(inputs, runs.len(), started_at, lit_since, &mut technician)?;
        let tube = inputs.scenario.as_ref().and_then(|scenario| scenario.tube(&inputs.serial));
        let of_tube =
            |field: fn(&crate::phantom::ScenarioTube) -> &String| tube.map(field).cloned().unwrap_or_default();
        let seed = inputs.seed.or(inputs.scenario.as_ref().map(|scenario| scenario.seed));
        let identity = Identity {
            run_id: run_id(started_at.timestamp_millis(), &inputs.serial, runs.len(), seed),
            serial: inputs.serial.clone(),
            tube_type,
            supplier: of_tube(|tube| &tube.supplier),
            lot: of_tube(|tube| &tube.lot),
            condition: of_tube(|tube| &tube.condition),
            received: of_tube(|tube| &tube.received),
            technician,
            started_at: started_at.to_rfc3339_opts(chrono::SecondsFormat::Millis, false),
            time_zone: station.time_zone.name().to_owned(),
            simulated: inputs.simulated(),
            from_captures: inputs.captures.is_some(),
            times_assumed: inputs.captures.as_ref().is_some_and(|folder| folder.first_at().is_none()),
            program_version: env!("CARGO_PKG_VERSION").to_owned(),
            language: inputs.language.unwrap_or(station.language).stored(),
            repeats,
            run_kind,
            reference_checks,
            lit_since: lit_since.map(|since| since.to_rfc3339_opts(chrono::SecondsFormat::Millis, false)),
        };
        let opened = Opened {
            identity: identity.clone(),
            recipe: texts.recipe,
            limits: texts.limits,
            station: station_text.clone(),
        };
        let path = inputs.store.run_path(started_at.year(), &inputs.serial, &identity.run_id);
        let first = (Moment { wall: started_at, elapsed_ms: 0 }, Happening::Opened(Box::new(opened)));
        Ok(Self { plan, identity, bench, path, first: Some(first), _lock: lock })
    }

    /// The run's folder, made now if the run is new, and the events it holds.
    pub fn folder(&mut self) -> Result<(RunFolder, Vec<Event>), Failure> {
        match self.first.take() {
            Some((at, opened)) => {
                RunFolder::create(&self.path, at, &opened).map(|(folder, event)| (folder, vec![event]))
            }
            None => RunFolder::reopen(&self.path),
        }
        .map_err(|error| Failure::store(&error))
    }
}

/// The last check of each reference tube of the bench; says so where the last shift was not closed.
fn bench_checks(inputs: &Inputs, at: DateTime<FixedOffset>) -> Result<Vec<ReferenceCheck>, Failure> {
    let station = &inputs.station.1;
    let checks = checks_of(&inputs.store, station, inputs.simulated(), at)?;
    for sentence in unclosed(station, at, &checks) {
        output::talk(&sentence);
    }
    Ok(last_of_each(station, &checks))
}

/// When a new run starts: as told, else as the scenario or the first capture says, else now.
///
/// * `not_before`: on the simulated bench, whose clock is its own, a run does not begin before the one before it ended.
fn started_at(inputs: &Inputs, not_before: Option<DateTime<FixedOffset>>) -> DateTime<FixedOffset> {
    let of_scenario = || {
        let started_at = inputs.scenario.as_ref()?.tube(&inputs.serial)?.started_at;
        Some(not_before.map_or(started_at, |earliest| started_at.max(earliest)))
    };
    let of_captures = || inputs.captures.as_ref()?.first_at();
    inputs.start.or_else(of_scenario).or_else(of_captures).unwrap_or_else(|| Utc::now().fixed_offset())
}

/// What a new run will be.
struct Planned {
    tube_type: String,
    texts: TypeTexts,
    plan: Plan,
    /// The run that it repeats.
    repeats: Option<Repeat>,
    started_at: DateTime<FixedOffset>,
    lit_since: Option<DateTime<FixedOffset>>,
}

/// Type, texts and plan of a new run.
fn new_plan(inputs: &Inputs, runs: &[FoundRun]) -> Result<Planned, Failure> {
    if let Some(scenario) = inputs.scenario.as_ref().filter(|scenario| scenario.tube(&inputs.serial).is_none()) {
        let known: Vec<&str> = scenario.tubes.iter().map(|tube| tube.serial.as_str()).collect();
        return Err(Failure::unusable(format!(
            "the simulated bench has no tube `{}`; it has {}",
            inputs.serial,
            known.join(", ")
        )));
    }
    let tube_type = tube_type(inputs, runs)?;
    let texts = match inputs.home.read_type(&tube_type).map_err(|error| Failure::unusable(error.to_string()))? {
        Some(texts) => texts,
        None => return Err(unknown_type(inputs, Some(&tube_type))),
    };
    let limits = Limits::parse(&texts.limits_name, &texts.limits).map_err(|faults| faulty("limits file", &faults))?;
    let recipe = Recipe::parse(&texts.recipe_name, &texts.recipe).map_err(|faults| faulty("recipe", &faults))?;
    let plan = Plan { recipe, limits, station: inputs.station.1.clone() };
    same_revision_same_text(&tube_type, &texts, &plan, runs)?;
    let finished = earlier::Finished::of(runs);
    // A reference tube is measured at every shift: it judges the bench, and nothing is retested.
    let reference = inputs.station.1.reference(&inputs.serial).is_some();
    let repeats = if reference { None } else { repeats(inputs, &tube_type, &plan, &finished)? };
    let zone = inputs.station.1.time_zone;
    let started_at = started_at(inputs, earlier::not_before(&finished)).with_timezone(&zone).fixed_offset();
    let lit_since =
        inputs.lit_since.as_ref().map(|(from, text)| lit_since(from, text, (RUN, started_at), zone)).transpose()?;
    Ok(Planned { tube_type, texts, plan, repeats, started_at, lit_since })
}

/// Which earlier run the new one repeats, if it may be opened at all.
fn repeats(
    inputs: &Inputs,
    tube_type: &str,
    plan: &Plan,
    finished: &[earlier::Finished<'_>],
) -> Result<Option<Repeat>, Failure> {
    let life = life_of(inputs.store.reports(), &inputs.serial).map_err(|error| Failure::store(&error))?;
    let wanted = earlier::Wanted {
        serial: &inputs.serial,
        tube_type,
        why: inputs.retest.as_deref(),
        retests: plan.recipe.retests,
    };
    earlier::allow(&wanted, finished, &life)
}

/// `--type`, else the answers, else the serial's last run, else the scenario, else a person.
fn tube_type(inputs: &Inputs, runs: &[FoundRun]) -> Result<String, Failure> {
    if let Some(reference) = inputs.station.1.reference(&inputs.serial) {
        return match &inputs.tube_type {
            Some(given) if *given != reference.tube_type => Err(Failure::unusable(format!(
                "`{}` is a reference tube of {}, of type `{}`; expected no other `--type`",
                reference.serial, inputs.station.1.station, reference.tube_type
            ))),
            _ => Ok(reference.tube_type.clone()),
        };
    }
    let of_answers = || inputs.answers.as_ref()?.tube_type.clone();
    let of_last = || runs.last().map(|run| run.opened.identity.tube_type.clone());
    let of_scenario = || Some(inputs.scenario.as_ref()?.tube(&inputs.serial)?.tube_type.clone());
    let asked = || inputs.ask.then(|| bench::terminal(&inputs.screen).ask_line("Tube type")).flatten();
    let given = inputs.tube_type.clone().or_else(of_answers).or_else(of_last).or_else(of_scenario).or_else(asked);
    given.ok_or_else(|| unknown_type(inputs, None))
}

fn unknown_type(inputs: &Inputs, found: Option<&str>) -> Failure {
    let types = match inputs.home.types() {
        Ok(types) => types,
        Err(error) => return Failure::unusable(error.to_string()),
    };
    let known = types.join(", ");
    Failure::unusable(match found {
        None => format!("the type of `{}` is not known; give it with `--type`, one of {known}", inputs.serial),
        Some(found) => {
            let near = nearest(found, types.iter().map(String::as_str));
            let near = near.map_or_else(String::new, |word| format!("\n  nearest known type: {word}"));
            format!("unknown tube type `{found}`; expected one of {known}{near}")
        }
    })
}

/// Refuses a file that was changed without raising its revision, as far as this serial's runs can tell.
fn same_revision_same_text(tube_type: &str, texts: &TypeTexts, plan: &Plan, runs: &[FoundRun]) -> Result<(), Failure> {
    for run in runs.iter().filter(|run| run.opened.identity.tube_type == tube_type) {
        let id = &run.opened.identity.run_id;
        let limits = Limits::parse("limits.toml", &run.opened.limits).map(|limits| limits.revision);
        let recipe = Recipe::parse("recipe.toml", &run.opened.recipe).map(|recipe| recipe.revision);
        let changed = [
            (&texts.limits_name, limits == Ok(plan.limits.revision) && run.opened.limits != texts.limits),
            (&texts.recipe_name, recipe == Ok(plan.recipe.revision) && run.opened.recipe != texts.recipe),
        ];
        if let Some((name, _)) = changed.iter().find(|(_, changed)| *changed) {
            return Err(Failure::unusable(format!(
                "`{name}` is not what run {id} used, yet has the same revision: raise `revision`"
            )));
        }
    }
    Ok(())
}
