//! What the engine found in one fast trace of the total light, as it is stored.
//! Must not hold samples.
//! Main types: [`LightCaptured`], [`LightFinding`].

use serde::{Deserialize, Serialize};

use super::event::CaptureFact;

/// One light trace: the fact and, apart from it, the finding.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct LightCaptured {
    /// Step that wanted it.
    pub step: String,
    /// Its number in the run, from 1; traces and sweeps are counted together.
    pub number: u64,
    /// The light was to be let through; else the beam blocked.
    pub lit: bool,
    /// The fact.
    pub fact: CaptureFact,
    /// The finding.
    pub finding: LightFinding,
}

/// Derived from one light trace by the engine of one version; may be made again from the trace.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct LightFinding {
    /// Version of the engine that found it.
    pub engine: String,
    /// Why nothing could be measured, or none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub refused: Option<String>,
    /// Samples a second.
    pub sample_rate: f64,
    /// How long it lasts, s.
    pub duration: f64,
    /// Mean level, V.
    pub mean: f64,
    /// Noise in the band: (mean square V², its standard uncertainty, degrees of freedom).
    pub noise: (f64, f64, f64),
    /// Mean density where slow and fast traces overlap, V²/Hz.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub overlap: Option<f64>,
    /// Mains harmonics.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub mains: Option<StoredMains>,
    /// Strongest line.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub tone: Option<StoredTone>,
    /// Remarks in words.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub warnings: Vec<String>,
}

/// Mains harmonics of a trace.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct StoredMains {
    /// Mains frequency, Hz.
    pub frequency: f64,
    /// It stood clear of the noise.
    pub clear: bool,
    /// Sum of mean squares of the harmonics, V².
    pub power: f64,
    /// Its standard uncertainty, V².
    pub u_power: f64,
    /// Harmonics summed.
    pub n_harmonics: u32,
}

/// Strongest line of a trace.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct StoredTone {
    /// Hz.
    pub frequency: f64,
    /// Its standard uncertainty, Hz.
    pub u_frequency: f64,
    /// Mean square, V².
    pub power: f64,
    /// Its standard uncertainty, V².
    pub u_power: f64,
    /// Probability that noise alone shows as much.
    pub probability: f64,
}
