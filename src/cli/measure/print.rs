//! A result of `measure` as text and as the JSON object of its contract.
//! Must not measure.
//! Main functions: [`json`], [`text`].

use std::fmt::Write as _;

use serde::Serialize;

use super::Outcome;
use crate::cli::{Ending, Failure};
use crate::constants::{MODE_PULLING, SPEED_OF_LIGHT};
use crate::sweep::Mode;
use crate::uncertainty::joint;

/// The object of `--format json`; unknown is null. Field names are a contract.
#[derive(Debug, Serialize)]
struct JsonResult<'a> {
    capture: &'a str,
    refused: Option<&'a str>,
    mode_spacing_hz: Option<f64>,
    mode_spacing_u_hz: Option<f64>,
    mirror_spacing_m: Option<f64>,
    mode_count: Option<usize>,
    order_count: Option<u32>,
    finesse: Option<f64>,
    modes: Vec<JsonMode>,
    off_axis: Vec<JsonMode>,
    warnings: &'a [String],
    computed_in_s: f64,
}

#[derive(Debug, Serialize)]
struct JsonMode {
    offset_hz: Option<f64>,
    offset_u_hz: Option<f64>,
    relative_height: Option<f64>,
    fwhm_hz: Option<f64>,
}

/// JSON has no infinity and no NaN: what is not finite is unknown.
fn known(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

fn json_modes(modes: &[Mode]) -> Vec<JsonMode> {
    let one = |mode: &Mode| JsonMode {
        offset_hz: known(mode.offset),
        offset_u_hz: known(mode.u_offset),
        relative_height: known(mode.relative_height),
        fwhm_hz: known(mode.fwhm),
    };
    modes.iter().map(one).collect()
}

/// Distance of the mirrors, m: L = c/(2 Δν (1 + p)), the pulled comb widened back.
fn mirror_spacing(mode_spacing: f64) -> f64 {
    SPEED_OF_LIGHT.value / (2.0 * mode_spacing * (1.0 + MODE_PULLING.value))
}

/// One line of JSON.
pub(super) fn json(outcome: &Outcome) -> Result<String, Failure> {
    let measurement = outcome.measurement.as_ref();
    let spacing = measurement.and_then(|m| m.mode_spacing.as_ref());
    let seen = measurement.filter(|m| m.refused.is_none());
    let result = JsonResult {
        capture: &outcome.capture,
        refused: outcome.refused.as_deref(),
        mode_spacing_hz: spacing.and_then(|s| known(s.value)),
        mode_spacing_u_hz: spacing.and_then(|s| known(s.u())),
        mirror_spacing_m: spacing.and_then(|s| known(mirror_spacing(s.value))),
        mode_count: seen.map(|m| m.mode_count),
        order_count: measurement.map(|m| m.order_count).filter(|&n| n > 0),
        finesse: measurement.and_then(|m| m.finesse).and_then(known),
        modes: measurement.map(|m| json_modes(&m.modes)).unwrap_or_default(),
        off_axis: measurement.map(|m| json_modes(&m.off_axis)).unwrap_or_default(),
        warnings: &outcome.warnings,
        computed_in_s: outcome.computed_in_s,
    };
    serde_json::to_string(&result)
        .map_err(|error| Failure::new(Ending::Unusable, format!("cannot write the result as JSON: {error}")))
}

/// Short lines for people: the capture, what was found, what to know about it.
pub(super) fn text(outcome: &Outcome) -> String {
    let mut lines = outcome.capture.clone();
    // Writing to a String cannot fail.
    if let Some(why) = &outcome.refused {
        let _ = write!(lines, "\n  refused: {why}");
    }
    if let Some(measurement) = &outcome.measurement {
        if let Some(spacing) = &measurement.mode_spacing {
            let (value, expanded) = joint(spacing.value / 1e6, spacing.expanded() / 1e6, 4);
            let mirrors = mirror_spacing(spacing.value) * 1e3;
            let _ = write!(lines, "\n  mode spacing {value} ± {expanded} MHz, mirrors {mirrors:.1} mm apart");
        }
        if measurement.refused.is_none() {
            let finesse = measurement.finesse.map_or_else(|| "unknown".to_owned(), |finesse| format!("{finesse:.0}"));
            let (modes, orders) = (measurement.modes.len(), measurement.order_count);
            let _ = write!(lines, "\n  modes {modes}, orders {orders}, finesse {finesse}");
        }
        for (kind, modes) in [("mode", &measurement.modes), ("off axis", &measurement.off_axis)] {
            for mode in modes {
                let (offset, fwhm) = (mode.offset / 1e6, mode.fwhm / 1e6);
                let height = mode.relative_height * 100.0;
                let _ = write!(lines, "\n  {kind:<8} {offset:>9.2} MHz  height {height:>5.1} %  FWHM {fwhm:.1} MHz");
            }
        }
    }
    for warning in &outcome.warnings {
        let _ = write!(lines, "\n  note: {warning}");
    }
    lines
}
