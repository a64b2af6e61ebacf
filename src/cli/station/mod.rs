//! `tubewright station`: a bench with its certificates, its reference tubes and their chart, and whether it gives verdicts.
//! Must not change anything; a chart is written only where it is asked for.
//! Main function: [`run`].

mod plot;
mod print;

use std::path::PathBuf;

use chrono::{DateTime, FixedOffset, Utc};
use clap::{Args, ValueEnum};
use sha2::{Digest as _, Sha256};

use super::{
    Ending, Failure,
    checks::{checks_of, is_at},
    home, inspect,
};
use crate::{
    disk::{FoundRun, Store, write_atomic},
    gauge::reference::{ALARM, Target, chart},
    measurand,
    phantom::Scenario,
    phrase::{Language, Saying, figure, minute, page, said},
    record::reference::ReferenceCheck,
    report::{BenchChart, BenchPoint, BenchTitle, bench_csv, bench_pdf},
    station::{
        file::{Reference, StationFile},
        shift::{Shift, shift_at},
        standing::{Standing, counted, holds, out_of_bounds, standings, targets, unclosed},
    },
};

/// How results are printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Format {
    /// Lines for people
    Text,
    /// One JSON object a line
    Json,
}

/// Arguments as given.
#[derive(Debug, Args)]
pub struct Arguments {
    /// Station file; without it the bench of the demo
    #[arg(long, value_name = "FILE")]
    station: Option<PathBuf>,
    /// Scenario of the simulated bench
    #[arg(long, value_name = "FILE")]
    scenario: Option<PathBuf>,
    /// Folder that holds limits/ and reports/ (else TUBEWRIGHT_HOME, else the nearest parent with limits/)
    #[arg(long, value_name = "DIR")]
    home: Option<PathBuf>,
    /// Folder of records
    #[arg(long, value_name = "DIR")]
    reports: Option<PathBuf>,
    /// Look at the bench as it stood then (RFC 3339); else now, which on the demo bench is the scenario's day
    #[arg(long, value_name = "TIME")]
    at: Option<DateTime<FixedOffset>>,
    /// Write the chart of the reference tubes
    #[arg(long, value_name = "FILE.pdf")]
    chart: Option<PathBuf>,
    /// How to print
    #[arg(long, value_enum, default_value = "text")]
    format: Format,
}

/// A bench as it stands.
struct Bench {
    station: StationFile,
    simulated: bool,
    at: DateTime<FixedOffset>,
    shift: Option<Shift>,
    checks: Vec<ReferenceCheck>,
    holds: Vec<Saying>,
    unclosed: Vec<String>,
    /// Product runs since the last check that passed, of whichever tube passed longest ago.
    since: Vec<FoundRun>,
}

impl Bench {
    fn standings(&self) -> Vec<(&Reference, Standing)> {
        standings(&self.station, self.at, &self.checks)
    }

    /// (what it should read, chart) of each measurand of a reference tube.
    fn charts(&self, tube: &Reference) -> Vec<(Target, BenchChart)> {
        targets(tube).into_iter().filter_map(|target| Some((target.clone(), self.chart(tube, &target)?))).collect()
    }

    fn chart(&self, tube: &Reference, target: &Target) -> Option<BenchChart> {
        let measurand = measurand::find(&target.measurand)?;
        let checks = counted(&self.station, tube, self.at, &self.checks);
        let read: Vec<_> =
            checks.iter().filter_map(|(at, check)| Some((at, check, check.value(&target.measurand)?.value))).collect();
        let (_, points) = chart(target, &read.iter().map(|(.., value)| *value).collect::<Vec<_>>());
        let point = |((at, check, value), point): (&(&DateTime<_>, &&ReferenceCheck, f64), _)| {
            let point: crate::gauge::reference::Point = point;
            BenchPoint {
                at: at.fixed_offset(),
                run_id: check.run_id.clone(),
                value: measurand.shown(*value),
                inside: point.inside,
                sums: point.sums,
            }
        };
        Some(BenchChart {
            serial: tube.serial.clone(),
            measurand: &measurand.name,
            unit: measurand.unit().symbol.to_owned(),
            decimals: measurand.decimals,
            value: measurand.shown(target.value),
            within: measurand.shown(target.within),
            alarm: ALARM,
            points: read.iter().zip(points).map(point).collect(),
        })
    }
}

/// Shows a bench.
pub fn run(arguments: &Arguments) -> Result<Ending, Failure> {
    let chart = arguments.chart.as_ref();
    if let Some(file) = chart.filter(|file| file.extension().is_none_or(|end| !end.eq_ignore_ascii_case("pdf"))) {
        return Err(Failure::unusable(format!(
            "`{}` is no name of a PDF; expected `--chart FILE.pdf`",
            file.display()
        )));
    }
    let bench = gather(arguments)?;
    match arguments.format {
        Format::Text => print::text(&bench)?,
        Format::Json => print::json(&bench)?,
    }
    if let Some(file) = chart {
        write_atomic(file, &pdf(&bench)?).map_err(|error| Failure::store(&error))?;
    }
    Ok(if bench.holds.is_empty() { Ending::Accepted } else { Ending::Hold })
}

fn gather(arguments: &Arguments) -> Result<Bench, Failure> {
    let home = home::find(arguments.home.clone(), arguments.reports.clone())?;
    let scenario = arguments.scenario.as_deref().map(inspect::read_scenario).transpose()?;
    let (name, text) = match &arguments.station {
        Some(path) => (path.display().to_string(), inspect::read_text(path)?),
        None => inspect::demo_station(scenario.as_ref(), "")?,
    };
    let station = StationFile::parse(&name, &text).map_err(|faults| inspect::faulty("station file", &faults))?;
    let simulated = inspect::is_simulated(&station, &name).unwrap_or(false);
    let store = Store::new(home.reports());
    let at = match arguments.at {
        Some(at) => at,
        None if simulated => bench_day(&store, &station, scenario)?,
        None => Utc::now().fixed_offset(),
    };
    let at = at.with_timezone(&station.time_zone).fixed_offset();
    let checks = checks_of(&store, &station, simulated, at)?;
    let since = runs_since(&store, &station, at, &checks)?;
    let shift = shift_at(&station.shifts, station.time_zone, at.with_timezone(&station.time_zone));
    let (holds, unclosed) = (holds(&station, at, Some(&checks)), unclosed(&station, at, &checks));
    Ok(Bench { station, simulated, at, shift, checks, holds, unclosed, since })
}

/// Now, on a simulated bench: the scenario's own date, or the last run there if that is later.
fn bench_day(
    store: &Store,
    station: &StationFile,
    scenario: Option<Scenario>,
) -> Result<DateTime<FixedOffset>, Failure> {
    let start = scenario.unwrap_or_else(Scenario::demo).started_at;
    let runs = store.runs_from(start.timestamp_millis()).map_err(|error| Failure::store(&error))?;
    let last = runs.iter().rev().find(|run| is_at(run, station));
    let last = last.and_then(|run| DateTime::parse_from_rfc3339(&run.opened.identity.started_at).ok());
    Ok(last.map_or(start, |last| last.max(start)))
}

/// Product runs of the bench that rest on no later check: opened since the last good check of each of its tubes.
fn runs_since(
    store: &Store,
    station: &StationFile,
    at: DateTime<FixedOffset>,
    checks: &[ReferenceCheck],
) -> Result<Vec<FoundRun>, Failure> {
    if station.references.is_empty() {
        return Ok(Vec::new());
    }
    let last_good = |tube: &Reference| {
        let own = counted(station, tube, at, checks);
        own.iter().rev().find(|(_, check)| out_of_bounds(tube, check).is_none()).map(|(at, _)| at.timestamp_millis())
    };
    let from = station.references.iter().map(|tube| last_good(tube).unwrap_or(i64::MIN)).min().unwrap_or(i64::MIN);
    let runs = store.runs_from(from).map_err(|error| Failure::store(&error))?;
    let is_product = |run: &FoundRun| run.opened.identity.run_kind.is_product() && is_at(run, station);
    Ok(runs.into_iter().filter(is_product).collect())
}

fn pdf(bench: &Bench) -> Result<Vec<u8>, Failure> {
    let charts: Vec<BenchChart> =
        bench.station.references.iter().flat_map(|tube| bench.charts(tube)).map(|(_, chart)| chart).collect();
    let stored = bench.checks.iter().filter(|check| check.stored).count();
    let local = bench.at.with_timezone(&bench.station.time_zone).naive_local();
    let mut lines = vec![page::BENCH_AS_OF.with([minute(local)])];
    lines.extend(bench.holds.iter().map(|sentence| page::BENCH_HOLDS.with([said(sentence.clone())])));
    if stored > 0 {
        lines.push(page::BENCH_STORED.with([figure(stored), figure(bench.checks.len())]));
    }
    let title = BenchTitle {
        station: bench.station.station.clone(),
        lines,
        simulated: bench.simulated,
        language: Language::English,
    };
    let sha256: String = Sha256::digest(bench_csv(&charts)).iter().map(|byte| format!("{byte:02x}")).collect();
    let program = format!("tubewright {}", env!("CARGO_PKG_VERSION"));
    bench_pdf(&title, &charts, bench.at, &program, &sha256)
        .map_err(|error| Failure::new(Ending::Store, error.to_string()))
}
