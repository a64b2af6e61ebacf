//! The station file: a bench's name, zone and shifts, its instruments and their certificates.
//! Must not touch an instrument, and must not decide what an overdue certificate means.
//! Main type: [`StationFile`].

mod instruments;
mod reference;

use chrono::{NaiveDate, NaiveTime};
use chrono_tz::{TZ_VARIANTS, Tz};

use crate::{
    limits::{
        Fault, nearest,
        reading::{Item, Table, read, sha256_hex},
    },
    phrase::{self, Language, Phrase, Saying, name, reasons, said, verdict},
    uncertainty::Certificate,
};
use instruments::{INTERFEROMETER, LIGHT_DETECTOR, POLARIZER, POWER_METER, SUPPLY};
pub use instruments::{Interferometer, LightDetector, Polarizer, PowerMeter, Source, Supply};
pub use reference::{BeatNote, Reference, ReferenceValue};

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
    /// Fast photodiode on the output beam, for the noise of the light.
    pub light_detector: Option<LightDetector>,
    /// Reference tubes, in the order of the file; a bench without one is not held for their checks.
    pub references: Vec<Reference>,
    /// SHA-256 of the text, hexadecimal.
    pub sha256: String,
}

const TOP: &[&str] = &[
    "station",
    "language",
    "time_zone",
    "shifts",
    "interferometer",
    "power_meter",
    "supply",
    "polarizer",
    "light_detector",
    "reference",
];

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
            let interferometer = part(root, "interferometer", INTERFEROMETER, instruments::interferometer);
            let power_meter = part(root, "power_meter", POWER_METER, instruments::power_meter);
            let supply = part(root, "supply", SUPPLY, instruments::supply);
            let polarizer = part(root, "polarizer", POLARIZER, instruments::polarizer);
            let light_detector = part(root, "light_detector", LIGHT_DETECTOR, instruments::light_detector);
            let references = reference::references(root, shifts.as_deref());
            Some(Self {
                station: station?.to_owned(),
                language: language?,
                time_zone: time_zone?,
                shifts: shifts?,
                interferometer: interferometer?,
                power_meter: power_meter?,
                supply: supply?,
                polarizer: polarizer?,
                light_detector: light_detector?,
                references: references?,
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

    /// The reference tube with a serial.
    pub fn reference(&self, serial: &str) -> Option<&Reference> {
        self.references.iter().find(|reference| reference.serial == serial)
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
    let times: Vec<NaiveTime> = item.list()?.iter().map(read).collect::<Vec<_>>().into_iter().collect::<Option<_>>()?;
    if let Some(pair) = times.windows(2).find(|pair| pair[0] >= pair[1]) {
        let (early, late) = (pair[0].format("%H:%M"), pair[1].format("%H:%M"));
        item.fault(
            format!("`shifts` has {late} after {early}; expected each start once, in the order of the day"),
            None,
        );
        return None;
    }
    Some(times)
}
