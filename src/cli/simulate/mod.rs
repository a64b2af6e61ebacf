//! `tubewright simulate`: writes captures of a simulated tube, and beside them what is true of it.
//! Must not measure anything, nor write over a file.
//! Main types: [`SimulateArgs`], [`SimulateError`].

mod truth;

use std::{
    fs::{self, OpenOptions},
    io::{self, Write},
    path::{Path, PathBuf},
};

use chrono::{DateTime, FixedOffset, TimeDelta};
use clap::Args;
use truth::{shot, truth_json};

use crate::{
    instruments::{CaptureHead, simulated_capture_name, simulated_csv},
    phantom::{BenchTruth, FAULT_KINDS, Fault, FaultKind, Incident, Scenario, Setting, TubeTruth, World},
    quantity::{Dimension, parse_as},
};

/// Average of the power reading in a capture's head, ms.
const HEAD_AVERAGE_MS: u32 = 100;
/// Name of the file with the truth.
const TRUTH: &str = "truth.json";

/// Write captures of a simulated tube, sound or not, and the truth about it.
#[derive(Debug, Clone, Args)]
pub struct SimulateArgs {
    /// Folder to write to; made if it is not there. Nothing in it is written over.
    pub folder: PathBuf,
    /// Tube type of the demo scenario.
    #[arg(long = "type", value_name = "TYPE", default_value = "quad-375")]
    pub tube_type: String,
    /// How many captures.
    #[arg(long, default_value_t = 20, value_parser = clap::value_parser!(u32).range(1..))]
    pub captures: u32,
    /// Time between captures.
    #[arg(long, default_value = "500 ms", value_parser = time)]
    pub every: f64,
    /// Time of the first capture after first light.
    #[arg(long, default_value = "0 s", value_parser = time)]
    pub after: f64,
    /// Samples of each capture.
    #[arg(long, default_value_t = 2000, value_parser = clap::value_parser!(u32).range(100..=10_000_000))]
    pub samples: u32,
    /// Seed of everything random.
    #[arg(long, default_value_t = 1)]
    pub seed: u64,
    /// Wall time of first light, RFC 3339.
    #[arg(long, default_value = "2026-03-02T08:00:00Z", value_parser = DateTime::parse_from_rfc3339)]
    pub start: DateTime<FixedOffset>,
    /// Distance of the mirrors.
    #[arg(long, value_parser = length)]
    pub length: Option<f64>,
    /// Output when warm.
    #[arg(long, value_parser = power)]
    pub power: Option<f64>,
    /// Peak gain over loss.
    #[arg(long, value_parser = ratio)]
    pub gain_ratio: Option<f64>,
    /// Time constant of the warm-up.
    #[arg(long, value_parser = time)]
    pub tau: Option<f64>,
    /// Mode spacings walked from cold to rest.
    #[arg(long, value_parser = ratio)]
    pub cycles: Option<f64>,
    /// Height of a transverse mode over its axial mode's.
    #[arg(long, value_parser = ratio)]
    pub off_axis: Option<f64>,
    /// A fault of tube or supply and how much of it, such as `helium-lost=45%`. May be given again.
    #[arg(long, value_name = "KIND=AMOUNT", long_help = fault_help())]
    pub fault: Vec<Fault>,
    /// Free spectral range of the interferometer.
    #[arg(long, value_parser = frequency)]
    pub fsr: Option<f64>,
    /// Finesse of the interferometer.
    #[arg(long, value_parser = ratio)]
    pub finesse: Option<f64>,
    /// Noise over the highest peak.
    #[arg(long, value_parser = ratio)]
    pub noise: Option<f64>,
    /// Change of the piezo's slope over a ramp.
    #[arg(long, value_parser = ratio)]
    pub curvature: Option<f64>,
    /// Orders a ramp.
    #[arg(long, value_parser = ratio)]
    pub orders: Option<f64>,
    /// Share of the ramp's period in which it rises: 50 % is a triangle.
    #[arg(long, value_parser = ratio)]
    pub rising: Option<f64>,
    /// Bits of the digitizer.
    #[arg(long, value_parser = clap::value_parser!(u32).range(1..=32))]
    pub bits: Option<u32>,
    /// Time constant of the detector.
    #[arg(long, value_parser = time)]
    pub detector_pole: Option<f64>,
    /// The comb hops: time after first light and size, `90s=60MHz`. May be given again.
    #[arg(long, value_name = "T=MHZ", value_parser = hop)]
    pub hop: Vec<Incident>,
    /// The families exchange axes at this time. May be given again.
    #[arg(long, value_parser = time)]
    pub swap: Vec<f64>,
    /// The alignment is knocked for a second at this time. May be given again.
    #[arg(long, value_parser = time)]
    pub knock: Vec<f64>,
    /// The capture at or next after this time is lost. May be given again.
    #[arg(long, value_parser = time)]
    pub lose: Vec<f64>,
}

/// Why nothing, or not all, was written.
#[derive(Debug, thiserror::Error)]
pub enum SimulateError {
    /// Not a type of the demo scenario.
    #[error("`{given}` is not a type of the demo scenario; expected one of {known}")]
    UnknownType {
        /// What was given.
        given: String,
        /// What there is.
        known: String,
    },
    /// A number that no tube or bench can have.
    #[error("`--{option}` is {given} in SI units; expected {expected}")]
    Impossible {
        /// The option.
        option: &'static str,
        /// What was given.
        given: f64,
        /// What would do.
        expected: &'static str,
    },
    /// A file is there already.
    #[error("{0}: there is a file of that name; nothing is written over, so name another folder")]
    InTheWay(PathBuf),
    /// The disk.
    #[error("{path}: {source}")]
    Disk {
        /// Where.
        path: PathBuf,
        /// What the system said.
        source: io::Error,
    },
}

/// What was written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Simulated {
    /// Captures written.
    pub written: u32,
    /// Captures lost on purpose.
    pub lost: u32,
}

/// Writes the captures and the truth.
///
/// # Errors
/// An unknown type, a number out of range, a file in the way, the disk.
pub fn run(args: &SimulateArgs) -> Result<Simulated, SimulateError> {
    let (tube, bench) = truths(args)?;
    let world = World::new(&tube, &bench, args.seed);
    let folder = &args.folder;
    fs::create_dir_all(folder).map_err(|source| SimulateError::Disk { path: folder.clone(), source })?;
    let name = |k: u32| simulated_capture_name(u64::from(k));
    // Before the first byte, so that a refusal leaves the folder as it was.
    let names = (0..args.captures).map(name).chain([TRUTH.to_owned()]);
    if let Some(path) = names.map(|name| folder.join(name)).find(|path| path.exists()) {
        return Err(SimulateError::InTheWay(path));
    }
    let mut shots = Vec::new();
    let setting = Setting { lit: true, ..Setting::default() };
    for k in 0..args.captures {
        let at_ms = ((args.after + f64::from(k) * args.every) * 1e3).round() as i64;
        let trace = world.capture(at_ms, args.samples as usize, setting);
        shots.push(shot(&world, &name(k), at_ms, trace.is_none()));
        let Some(trace) = trace else { continue };
        let head = CaptureHead {
            captured_at: args.start.checked_add_signed(TimeDelta::milliseconds(at_ms)).unwrap_or(args.start),
            number: u64::from(k),
            polarizer: None,
            power: world.power(at_ms, HEAD_AVERAGE_MS, setting),
            run_current: world.run_current(at_ms, setting),
        };
        write_new(&folder.join(name(k)), &simulated_csv(&trace, &head))?;
    }
    let lost = shots.iter().filter(|shot| shot.lost).count() as u32;
    write_new(&folder.join(TRUTH), &truth_json(args, &world, shots))?;
    Ok(Simulated { written: args.captures - lost, lost })
}

/// The tube and the bench that the options describe.
fn truths(args: &SimulateArgs) -> Result<(TubeTruth, BenchTruth), SimulateError> {
    let scenario = Scenario::demo();
    let Some(mut tube) = scenario.types.get(&args.tube_type).cloned() else {
        let known = scenario.types.keys().map(String::as_str).collect::<Vec<_>>().join(", ");
        return Err(SimulateError::UnknownType { given: args.tube_type.clone(), known });
    };
    let mut bench = scenario.benches.get("bench-1").cloned().unwrap_or_default();
    const ABOVE_ZERO: &str = "a number above 0";
    set("length", args.length, &mut tube.mirror_spacing, |v| (0.02..=2.0).contains(&v), "0.02 to 2 m")?;
    set("power", args.power, &mut tube.power, |v| v >= 0.0, "0 or more")?;
    set("gain-ratio", args.gain_ratio, &mut tube.gain_ratio, |v| (0.0..=20.0).contains(&v), "0 to 20")?;
    set("tau", args.tau, &mut tube.warmup_tau, |v| v > 0.0, ABOVE_ZERO)?;
    set("cycles", args.cycles, &mut tube.walk_cycles, |v| v.abs() <= 1e4, "-10000 to 10000")?;
    set("off-axis", args.off_axis, &mut tube.off_axis_share, |v| (0.0..=1.0).contains(&v), "0 to 100 %")?;
    set("fsr", args.fsr, &mut bench.free_spectral_range, |v| v > 0.0, ABOVE_ZERO)?;
    set("finesse", args.finesse, &mut bench.finesse, |v| v >= 2.0, "2 or more")?;
    set("noise", args.noise, &mut bench.noise, |v| (0.0..=1.0).contains(&v), "0 to 100 %")?;
    set("curvature", args.curvature, &mut bench.ramp_curvature, |v| (-0.5..=2.0).contains(&v), "-50 to 200 %")?;
    set("orders", args.orders, &mut bench.orders, |v| v > 0.0 && v <= 50.0, "above 0, at most 50")?;
    set("rising", args.rising, &mut bench.rising_share, |v| (0.01..=0.99).contains(&v), "1 to 99 %")?;
    set("detector-pole", args.detector_pole, &mut bench.detector_time, |v| v >= 0.0, "0 or more")?;
    for (option, value) in [("every", args.every), ("after", args.after)] {
        // A thousand days: times stay whole milliseconds.
        set(option, Some(value), &mut 0.0, |v| (0.0..=8.64e7).contains(&v), "0 to 8.64e7 s")?;
    }
    bench.bits = args.bits.unwrap_or(bench.bits);
    args.fault.iter().for_each(|fault| fault.befall(&mut tube));
    tube.incidents.extend(args.hop.iter().copied());
    tube.incidents.extend(args.swap.iter().map(|&at| Incident::Swap { at }));
    tube.incidents.extend(args.knock.iter().map(|&at| Incident::Knock { at, to: 0.5, lasts: 1.0 }));
    // As long as the distance of captures, so that exactly one falls into it.
    tube.incidents.extend(args.lose.iter().map(|&at| Incident::Lost { at, lasts: args.every }));
    Ok((tube, bench))
}

fn set(
    option: &'static str,
    given: Option<f64>,
    into: &mut f64,
    possible: impl Fn(f64) -> bool,
    expected: &'static str,
) -> Result<(), SimulateError> {
    match given {
        Some(given) if possible(given) => *into = given,
        Some(given) => return Err(SimulateError::Impossible { option, given, expected }),
        None => {}
    }
    Ok(())
}

fn write_new(path: &Path, bytes: &[u8]) -> Result<(), SimulateError> {
    let written = OpenOptions::new().write(true).create_new(true).open(path).and_then(|mut file| file.write_all(bytes));
    written.map_err(|source| match source.kind() {
        io::ErrorKind::AlreadyExists => SimulateError::InTheWay(path.to_owned()),
        _ => SimulateError::Disk { path: path.to_owned(), source },
    })
}

fn quantity(text: &str, dimension: Dimension) -> Result<f64, String> {
    parse_as(text, dimension).map_err(|error| error.to_string())
}

fn time(text: &str) -> Result<f64, String> {
    quantity(text, Dimension::Time)
}

fn length(text: &str) -> Result<f64, String> {
    quantity(text, Dimension::Length)
}

fn power(text: &str) -> Result<f64, String> {
    quantity(text, Dimension::Power)
}

fn frequency(text: &str) -> Result<f64, String> {
    quantity(text, Dimension::Frequency)
}

fn ratio(text: &str) -> Result<f64, String> {
    quantity(text, Dimension::Ratio)
}

/// What `--fault` takes, from the table of kinds.
fn fault_help() -> String {
    let head = "A fault of tube or supply and how much of it, such as `helium-lost=45%`. May be given again; changes what \
                the other options say. Kinds:\n";
    let line = |kind: &FaultKind| format!("\n  {:<16} {:<14} {}", kind.word, kind.range, kind.about);
    head.to_owned() + &FAULT_KINDS.iter().map(line).collect::<String>()
}

fn hop(text: &str) -> Result<Incident, String> {
    let (at, size) = text.split_once('=').ok_or("expected a time and a size such as `90s=60MHz`")?;
    Ok(Incident::Hop { at: time(at)?, size: frequency(size)? })
}

#[cfg(test)]
mod tests;
