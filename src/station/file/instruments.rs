//! The instruments of a station file: where their readings come from, how well they are known, their certificates.
//! Must not touch an instrument.
//! Main types: [`Interferometer`], [`PowerMeter`], [`Supply`], [`Polarizer`].

use crate::{
    constants::AIR_REFRACTIVITY,
    limits::{
        nearest,
        reading::{Item, Table},
    },
    quantity::Dimension,
    uncertainty::{BudgetLine, Certificate, Evaluation},
};

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

/// Fast photodiode on the output beam.
#[derive(Debug, Clone, PartialEq)]
pub struct LightDetector {
    /// Source of traces.
    pub source: Source,
    /// Where its response has fallen by 3 dB, with that of the digitizer, Hz.
    pub bandwidth: f64,
}

pub(super) const LIGHT_DETECTOR: &[&str] = &["source", "bandwidth"];
pub(super) const INTERFEROMETER: &[&str] = &["source", "fsr", "fsr_u", "columns", "certificate"];
pub(super) const POWER_METER: &[&str] = &["source", "factor", "u", "certificate"];
pub(super) const SUPPLY: &[&str] = &["source", "ballast", "ballast_distance", "u", "certificate"];
pub(super) const POLARIZER: &[&str] = &["source", "extinction", "u_angle"];
/// A bench whose scale is known worse than this decides nothing.
const WORST_RELATIVE_U: f64 = 0.2;

impl Interferometer {
    /// Free spectral range on the bench, Hz. The bench stands in air: a certificate for air holds as it is, one for vacuum
    /// is divided by the refractive index. The light's frequencies are the same in both, so that nothing else is corrected.
    pub fn fsr_in_air(&self) -> f64 {
        match self.certificate.as_ref().map(|certificate| certificate.medium.as_str()) {
            Some("vacuum") => self.fsr / (1.0 + AIR_REFRACTIVITY.value),
            _ => self.fsr,
        }
    }

    /// What the air adds to the budget, relative; none without a certificate, whose uncertainty is then all there is.
    /// Where the certificate does not say its medium, the range may be off by the whole index, one way (rectangular).
    pub fn air_line(&self) -> Option<BudgetLine> {
        let (words, u) = match self.certificate.as_ref()?.medium.as_str() {
            "" => ("medium of the certificate not stated", AIR_REFRACTIVITY.value / 3f64.sqrt()),
            _ => ("refractive index of air: weather, height", AIR_REFRACTIVITY.u_value),
        };
        Some(BudgetLine::direct("air", words, Evaluation::TypeB, u, f64::INFINITY))
    }
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

pub(super) fn interferometer(table: &Table<'_>) -> Option<Interferometer> {
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

pub(super) fn power_meter(table: &Table<'_>) -> Option<PowerMeter> {
    let source = source(table, &["simulated", "folder", "typed"]);
    let factor = table.get("factor").map_or(Some(1.0), |item| item.positive(Dimension::Ratio));
    let u = relative_u(table, "u");
    let certificate = certificate(table, false);
    Some(PowerMeter { source: source?, factor: factor?, u: u?, certificate: certificate? })
}

pub(super) fn supply(table: &Table<'_>) -> Option<Supply> {
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

pub(super) fn polarizer(table: &Table<'_>) -> Option<Polarizer> {
    let source = source(table, &["simulated", "folder", "typed"]);
    let extinction = table.need("extinction");
    let extinction =
        extinction.and_then(|item| item.quantity_within(Dimension::Ratio, (1.0, 1e12), "a ratio of at least 1"));
    let u_angle = table.need("u_angle").and_then(|item| {
        item.quantity_within(Dimension::Angle, (0.0, std::f64::consts::FRAC_PI_4), "an angle from 0° to 45°")
    });
    Some(Polarizer { source: source?, extinction: extinction?, u_angle: u_angle? })
}

pub(super) fn light_detector(table: &Table<'_>) -> Option<LightDetector> {
    let source = source(table, &["simulated", "folder"]);
    let bandwidth = table.need("bandwidth").and_then(|item| item.positive(Dimension::Frequency));
    Some(LightDetector { source: source?, bandwidth: bandwidth? })
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

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use crate::station::file::StationFile;

    #[test]
    fn a_certificate_for_vacuum_is_corrected_and_the_air_has_its_line() {
        let of = |medium: &str| {
            let text = format!(
                "station = \"b\"\ntime_zone = \"UTC\"\n[interferometer]\nsource = \"folder\"\nfsr = \"8 GHz\"\n\
                 fsr_u = \"0.3 %\"\ncertificate = {{ number = \"1\", date = 2026-01-12, due = 2027-01-12{medium} }}\n"
            );
            StationFile::parse("s.toml", &text).unwrap().interferometer.unwrap()
        };
        let [air, vacuum, unsaid] = [", in = \"air\"", ", in = \"vacuum\"", ""].map(of);
        assert_eq!(air.fsr_in_air(), 8e9);
        // 8 GHz × 2.7e-4 = 2.16 MHz less; the square of the index is 0.6 kHz.
        assert!((vacuum.fsr_in_air() - (8e9 - 2.16e6)).abs() < 1e3, "{}", vacuum.fsr_in_air());
        assert_eq!(unsaid.fsr_in_air(), 8e9);
        let u = |it: &super::Interferometer| it.air_line().unwrap().standard_uncertainty;
        assert!(u(&unsaid) > 5.0 * u(&air));
    }
}
