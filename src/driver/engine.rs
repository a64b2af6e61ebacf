//! Bytes of a capture → the fact and the finding that are stored.
//! Must not open a file.
//! Main types: [`Engine`], [`Measured`].

use sha2::{Digest as _, Sha256};

use super::finding::{finding_of, light_finding_of, trace_of};
use crate::behaviour::{LightSettings, measure_light};
use crate::capture::{CaptureError, Columns, read_many};
use crate::record::event::CaptureFact;
use crate::record::finding::{CaptureFinding, Trace};
use crate::record::light::LightFinding;
use crate::run::Plan;
use crate::station::{CaptureRequest, CapturedBytes, LightRequest};
use crate::sweep::{Settings, measure, thin_trace};

/// Columns of a stored trace: more than a page can show.
const TRACE_COLUMNS: usize = 600;
/// Source id of a free spectral range without a certificate.
const UNCERTIFIED: &str = "fsr";

/// Measures captures as one plan wants it.
#[derive(Debug, Clone, PartialEq)]
pub struct Engine {
    settings: Settings,
    columns: Option<Columns>,
}

impl Engine {
    /// Takes free spectral range and columns from the station file, spacing and floor from the recipe.
    ///
    /// None if the station has no interferometer. Errors: its `columns` cannot be read.
    pub fn of(plan: &Plan) -> Result<Option<Self>, CaptureError> {
        let Some(interferometer) = &plan.station.interferometer else { return Ok(None) };
        let certificate = interferometer.certificate.as_ref();
        let settings = Settings {
            free_spectral_range: interferometer.fsr_in_air(),
            u_free_spectral_range: interferometer.fsr_u,
            nominal_spacing: Some(plan.recipe.nominal_spacing),
            mode_floor: plan.recipe.mode_floor,
            fsr_source_id: certificate.map_or_else(|| UNCERTIFIED.to_owned(), |c| c.number.clone()),
        };
        let columns = interferometer.columns.as_deref().map(str::parse).transpose()?;
        Ok(Some(Self { settings, columns }))
    }

    /// Measures one capture.
    ///
    /// * `shown`: somebody looks on: a thinned trace is made even if none is stored.
    ///
    /// Errors: the bytes cannot be read as a capture, in words. A capture that can be read but not measured is a finding.
    pub fn measure(&self, captured: &CapturedBytes, request: &CaptureRequest, shown: bool) -> Result<Measured, String> {
        let files: Vec<(&str, &[u8])> = captured.files.iter().map(|(name, b)| (name.as_str(), b.as_slice())).collect();
        let capture = read_many(&files, self.columns.as_ref()).map_err(|error| error.to_string())?;
        let measurement = measure(&capture, &self.settings);
        let mut finding = finding_of(&measurement);
        finding.warnings.extend(capture.remarks.iter().map(ToString::to_string));
        let trace = (request.trace || shown).then(|| thin_trace(&capture, &measurement, TRACE_COLUMNS)).flatten();
        let trace = trace.map(trace_of);
        if request.trace {
            finding.trace.clone_from(&trace);
        }
        let fact = CaptureFact {
            taken_s: captured.taken_ms as f64 / 1000.0,
            sha256: sha256(captured),
            files: Vec::new(),
            polarizer: capture.head.polarizer,
            power: capture.head.power,
            run_current: capture.head.run_current,
        };
        Ok(Measured { fact, finding, trace })
    }
}

/// What came of one capture.
#[derive(Debug, Clone, PartialEq)]
pub struct Measured {
    /// The fact, to be stored.
    pub fact: CaptureFact,
    /// The finding, to be stored.
    pub finding: CaptureFinding,
    /// The thinned trace for whoever looks on; not stored.
    pub trace: Option<Trace>,
}

/// Measures one trace of the total light; needs no interferometer.
///
/// Errors: the bytes cannot be read, in words. A trace that can be read but not measured is a finding.
pub(super) fn measure_trace(
    captured: &CapturedBytes,
    request: &LightRequest,
) -> Result<(CaptureFact, LightFinding), String> {
    let files: Vec<(&str, &[u8])> = captured.files.iter().map(|(name, b)| (name.as_str(), b.as_slice())).collect();
    let trace = read_many(&files, None).map_err(|error| error.to_string())?;
    let settings = LightSettings { lit: request.lit, band: request.band, overlap: request.overlap };
    let mut finding = light_finding_of(measure_light(&trace.photodiode, trace.time.step, &settings));
    finding.warnings.extend(trace.remarks.iter().map(ToString::to_string));
    let fact = CaptureFact {
        taken_s: captured.taken_ms as f64 / 1000.0,
        sha256: sha256(captured),
        run_current: trace.head.run_current,
        ..CaptureFact::default()
    };
    Ok((fact, finding))
}

/// SHA-256 over the bytes of every file in order.
fn sha256(captured: &CapturedBytes) -> String {
    let mut hash = Sha256::new();
    for (_, bytes) in &captured.files {
        hash.update(bytes);
    }
    hash.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
}
