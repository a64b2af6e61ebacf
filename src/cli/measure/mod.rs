//! `tubewright measure`: captured sweeps in, one result each out; no record.
//! Must not judge.
//! Main function: [`run`].

mod print;
mod siblings;

use std::path::{Path, PathBuf};
use std::time::Instant;

use clap::{Args, ValueEnum};
use rayon::prelude::*;
use siblings::Siblings;

use super::{Ending, Failure, output};
use crate::capture::{Capture, Columns, Place, pair_names, read_many};
use crate::quantity::{Dimension, parse_as};
use crate::sweep::{Measurement, Settings, measure};

/// Source id of the free spectral range in a budget that no certificate stands behind.
const GIVEN_FSR: &str = "--fsr";

/// How results are printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// Short lines for people
    Text,
    /// One JSON object a line
    Json,
}

/// Arguments as given.
#[derive(Debug, Args)]
pub struct Arguments {
    /// Captures: files of a digitizer; names like …CH1, …CH2 are one capture
    #[arg(required = true, value_name = "CAPTURE")]
    captures: Vec<PathBuf>,
    /// Free spectral range of the interferometer, such as 8GHz
    #[arg(long, value_name = "FREQUENCY", value_parser = positive_frequency)]
    fsr: f64,
    /// Its standard uncertainty, such as 0.5%
    #[arg(long, value_name = "SHARE", value_parser = uncertain_share)]
    fsr_u: Option<f64>,
    /// Mode spacing of the type, such as 400MHz: settles assignments that fit equally well, never the value
    #[arg(long, value_name = "FREQUENCY", value_parser = positive_frequency)]
    nominal_spacing: Option<f64>,
    /// Which column is which, from 1: time=1,ramp=2,photodiode=3,crossed=4; FILE:N for a file of its own
    #[arg(long, value_name = "COLUMNS", value_parser = columns)]
    columns: Option<Columns>,
    /// A mode counts if its area is above this share of the strongest
    #[arg(long, value_name = "SHARE", default_value = "2%", value_parser = share)]
    mode_floor: f64,
    /// How to print
    #[arg(long, value_enum, default_value = "text")]
    format: Format,
}

fn positive_frequency(text: &str) -> Result<f64, String> {
    match parse_as(text, Dimension::Frequency) {
        Ok(value) if value > 0.0 => Ok(value),
        Ok(_) => Err("expected a frequency above zero".to_owned()),
        Err(error) => Err(error.to_string()),
    }
}

fn share(text: &str) -> Result<f64, String> {
    match parse_as(text, Dimension::Ratio) {
        Ok(value) if (0.0..1.0).contains(&value) => Ok(value),
        Ok(_) => Err("expected a share from 0 % to below 100 %".to_owned()),
        Err(error) => Err(error.to_string()),
    }
}

/// A relative uncertainty; one beyond a fifth is a forgotten `%`.
fn uncertain_share(text: &str) -> Result<f64, String> {
    match share(text)? {
        value if value <= 0.2 => Ok(value),
        value => Err(format!(
            "{} % is no uncertainty of a free spectral range; expected at most 20 %, with its sign: `0.3 %`",
            value * 100.0
        )),
    }
}

fn columns(text: &str) -> Result<Columns, String> {
    text.parse().map_err(|error: crate::capture::CaptureError| error.to_string())
}

/// One capture's result.
struct Outcome {
    /// Name of its first file as given.
    capture: String,
    /// Why nothing was measured, or no spacing.
    refused: Option<String>,
    measurement: Option<Measurement>,
    warnings: Vec<String>,
    computed_in_s: f64,
}

/// Measures every capture, in parallel, and prints the results in the order of the arguments.
pub fn run(arguments: &Arguments) -> Result<Ending, Failure> {
    let settings = Settings {
        free_spectral_range: arguments.fsr,
        u_free_spectral_range: arguments.fsr_u.unwrap_or(0.0),
        nominal_spacing: arguments.nominal_spacing,
        mode_floor: arguments.mode_floor,
        fsr_source_id: GIVEN_FSR.to_owned(),
    };
    let outcomes: Vec<Outcome> =
        groups_of(arguments).par_iter().map(|files| outcome_of(files, arguments.columns.as_ref(), &settings)).collect();
    let mut ending = Ending::Accepted;
    for outcome in &outcomes {
        output::result(&match arguments.format {
            Format::Json => print::json(outcome)?,
            Format::Text => print::text(outcome),
        })?;
        if outcome.refused.is_some() {
            ending = ending.worse(Ending::Unusable);
        }
    }
    Ok(ending)
}

/// The files of each capture: pairs by name, and files that `--columns` names beside.
fn groups_of(arguments: &Arguments) -> Vec<Vec<PathBuf>> {
    let named = named_files(arguments.columns.as_ref());
    let is_named =
        |path: &Path| named.iter().any(|name| Path::new(name) == path || path.file_name() == Some(name.as_ref()));
    // A file that holds a channel of another capture is no capture itself, unless nothing else is.
    let (beside, own): (Vec<PathBuf>, Vec<PathBuf>) =
        arguments.captures.iter().cloned().partition(|path| is_named(path));
    if own.is_empty() {
        // Every file given holds a named channel: together they are one capture.
        return vec![beside];
    }
    let names: Vec<String> = own.iter().map(|path| path.to_string_lossy().into_owned()).collect();
    let groups = pair_names(&names).into_iter().map(|group| {
        let mut files: Vec<PathBuf> = group.into_iter().map(|index| own[index].clone()).collect();
        for name in &named {
            let known = |path: &PathBuf| path.file_name() == Path::new(name).file_name();
            if !files.iter().any(known) {
                files.extend(find_beside(name, &files, &beside));
            }
        }
        files
    });
    groups.collect()
}

/// The file meant by a name in `--columns`: one of the arguments, one at that path, or one beside the capture.
fn find_beside(name: &str, files: &[PathBuf], arguments: &[PathBuf]) -> Option<PathBuf> {
    let given = arguments.iter().find(|path| path.file_name() == Path::new(name).file_name()).cloned();
    let at_path = || Some(PathBuf::from(name)).filter(|path| path.is_file());
    let beside = || Some(files.first()?.with_file_name(name)).filter(|path| path.is_file());
    given.or_else(at_path).or_else(beside)
}

fn named_files(columns: Option<&Columns>) -> Vec<String> {
    let Some(columns) = columns else { return Vec::new() };
    let places = [columns.time.as_ref(), columns.ramp.as_ref(), Some(&columns.photodiode), columns.crossed.as_ref()];
    let mut names = Vec::new();
    for name in places.into_iter().flatten().filter_map(|place: &Place| place.file.clone()) {
        if !names.contains(&name) {
            names.push(name);
        }
    }
    names
}

fn outcome_of(files: &[PathBuf], columns: Option<&Columns>, settings: &Settings) -> Outcome {
    let began = Instant::now();
    let mut outcome = Outcome {
        capture: files.first().map_or_else(String::new, |path| path.to_string_lossy().into_owned()),
        refused: None,
        measurement: None,
        warnings: Vec::new(),
        computed_in_s: 0.0,
    };
    let (read, siblings) = read_with_siblings(files, columns);
    match read {
        Ok(capture) => {
            let measurement = measure(&capture, settings);
            let refusal = measurement.refused.as_ref().or(measurement.no_spacing.as_ref());
            outcome.refused = refusal.map(ToString::to_string);
            outcome.warnings = capture.remarks.iter().map(ToString::to_string).collect();
            outcome.warnings.extend(measurement.warnings.iter().map(ToString::to_string));
            outcome.measurement = Some(measurement);
        }
        Err(why) => outcome.refused = Some(why),
    }
    let lacks_ramp = outcome.measurement.as_ref().is_none_or(|m| m.ramp_ends.is_none());
    match siblings {
        Siblings::Found(joined) => {
            let names: Vec<String> = joined.iter().map(|path| path.display().to_string()).collect();
            outcome.warnings.push(format!("joined with {}, which lies beside it", names.join(", ")));
        }
        Siblings::Missing if lacks_ramp => outcome.warnings.push(siblings::MISSING.to_owned()),
        Siblings::Missing | Siblings::NotSought => {}
    }
    outcome.computed_in_s = began.elapsed().as_secs_f64();
    outcome
}

/// Reads a capture; one channel's file alone together with those of the other channels beside it, if they fit.
fn read_with_siblings(files: &[PathBuf], columns: Option<&Columns>) -> (Result<Capture, String>, Siblings) {
    // Whoever names columns says what belongs together.
    if columns.is_none()
        && let Siblings::Found(more) = siblings::beside(files)
    {
        let all: Vec<PathBuf> = files.iter().chain(&more).cloned().collect();
        return match read(&all, None) {
            Ok(capture) => (Ok(capture), Siblings::Found(more)),
            Err(_) => (read(files, None), Siblings::NotSought),
        };
    }
    (read(files, columns), siblings::beside(files))
}

fn read(files: &[PathBuf], columns: Option<&Columns>) -> Result<Capture, String> {
    let mut contents = Vec::with_capacity(files.len());
    for path in files {
        if path.is_dir() {
            return Err(format!("`{0}` is a folder; name the files in it, such as `{0}/*.csv`", path.display()));
        }
        let bytes = std::fs::read(path)
            .map_err(|error| format!("cannot read `{}`: {}", path.display(), crate::disk::said(&error)))?;
        contents.push((path.to_string_lossy().into_owned(), bytes));
    }
    let borrowed: Vec<(&str, &[u8])> = contents.iter().map(|(name, bytes)| (name.as_str(), bytes.as_slice())).collect();
    read_many(&borrowed, columns).map_err(|error| error.to_string())
}
