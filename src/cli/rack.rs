//! `tubewright rack`: which tubes burn in the rack since when, so that `inspect` need not be told.
//! Must not say that a tube is warm: its dwell does.
//! Main function: [`run`].

use std::path::{Path, PathBuf};

use chrono::{SecondsFormat, Utc};
use clap::{Args, Subcommand};

use super::{
    Ending, Failure, home,
    inspect::{check_serial, demo_station, faulty, lit_since, read_text},
    output,
};
use crate::disk::Rack;
use crate::station::file::StationFile;

/// Arguments as given.
#[derive(Debug, Args)]
pub struct Arguments {
    #[command(subcommand)]
    action: Action,
    /// Folder that holds limits/ and reports/ (else TUBEWRIGHT_HOME, else the nearest parent with limits/)
    #[arg(long, value_name = "DIR", global = true)]
    home: Option<PathBuf>,
    /// Folder of records
    #[arg(long, value_name = "DIR", global = true)]
    reports: Option<PathBuf>,
}

#[derive(Debug, Subcommand)]
enum Action {
    /// Note that tubes were lit in the rack
    Add {
        /// Serial numbers, as scanned
        #[arg(value_name = "SERIAL", required = true)]
        serials: Vec<String>,
        /// Since when they burn: a time of today (07:40), RFC 3339, or an age ("40 min"); else now
        #[arg(long, value_name = "TIME")]
        at: Option<String>,
        /// Station file, for its time zone; without it the simulated demo bench's
        #[arg(long, value_name = "FILE")]
        station: Option<PathBuf>,
    },
    /// Show the tubes in the rack
    List,
    /// Note that tubes were taken out or went dark
    Take {
        /// Serial numbers, as scanned
        #[arg(value_name = "SERIAL", required = true)]
        serials: Vec<String>,
    },
}

/// Puts in, shows or takes out.
pub fn run(arguments: Arguments) -> Result<Ending, Failure> {
    let home = home::find(arguments.home, arguments.reports)?;
    let mut rack = Rack::read(home.reports()).map_err(|error| Failure::store(&error))?;
    match arguments.action {
        Action::Add { serials, at, station } => {
            let since = since(at.as_deref(), station.as_deref())?;
            let put =
                serials.iter().map(|serial| check_serial(serial).map(|()| (serial.trim().to_owned(), since.clone())));
            let put = put.collect::<Result<Vec<_>, _>>()?;
            rack.change(&put, &[]).map_err(|error| Failure::store(&error))?;
        }
        Action::List => {}
        Action::Take { serials } => {
            let take: Vec<String> = serials.iter().map(|serial| serial.trim().to_owned()).collect();
            if let Some(missing) = take.iter().find(|serial| rack.since(serial).is_none()) {
                let there: Vec<&str> = rack.tubes().map(|(serial, _)| serial).collect();
                let there = if there.is_empty() { "nothing".to_owned() } else { there.join(", ") };
                return Err(Failure::unusable(format!("`{missing}` is not in the rack; it holds {there}")));
            }
            rack.change(&[], &take).map_err(|error| Failure::store(&error))?;
        }
    }
    for (serial, since) in rack.tubes() {
        output::result(&format!("{serial}  burning since {since}"))?;
    }
    Ok(Ending::Accepted)
}

fn since(at: Option<&str>, station: Option<&Path>) -> Result<String, Failure> {
    let now = Utc::now();
    let Some(text) = at else { return Ok(now.to_rfc3339_opts(SecondsFormat::Secs, false)) };
    let (name, station) = match station {
        Some(path) => (path.display().to_string(), read_text(path)?),
        None => demo_station(None, "")?,
    };
    let zone = StationFile::parse(&name, &station).map_err(|faults| faulty("station file", &faults))?.time_zone;
    let now = now.with_timezone(&zone).fixed_offset();
    Ok(lit_since("--at", text, ("now", now), zone)?.to_rfc3339_opts(SecondsFormat::Secs, false))
}
