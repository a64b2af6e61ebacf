//! The station file: a bench's name, zone and shifts, its instruments and their certificates.
//! Must not touch an instrument, and must not decide what an overdue certificate means.
//! Main type: [`StationFile`].

use chrono::{NaiveDate, NaiveTime};
use chrono_tz::{TZ_VARIANTS, Tz};

use crate::{
    limits::{
        Fault, nearest,
        reading::{Item, Table, read, sha256_hex},
    },
    phrase::{self, Language, Phrase, Saying, name, reasons, said, verdict},
    quantity::Dimension,
    uncertainty::Certificate,
};

/// A station file. An instrument that the station lacks is none.
#[derive(Debug, Clone, PartialEq)]
pub struct StationFile {
    /// Name of the bench.
    pub station: String,
    /// Language of its sheets and questions.
    pub language: Language,
    /// Its time zone.
    pub time_zone: Tz,
    /// Starts of the shifts.
    pub shifts: Vec<NaiveTime>,
    /// Scanning interferometer.
    pub interferometer: Option<Interferometer>,
    /// Power meter.
    pub power_meter: Option<PowerMeter>,
    /// Supply of the tube.
    pub supply: Option<Supply>,
    /// Polarizer ahead of the power meter.
    pub polarizer: Option<Polarizer>,
    /// SHA-256 of the text, hexadecimal.
    pub sha256: String,
}

/// Where an instrument's readings come from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Source {
    /// The simulated bench.
    Simulated,
    /// A folder of captures.
    Folder,
    /// A person types them.
    Typed,
    /// An instrument reached by a learned profile of this name.
    Profile(String),
}

/// Scanning interferometer.
#[derive(Debug, Clone, PartialEq)]
pub struct Interferometer {
    /// Source of captures.
    pub source: Source,
    /// Free spectral range, Hz.
    pub fsr: f64,
    /// Its standard uncertainty, relative.
    pub fsr_u: f64,
    /// Layout of the captures, as `--columns` has it.
    pub columns: Option<String>,
    /// Certificate of the free spectral range.
    pub certificate: Option<Certificate>,
}

/// Power meter.
#[derive(Debug, Clone, PartialEq)]
pub struct PowerMeter {
    /// Source of readings.
    pub source: Source,
    /// True power = reading × factor.
    pub factor: f64,
    /// Standard uncertainty of the factor, relative.
    pub u: f64,
    /// Certificate of the factor.
    pub certificate: Option<Certificate>,
}

/// Supply.
#[derive(Debug, Clone, PartialEq)]
pub struct Supply {
    /// Source of readings.
    pub source: Source,
    /// Ballast resistance, Ω.
    pub ballast: f64,
    /// Distance of the ballast to the anode, m.
    pub ballast_distance: f64,
    /// Standard uncertainty of voltage and current, relative.
    pub u: f64,
    /// Certificate of its meters.
    pub certificate: Option<Certificate>,
}

/// Polarizer.
#[derive(Debug, Clone, PartialEq)]
pub struct Polarizer {
    /// `Typed`: turned by hand.
    pub source: Source,
    /// Extinction of the polarizer itself.
    pub extinction: f64,
    /// Standard uncertainty of a set angle, rad.
    pub u_angle: f64,
}

const TOP: &[&str] =
    &["station", "language", "time_zone", "shifts", "interferometer", "power_meter", "supply", "polarizer"];
const INTERFEROMETER: &[&str] = &["source", "fsr", "fsr_u", "columns", "certificate"];
const POWER_METER: &[&str] = &["source", "factor", "u", "certificate"];
const SUPPLY: &[&str] = &["source", "ballast", "ballast_distance", "u", "certificate"];
const POLARIZER: &[&str] = &["source", "extinction", "u_angle"];
/// A bench whose scale is known worse than this decides nothing.
const WORST_RELATIVE_U: f64 = 0.2;

impl StationFile {
    /// Reads a station file.
    ///
    /// * `name`: name of the file, for the faults.
    ///
    /// Errors: every fault, in the order of the file.
    pub fn parse(name: &str, text: &str) -> Result<Self, Vec<Fault>> {
        read(name, text, TOP, |root| {
            let station = root.need("station").and_then(|item| item.text());
            let language = root.get("language").map_or(Some(Language::default()), |item| item.word(&Language::CODES));
            let time_zone = root.need("time_zone").and_then(|item| zone(&item));
            let shifts = root.get("shifts").map_or(Some(Vec::new()), |item| shifts(&item));
            let interferometer = part(root, "interferometer", INTERFEROMETER, interferometer);
            let power_meter = part(root, "power_meter", POWER_METER, power_meter);
            let supply = part(root, "supply", SUPPLY, supply);
            let polarizer = part(root, "polarizer", POLARIZER, polarizer);
            Some(Self {
                station: station?.to_owned(),
                language: language?,
                time_zone: time_zone?,
                shifts: shifts?,
                interferometer: interferometer?,
                power_meter: power_meter?,
                supply: supply?,
                polarizer: polarizer?,
                sha256: sha256_hex(text),
            })
        })
    }

    /// Every instrument that stands on a certificate, in the order of the file.
    pub fn certificates(&self) -> Vec<(&'static Phrase, &Certificate)> {
        let interferometer = self.interferometer.as_ref().and_then(|i| i.certificate.as_ref());
        let power_meter = self.power_meter.as_ref().and_then(|p| p.certificate.as_ref());
        let supply = self.supply.as_ref().and_then(|s| s.certificate.as_ref());
        [(&reasons::INTERFEROMETER, interferometer), (&reasons::POWER_METER, power_meter), (&reasons::SUPPLY, supply)]
            .into_iter()
            .filter_map(|(role, certificate)| Some((role, certificate?)))
            .collect()
    }

    /// One sentence for each certificate that no longer holds on a day.
    pub fn overdue_on(&self, day: NaiveDate) -> Vec<Saying> {
        self.certificates()
            .into_iter()
            .filter(|(_, certificate)| certificate.overdue_on(day))
            .map(|(role, certificate)| {
                let number = name(certificate.number.clone());
                verdict::CERTIFICATE_OVERDUE.with([number, said(role), phrase::day(certificate.due)])
            })
            .collect()
    }
}

/// An instrument's table: `Some(None)` where the station lacks it, `None` after a fault.
fn part<'a, T>(
    root: &Table<'a>,
    key: &str,
    known: &[&'a str],
    reader: impl FnOnce(&Table<'a>) -> Option<T>,
) -> Option<Option<T>> {
    match root.get(key) {
        None => Some(None),
        Some(item) => Some(Some(reader(&item.table(&format!("[{key}]"), known)?)?)),
    }
}

fn zone(item: &Item<'_>) -> Option<Tz> {
    let name = item.text()?;
    let zone = name.parse().ok();
    if zone.is_none() {
        let message = format!("unknown time zone `{name}`; expected an IANA name such as Europe/Lisbon");
        item.fault(message, nearest(name, TZ_VARIANTS.iter().map(|zone| zone.name())));
    }
    zone
}

fn shifts(item: &Item<'_>) -> Option<Vec<NaiveTime>> {
    let read = |item: &Item<'_>| {
        let text = item.text()?;
        let time = NaiveTime::parse_from_str(text, "%H:%M").ok();
        if time.is_none() {
            item.fault(format!("`{text}` is no time of day; expected hours and minutes such as \"06:00\""), None);
        }
        time
    };
    item.list()?.iter().map(read).collect::<Vec<_>>().into_iter().collect()
}

fn source(table: &Table<'_>, allowed: &[&str]) -> Option<Source> {
    let item = table.need("source")?;
    let text = item.text()?;
    match text {
        word if !allowed.contains(&word) => {}
        "simulated" => return Some(Source::Simulated),
        "folder" => return Some(Source::Folder),
        "typed" => return Some(Source::Typed),
        _ => {}
    }
    match text.strip_prefix("profile:") {
        Some(name) if !name.trim().is_empty() => return Some(Source::Profile(name.trim().to_owned())),
        _ => {}
    }
    let message = format!("unknown source `{text}`; expected one of {}, profile:<name>", allowed.join(", "));
    item.fault(message, nearest(text, allowed.iter().copied().chain(["profile:"])));
    None
}

fn relative_u(table: &Table<'_>, key: &str) -> Option<f64> {
    let item = table.need(key)?;
    item.quantity_within(Dimension::Ratio, (0.0, WORST_RELATIVE_U), "a share from 0 % to 20 %, with its sign: `0.3 %`")
}

fn interferometer(table: &Table<'_>) -> Option<Interferometer> {
    let source = source(table, &["simulated", "folder"]);
    let fsr = table.need("fsr").and_then(|item| item.positive(Dimension::Frequency));
    let fsr_u = relative_u(table, "fsr_u");
    let columns = table.get("columns").map_or(Some(None), |item| columns(&item).map(Some));
    let certificate = certificate(table, true);
    Some(Interferometer { source: source?, fsr: fsr?, fsr_u: fsr_u?, columns: columns?, certificate: certificate? })
}

/// Checked for its form only: `capture` knows what it means.
fn columns(item: &Item<'_>) -> Option<String> {
    const CHANNELS: [&str; 4] = ["time", "ramp", "photodiode", "crossed"];
    let text = item.text()?;
    for part in text.split(',') {
        let (channel, place) = part.split_once('=').unwrap_or((part, ""));
        let channel = channel.trim();
        let number = place.rsplit(':').next().unwrap_or("").trim().parse::<u32>();
        if !CHANNELS.contains(&channel) {
            let message = format!("unknown channel `{channel}` in `columns`; expected one of {}", CHANNELS.join(", "));
            item.fault(message, nearest(channel, CHANNELS));
            return None;
        }
        if !number.is_ok_and(|number| number >= 1) {
            let message = format!("`columns` says `{}`; expected `{channel}=` and a column from 1", part.trim());
            item.fault(message, None);
            return None;
        }
    }
    Some(text.to_owned())
}

fn power_meter(table: &Table<'_>) -> Option<PowerMeter> {
    let source = source(table, &["simulated", "folder", "typed"]);
    let factor = table.get("factor").map_or(Some(1.0), |item| item.positive(Dimension::Ratio));
    let u = relative_u(table, "u");
    let certificate = certificate(table, false);
    Some(PowerMeter { source: source?, factor: factor?, u: u?, certificate: certificate? })
}

fn supply(table: &Table<'_>) -> Option<Supply> {
    let source = source(table, &["simulated", "folder", "typed"]);
    let ballast = table.need("ballast").and_then(|item| item.positive(Dimension::Resistance));
    let ballast_distance = table.need("ballast_distance").and_then(|item| item.positive(Dimension::Length));
    let u = relative_u(table, "u");
    let certificate = certificate(table, false);
    Some(Supply {
        source: source?,
        ballast: ballast?,
        ballast_distance: ballast_distance?,
        u: u?,
        certificate: certificate?,
    })
}

fn polarizer(table: &Table<'_>) -> Option<Polarizer> {
    let source = source(table, &["simulated", "folder", "typed"]);
    let extinction = table.need("extinction");
    let extinction =
        extinction.and_then(|item| item.quantity_within(Dimension::Ratio, (1.0, 1e12), "a ratio of at least 1"));
    let u_angle = table.need("u_angle").and_then(|item| {
        item.quantity_within(Dimension::Angle, (0.0, std::f64::consts::FRAC_PI_4), "an angle from 0° to 45°")
    });
    Some(Polarizer { source: source?, extinction: extinction?, u_angle: u_angle? })
}

/// `Some(None)` where there is none. Only an interferometer's says in which medium it was calibrated.
fn certificate(table: &Table<'_>, has_medium: bool) -> Option<Option<Certificate>> {
    let Some(item) = table.get("certificate") else { return Some(None) };
    let known: &[&str] = if has_medium { &["number", "date", "due", "in"] } else { &["number", "date", "due"] };
    let table = item.table("the certificate", known)?;
    let number = table.need("number").and_then(|item| item.text());
    let date = table.need("date").and_then(|item| item.day());
    let due_item = table.need("due");
    let due = due_item.as_ref().and_then(|item| item.day());
    if let (Some(date), Some(due), Some(item)) = (date, due, &due_item)
        && due < date
    {
        item.fault(format!("`due` {due} is before `date` {date}; expected it after"), None);
    }
    let medium = match table.get("in") {
        Some(item) if has_medium => item.word(&[("air", "air"), ("vacuum", "vacuum")])?,
        _ => "",
    };
    Some(Some(Certificate { number: number?.to_owned(), date: date?, due: due?, medium: medium.to_owned() }))
}
