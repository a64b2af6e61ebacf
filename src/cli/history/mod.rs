//! `tubewright history SERIAL`: every run of a tube beside the others, and what was done to it meanwhile.
//! Must not measure, judge or store anything but what `--add` notes.
//! Main function: [`run`].

mod add;
mod changes;
mod gather;
mod lines;
mod table;

use std::path::PathBuf;

use clap::{Args, ValueEnum};

use self::gather::Past;
use super::{Ending, Failure, inspect::serial, output};
use crate::disk::Store;

/// How it is printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Format {
    /// A table for people
    Text,
    /// One JSON object a line: runs, what was noted, changes, what was left out
    Json,
    /// One line a value
    Csv,
}

/// Arguments as given.
#[derive(Debug, Args)]
pub struct Arguments {
    /// Serial number of the tube, as scanned
    #[arg(value_name = "SERIAL")]
    serial: String,
    /// Note something that happened to the tube: rework, return or sold
    #[arg(long, value_name = "KIND", requires_all = ["date", "note"])]
    add: Option<String>,
    /// The day on which it happened, YYYY-MM-DD
    #[arg(long, value_name = "DATE", requires = "add")]
    date: Option<String>,
    /// What was done, in words
    #[arg(long, value_name = "WORDS", requires = "add")]
    note: Option<String>,
    /// Folder that holds limits/ and reports/ (else TUBEWRIGHT_HOME, else the nearest parent with limits/)
    #[arg(long, value_name = "DIR")]
    home: Option<PathBuf>,
    /// Folder of records
    #[arg(long, value_name = "DIR")]
    reports: Option<PathBuf>,
    /// How to print
    #[arg(long, value_enum, default_value = "text", conflicts_with = "add")]
    format: Format,
}

/// Shows the past of a tube, or adds to it.
///
/// What cannot be read is named and left out; if something stored was changed since, the status says so.
pub fn run(arguments: Arguments) -> Result<Ending, Failure> {
    serial::check(&arguments.serial)?;
    let serial = arguments.serial.trim();
    let home = super::home::find(arguments.home.clone(), arguments.reports.clone())?;
    let store = Store::new(home.reports());
    if let Some(kind) = &arguments.add {
        return add::add(&arguments, &store, serial, kind);
    }
    let past = Past::of(&store, serial)?;
    if past.columns.is_empty() && past.left_out.is_empty() {
        let reports = store.reports().display();
        return Err(Failure::unusable(format!(
            "`{serial}` has no run in `{reports}`: scan it again, or name `--reports`"
        )));
    }
    let text = match arguments.format {
        Format::Text => table::text(serial, &past),
        Format::Json => lines::json(&past),
        Format::Csv => lines::csv(&past)?,
    };
    output::result(text.trim_end())?;
    for why in &past.left_out {
        output::talk(&format!("left out: {why}"));
    }
    Ok(if past.changed { Ending::Proof } else { Ending::Accepted })
}
