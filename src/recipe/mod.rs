//! The recipe file of a tube type: the steps of its inspection with their keys.
//! Must not measure, ask or wait: `run/steps` does a step's work. Each kind's keys are a file of their own here.
//! Main types: [`Recipe`], [`Step`], [`StepKind`].

mod comb;
mod dwell;
mod look;
mod noise;
mod parse;
mod polarizer;
mod power;
mod strike;
mod supply;
mod sweep;
mod watch;

pub use comb::Comb;
pub use dwell::Dwell;
pub use look::Look;
pub use noise::Noise;
pub use polarizer::{Polarization, Polarizer};
pub use power::Power;
pub use strike::Strike;
pub use supply::Supply;
pub use sweep::Sweep;
pub use watch::Watch;

use crate::limits::{Fault, Fillable};

/// A recipe file.
#[derive(Debug, Clone, PartialEq)]
pub struct Recipe {
    /// `revision =`, from 1.
    pub revision: u64,
    /// SHA-256 of the text, hexadecimal.
    pub sha256: String,
    /// Mode spacing of a sound tube of the type, Hz.
    pub nominal_spacing: f64,
    /// Vacuum wavelength, m.
    pub wavelength: f64,
    /// Least peak area of a mode, as a share of the strongest in the same capture.
    pub mode_floor: f64,
    /// How often a step may be repeated for an assigned cause.
    pub retests: u32,
    /// The steps, in the order they are done.
    pub steps: Vec<Step>,
}

/// A step.
#[derive(Debug, Clone, PartialEq)]
pub struct Step {
    /// Its name; no other step has it.
    pub name: String,
    /// What is done.
    pub kind: StepKind,
}

/// What a step does, with its keys.
#[derive(Debug, Clone, PartialEq)]
pub enum StepKind {
    /// Cold start.
    Strike(Strike),
    /// Warm-up, watched by captures.
    Dwell(Dwell),
    /// Captures at rest.
    Sweep(Sweep),
    /// Mode comb over a walk cycle.
    Comb(Comb),
    /// Polarization axes and extinction.
    Polarizer(Polarizer),
    /// Hops and swaps.
    Watch(Watch),
    /// Output power.
    Power(Power),
    /// Noise of the light.
    Noise(Noise),
    /// Discharge and supply.
    Supply(Supply),
    /// A look by eye.
    Look(Look),
}

impl Recipe {
    /// Reads a recipe file.
    ///
    /// * `name`: name of the file, for the faults.
    ///
    /// Errors: every fault, in the order of the file.
    pub fn parse(name: &str, text: &str) -> Result<Self, Vec<Fault>> {
        parse::recipe(name, text)
    }

    /// The step with a name.
    pub fn step(&self, name: &str) -> Option<&Step> {
        self.steps.iter().find(|step| step.name == name)
    }

    /// Every measurand that the recipe fills, for [`crate::limits::Limits::parse_for`].
    pub fn fillable(&self) -> Vec<Fillable> {
        let of_step = |step: &Step| {
            let choices = match &step.kind {
                StepKind::Look(look) => look.choices.clone(),
                _ => Vec::new(),
            };
            let fillable = move |measurand| Fillable { measurand, choices: choices.clone() };
            step.kind.fills(&step.name).into_iter().map(fillable).collect::<Vec<_>>()
        };
        self.steps.iter().flat_map(of_step).collect()
    }
}

impl StepKind {
    /// The word after `do =`.
    pub fn word(&self) -> &'static str {
        match self {
            Self::Strike(_) => "strike",
            Self::Dwell(_) => "dwell",
            Self::Sweep(_) => "sweep",
            Self::Comb(_) => "comb",
            Self::Polarizer(_) => "polarizer",
            Self::Watch(_) => "watch",
            Self::Power(_) => "power",
            Self::Noise(_) => "noise",
            Self::Supply(_) => "supply",
            Self::Look(_) => "look",
        }
    }

    /// Keys of the measurands (or `visual.<step>`) whose rows this step fills.
    ///
    /// * `step`: name of the step.
    pub fn fills(&self, step: &str) -> Vec<String> {
        let keys = match self {
            Self::Strike(_) => Strike::FILLS,
            Self::Dwell(_) => Dwell::FILLS,
            Self::Sweep(_) => Sweep::FILLS,
            Self::Comb(_) => Comb::FILLS,
            Self::Polarizer(polarizer) => polarizer.fills(),
            Self::Watch(_) => Watch::FILLS,
            Self::Power(_) => Power::FILLS,
            Self::Noise(_) => Noise::FILLS,
            Self::Supply(supply) => supply.fills(),
            Self::Look(_) => return vec![format!("visual.{step}")],
        };
        keys.iter().map(|key| (*key).to_owned()).collect()
    }
}
