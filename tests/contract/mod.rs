//! The contract of `measure --format json`, checked on one printed line.
//! Must not look into the library but for reading quantities.
//! Main function: [`check`]; main type: [`Found`].

#![allow(dead_code, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use serde_json::Value;

/// Fields of the object, in the order they are printed.
const FIELDS: [&str; 12] = [
    "capture",
    "refused",
    "mode_spacing_hz",
    "mode_spacing_u_hz",
    "mirror_spacing_m",
    "mode_count",
    "order_count",
    "finesse",
    "modes",
    "off_axis",
    "warnings",
    "computed_in_s",
];
const MODE_FIELDS: [&str; 4] = ["offset_hz", "offset_u_hz", "relative_height", "fwhm_hz"];
/// m/s, exact.
const SPEED_OF_LIGHT: f64 = 299_792_458.0;

/// One printed result.
#[derive(Debug, Clone)]
pub struct Found {
    pub capture: String,
    pub refused: Option<String>,
    pub mode_spacing: Option<(f64, f64)>,
    pub mirror_spacing: Option<f64>,
    pub mode_count: Option<u64>,
    pub order_count: Option<u64>,
    pub finesse: Option<f64>,
    pub modes: Vec<FoundMode>,
    pub off_axis: Vec<FoundMode>,
    pub warnings: Vec<String>,
}

/// One mode of it.
#[derive(Debug, Clone, Copy)]
pub struct FoundMode {
    pub offset: f64,
    pub u_offset: f64,
    pub relative_height: f64,
    pub fwhm: f64,
}

impl Found {
    /// Some warning holds these words.
    pub fn warns(&self, words: &str) -> bool {
        self.warnings.iter().any(|warning| warning.contains(words))
    }

    /// Value and standard uncertainty of the spacing; the result must have one.
    #[track_caller]
    pub fn spacing(&self) -> (f64, f64) {
        self.mode_spacing.unwrap_or_else(|| panic!("{}: {:?}", self.capture, self.refused))
    }
}

/// Checks one line against the contract for an interferometer of this free spectral range; says every breach.
pub fn check(line: &str, free_spectral_range: f64) -> Result<Found, String> {
    let value: Value = serde_json::from_str(line).map_err(|error| format!("no JSON object: {error}: {line}"))?;
    let mut breaches = Vec::new();
    fields(line, &value, &FIELDS, &mut breaches);
    let text = |key: &str| value[key].as_str().map(str::to_owned);
    let mut number = |key: &str| match &value[key] {
        Value::Null => None,
        Value::Number(number) => number.as_f64(),
        other => {
            breaches.push(format!("{key} is {other}"));
            None
        }
    };
    let (spacing, u_spacing) = (number("mode_spacing_hz"), number("mode_spacing_u_hz"));
    let (mirror_spacing, finesse) = (number("mirror_spacing_m"), number("finesse"));
    if !number("computed_in_s").is_some_and(|seconds| seconds >= 0.0) {
        breaches.push("computed_in_s is no time".to_owned());
    }
    let counts = ["mode_count", "order_count"].map(|key| value[key].as_u64());
    for (key, count) in ["mode_count", "order_count"].iter().zip(counts) {
        if count.is_none() && !value[*key].is_null() {
            breaches.push(format!("{key} is {}", value[*key]));
        }
    }
    let modes = modes(&value["modes"], "modes", &mut breaches);
    let off_axis = modes_of(&value["off_axis"], &mut breaches);
    let warnings: Vec<String> = match &value["warnings"] {
        Value::Array(list) if list.iter().all(Value::is_string) => {
            list.iter().filter_map(|w| w.as_str().map(str::to_owned)).collect()
        }
        other => {
            breaches.push(format!("warnings is {other}"));
            Vec::new()
        }
    };
    let found = Found {
        capture: text("capture").unwrap_or_default(),
        refused: text("refused"),
        mode_spacing: spacing.zip(u_spacing),
        mirror_spacing,
        mode_count: counts[0],
        order_count: counts[1],
        finesse,
        modes,
        off_axis,
        warnings,
    };
    if !(value["refused"].is_null() || found.refused.as_ref().is_some_and(|why| !why.is_empty())) {
        breaches.push(format!("refused is {}", value["refused"]));
    }
    relations(&found, spacing.is_some() == u_spacing.is_some(), free_spectral_range, &mut breaches);
    if breaches.is_empty() { Ok(found) } else { Err(format!("{}: {}", found.capture, breaches.join("; "))) }
}

/// Every field is there, no other, in the order of the contract.
fn fields(line: &str, value: &Value, wanted: &[&str], breaches: &mut Vec<String>) {
    let Some(object) = value.as_object() else {
        breaches.push(format!("{value} is no object"));
        return;
    };
    for key in wanted {
        if !object.contains_key(*key) {
            breaches.push(format!("{key} is missing"));
        }
    }
    for key in object.keys().filter(|key| !wanted.contains(&key.as_str())) {
        breaches.push(format!("{key} is no field of the contract"));
    }
    let places: Vec<Option<usize>> = wanted.iter().map(|key| line.find(&format!("\"{key}\":"))).collect();
    if !places.is_sorted() {
        breaches.push("the fields are out of order".to_owned());
    }
}

fn modes(value: &Value, what: &str, breaches: &mut Vec<String>) -> Vec<FoundMode> {
    let found = modes_of(value, breaches);
    if found.first().is_some_and(|first| first.offset != 0.0) {
        breaches.push(format!("the first of {what} is not at offset 0"));
    }
    found
}

fn modes_of(value: &Value, breaches: &mut Vec<String>) -> Vec<FoundMode> {
    let Some(list) = value.as_array() else {
        breaches.push(format!("{value} is no list of modes"));
        return Vec::new();
    };
    for mode in list {
        let only = mode.as_object().is_some_and(|object| object.len() == MODE_FIELDS.len());
        if !only || !MODE_FIELDS.iter().all(|key| mode[*key].is_number()) {
            breaches.push(format!("{mode} is no mode"));
        }
    }
    let number = |mode: &Value, key: &str| mode[key].as_f64().unwrap_or(f64::NAN);
    let found: Vec<FoundMode> = list
        .iter()
        .map(|mode| FoundMode {
            offset: number(mode, MODE_FIELDS[0]),
            u_offset: number(mode, MODE_FIELDS[1]),
            relative_height: number(mode, MODE_FIELDS[2]),
            fwhm: number(mode, MODE_FIELDS[3]),
        })
        .collect();
    if !found.is_sorted_by(|a, b| a.offset < b.offset) {
        breaches.push(format!("offsets do not ascend: {found:?}"));
    }
    let sound = |m: &FoundMode| m.u_offset >= 0.0 && m.fwhm > 0.0 && m.relative_height > 0.0;
    if let Some(mode) = found.iter().find(|mode| !sound(mode)) {
        breaches.push(format!("{mode:?} cannot be"));
    }
    found
}

/// What the fields must be to each other.
fn relations(found: &Found, both: bool, free_spectral_range: f64, breaches: &mut Vec<String>) {
    let mut must = |holds: bool, what: &str| {
        if !holds {
            breaches.push(what.to_owned());
        }
    };
    must(both, "a spacing without an uncertainty, or the other way round");
    must(found.refused.is_none() == found.mode_spacing.is_some(), "refused and mode_spacing_hz do not fit");
    must(
        found.mirror_spacing.is_some() == found.mode_spacing.is_some(),
        "mirror_spacing_m and mode_spacing_hz do not fit",
    );
    if let (Some((spacing, u)), Some(mirrors)) = (found.mode_spacing, found.mirror_spacing) {
        must(spacing > 0.0 && u > 0.0, "mode_spacing_hz or its uncertainty is not positive");
        // Pulling widens c/2L back by 1 ‰ ± 0.5 ‰.
        let off = mirrors * 2.0 * spacing / SPEED_OF_LIGHT - 1.0;
        must(off.abs() < 2e-3, "mirror_spacing_m is not c/(2 mode_spacing_hz)");
        must(found.modes.len() >= 2, "a spacing of fewer than two modes");
    }
    must(found.mode_count.is_none_or(|n| n <= found.modes.len() as u64), "more modes counted than listed");
    must(found.order_count.is_none_or(|n| n > 0), "order_count is 0");
    must(found.finesse.is_none_or(|f| f > 0.0), "finesse is not positive");
    if let Some(last) = found.modes.last() {
        let highest = found.modes.iter().map(|mode| mode.relative_height).fold(0.0, f64::max);
        must((highest - 1.0).abs() < 1e-9, "no mode has a relative height of 1");
        must(last.offset < free_spectral_range, "a mode lies beyond one order");
        // The first mode follows the largest gap; equal gaps are told apart no better than the offsets are known.
        let around = free_spectral_range - last.offset;
        let doubt = 3.0 * found.modes.iter().map(|mode| mode.u_offset).fold(1.0, f64::max);
        let largest = found.modes.windows(2).map(|pair| pair[1].offset - pair[0].offset).fold(0.0, f64::max);
        must(around > largest - doubt, "the first mode does not follow the largest gap");
    }
}
