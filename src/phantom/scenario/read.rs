//! From the tables of a scenario file to the scenario.
//! Must not stop at the first fault.
//! Main function: [`scenario`].

use std::borrow::Cow;

use chrono::{DateTime, FixedOffset};
use toml::{
    Spanned,
    de::{DeTable, DeValue},
};

use super::{
    super::{
        bench::BenchTruth,
        fault::{Fault, FaultError},
        tube::{Incident, TubeTruth},
    },
    Scenario, ScenarioTube,
    keys::{BENCH, TUBE},
    reader::{Reader, ScenarioFault},
};
use crate::quantity::Dimension;

type Value<'i> = Spanned<DeValue<'i>>;

const HEAD: &[&str] =
    &["title", "started_at", "time_zone", "seed", "technician", "time_to_answer", "bench", "type", "tube", "reference"];
const TUBE_WORDS: &[&str] = &[
    "serial",
    "type",
    "bench",
    "supplier",
    "lot",
    "condition",
    "received",
    "started_at",
    "faults",
    "polarization",
    "tries",
    "incident",
];
const INCIDENT: &[&str] = &["kind", "at", "size", "to", "lasts"];
/// Times since first light: up to a day.
const DAY: (f64, f64) = (0.0, 86_400.0);

/// Reads a scenario, or gives every fault.
pub(super) fn scenario(text: &str) -> Result<Scenario, Vec<ScenarioFault>> {
    let mut reader = Reader::new(text);
    let table = match DeTable::parse(text) {
        Ok(table) => table.into_inner(),
        Err(error) => {
            reader.fault(error.span().unwrap_or(0..0), error.message());
            return Err(reader.faults);
        }
    };
    let mut scenario = Scenario::default();
    for (word, value) in &table {
        head(&mut reader, &mut scenario, word, value);
    }
    for word in ["started_at", "bench"] {
        if !table.contains_key(word) {
            reader.fault(0..0, format!("the file has no `{word}`"));
        }
    }
    // Tubes last: they build on types and benches, wherever those stand in the file.
    if let Some(value) = table.get("tube") {
        for entry in entries(&mut reader, value) {
            if let Some(tube) = tube(&mut reader, &scenario, entry) {
                scenario.tubes.push(tube);
            }
        }
    }
    if let Some(value) = table.get("reference") {
        for entry in entries(&mut reader, value) {
            if let Some(tube) = tube(&mut reader, &scenario, entry) {
                scenario.references.push(tube);
            }
        }
    }
    if reader.faults.is_empty() { Ok(scenario) } else { Err(reader.faults) }
}

fn head(reader: &mut Reader<'_>, scenario: &mut Scenario, word: &Spanned<Cow<'_, str>>, value: &Value<'_>) {
    let key = word.get_ref().as_ref();
    match key {
        "title" => scenario.title = reader.text(key, value).unwrap_or_default().to_owned(),
        "technician" => scenario.technician = reader.text(key, value).unwrap_or_default().to_owned(),
        "seed" => scenario.seed = reader.whole(key, value).unwrap_or_default(),
        "started_at" => {
            if let Some(at) = instant(reader, key, value) {
                scenario.started_at = at;
            }
        }
        "time_to_answer" => {
            if let Some(seconds) = reader.number(key, value, Dimension::Time, (0.0, 3600.0)) {
                scenario.time_to_answer_ms = (seconds * 1e3).round() as u64;
            }
        }
        "time_zone" => match reader.text(key, value).map(str::parse) {
            Some(Ok(zone)) => scenario.time_zone = zone,
            Some(Err(_)) => reader.fault(value.span(), "`time_zone` must be an IANA name such as \"Europe/Lisbon\""),
            None => {}
        },
        "bench" => {
            for (name, value) in reader.table(value).into_iter().flatten() {
                let mut bench = BenchTruth::default();
                for (word, value) in reader.table(value).into_iter().flatten() {
                    bench_key(reader, &mut bench, word, value);
                }
                scenario.benches.insert(name.get_ref().to_string(), bench);
            }
        }
        "type" => {
            for (name, value) in reader.table(value).into_iter().flatten() {
                let mut truth = TubeTruth::default();
                for (word, value) in reader.table(value).into_iter().flatten() {
                    if !truth_key(reader, &mut truth, word.get_ref(), value) {
                        reader.unknown(word, TUBE.iter().map(|key| key.word).chain(["polarization", "tries"]));
                    }
                }
                scenario.types.insert(name.get_ref().to_string(), truth);
            }
        }
        "tube" | "reference" => {}
        _ => reader.unknown(word, HEAD.iter().copied()),
    }
}

fn bench_key(reader: &mut Reader<'_>, bench: &mut BenchTruth, word: &Spanned<Cow<'_, str>>, value: &Value<'_>) {
    match (word.get_ref().as_ref(), value.get_ref()) {
        ("ramp_reversed", DeValue::Boolean(reversed)) => bench.ramp_reversed = *reversed,
        ("ramp_reversed", _) => reader.fault(value.span(), "`ramp_reversed` must be true or false"),
        ("analyser", DeValue::String(text)) if text == "none" => bench.analyser = None,
        ("bits", _) => match reader.whole("bits", value) {
            Some(bits @ 1..=32) => bench.bits = bits as u32,
            Some(bits) => reader.fault(value.span(), format!("`bits` is {bits}; expected 1 to 32, both inclusive")),
            None => {}
        },
        (key, _) => {
            if !reader.keyed(BENCH, bench, key, value) {
                reader.unknown(word, BENCH.iter().map(|key| key.word).chain(["ramp_reversed", "bits"]));
            }
        }
    }
}

/// Sets one key of a tube's truth. Returns whether it is one.
fn truth_key(reader: &mut Reader<'_>, truth: &mut TubeTruth, key: &str, value: &Value<'_>) -> bool {
    match key {
        "polarization" => match reader.text(key, value) {
            Some("linear") => truth.single_axis = true,
            Some("random") => truth.single_axis = false,
            Some(other) => {
                reader.fault(value.span(), format!("`polarization` is `{other}`; expected `linear` or `random`"));
            }
            None => {}
        },
        "tries" => truth.tries = reader.whole(key, value).unwrap_or(truth.tries),
        _ => return reader.keyed(TUBE, truth, key, value),
    }
    true
}

fn tube(reader: &mut Reader<'_>, scenario: &Scenario, entry: &Value<'_>) -> Option<ScenarioTube> {
    let table = reader.table(entry)?;
    let mut named = |word: &str| match table.get(word) {
        Some(value) => reader.text(word, value).map(|text| (text, value.span())),
        None => {
            reader.fault(entry.span(), format!("this tube has no `{word}`"));
            None
        }
    };
    let (serial, tube_type, bench) = (named("serial"), named("type"), named("bench"));
    let truth = tube_type.as_ref().and_then(|(name, _)| scenario.types.get(*name)).cloned();
    for (found, what, given) in [
        (truth.is_some(), "type", &tube_type),
        (bench.as_ref().is_some_and(|(name, _)| scenario.benches.contains_key(*name)), "bench", &bench),
    ] {
        if let (false, Some((name, span))) = (found, given) {
            reader.fault(
                span.clone(),
                format!("`{name}` is no {what} of this file; expected one with a `[{what}.{name}]`"),
            );
        }
    }
    let mut tube = ScenarioTube {
        serial: serial.map_or("", |(text, _)| text).to_owned(),
        tube_type: tube_type.map_or("", |(text, _)| text).to_owned(),
        supplier: String::new(),
        lot: String::new(),
        condition: String::new(),
        received: String::new(),
        bench: bench.map_or("", |(text, _)| text).to_owned(),
        started_at: scenario.started_at,
        truth: truth.unwrap_or_default(),
    };
    for (word, value) in table {
        tube_key(reader, &mut tube, word, value);
    }
    // Last: a fault changes what all the keys together say.
    if let Some(value) = table.get("faults") {
        faults(reader, value).iter().for_each(|fault| fault.befall(&mut tube.truth));
    }
    Some(tube)
}

fn tube_key(reader: &mut Reader<'_>, tube: &mut ScenarioTube, word: &Spanned<Cow<'_, str>>, value: &Value<'_>) {
    let key = word.get_ref().as_ref();
    match key {
        "serial" | "type" | "bench" | "faults" => {}
        "supplier" => tube.supplier = reader.text(key, value).unwrap_or_default().to_owned(),
        "lot" => tube.lot = reader.text(key, value).unwrap_or_default().to_owned(),
        "condition" => tube.condition = reader.text(key, value).unwrap_or_default().to_owned(),
        "received" => match value.get_ref() {
            DeValue::Datetime(date) if date.time.is_none() => tube.received = date.to_string(),
            _ => reader.fault(value.span(), "`received` must be a date such as 2026-03-02, without quotes"),
        },
        "started_at" => tube.started_at = instant(reader, key, value).unwrap_or(tube.started_at),
        "incident" => {
            for entry in entries(reader, value) {
                tube.truth.incidents.extend(incident(reader, entry));
            }
        }
        _ => {
            if !truth_key(reader, &mut tube.truth, key, value) {
                reader.unknown(word, TUBE.iter().map(|key| key.word).chain(TUBE_WORDS.iter().copied()));
            }
        }
    }
}

/// A list of faults, each a text such as `helium-lost = 45 %`.
fn faults(reader: &mut Reader<'_>, value: &Value<'_>) -> Vec<Fault> {
    let DeValue::Array(list) = value.get_ref() else {
        reader.fault(value.span(), "`faults` must be a list such as [\"helium-lost = 45 %\"]");
        return Vec::new();
    };
    let mut found = Vec::new();
    for entry in list.iter() {
        match reader.text("faults", entry).map(str::parse) {
            Some(Ok(fault)) => found.push(fault),
            Some(Err(error)) => {
                let error: FaultError = error;
                reader.fault(entry.span(), error.to_string());
            }
            None => {}
        }
    }
    found
}

fn incident(reader: &mut Reader<'_>, entry: &Value<'_>) -> Option<Incident> {
    let table = reader.table(entry)?;
    for word in table.keys().filter(|word| !INCIDENT.contains(&word.get_ref().as_ref())) {
        reader.unknown(word, INCIDENT.iter().copied());
    }
    let kind_value = table.get("kind");
    let kind = kind_value.and_then(|value| reader.text("kind", value)).unwrap_or("");
    let mut number = |word: &str, dimension, bounds, default: Option<f64>| match table.get(word) {
        Some(value) => reader.number(word, value, dimension, bounds),
        None if default.is_some() => default,
        None => {
            reader.fault(entry.span(), format!("an incident of kind `{kind}` needs `{word}`"));
            None
        }
    };
    let any_size = (-1e12, 1e12);
    Some(match kind {
        "hop" => Incident::Hop {
            at: number("at", Dimension::Time, DAY, None)?,
            size: number("size", Dimension::Frequency, any_size, None)?,
        },
        "jump" => Incident::Jump {
            at: number("at", Dimension::Time, DAY, None)?,
            size: number("size", Dimension::Frequency, any_size, None)?,
        },
        "swap" => Incident::Swap { at: number("at", Dimension::Time, DAY, None)? },
        "knock" => Incident::Knock {
            at: number("at", Dimension::Time, DAY, None)?,
            to: number("to", Dimension::Ratio, (0.0, 1.0), Some(0.5))?,
            lasts: number("lasts", Dimension::Time, DAY, Some(1.0))?,
        },
        "lost" => Incident::Lost {
            at: number("at", Dimension::Time, DAY, None)?,
            lasts: number("lasts", Dimension::Time, DAY, Some(0.2))?,
        },
        other => {
            let span = kind_value.map_or(entry.span(), Spanned::span);
            reader.fault(span, format!("`{other}` is no kind of incident; expected hop, swap, knock, lost or jump"));
            return None;
        }
    })
}

/// The entries of an array of tables, or a fault.
fn entries<'a, 'i>(reader: &mut Reader<'_>, value: &'a Value<'i>) -> Vec<&'a Value<'i>> {
    if let DeValue::Array(array) = value.get_ref() {
        return array.iter().collect();
    }
    reader.fault(value.span(), "expected a list of tables here");
    Vec::new()
}

/// A moment with its offset, or a fault.
fn instant(reader: &mut Reader<'_>, word: &str, value: &Value<'_>) -> Option<DateTime<FixedOffset>> {
    let found = match value.get_ref() {
        DeValue::Datetime(moment) => DateTime::parse_from_rfc3339(&moment.to_string()).ok(),
        _ => None,
    };
    if found.is_none() {
        let example = "2026-03-02T08:00:00+00:00";
        reader.fault(
            value.span(),
            format!("`{word}` must be a moment with its offset such as {example}, without quotes"),
        );
    }
    found
}
