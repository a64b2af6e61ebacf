//! What the engine found in one capture, as it is stored.
//! Must not hold samples, except the thinned trace of a capture that a chart shows.
//! Main type: [`CaptureFinding`].

use serde::{Deserialize, Serialize};

/// Derived from one capture by the engine of one version; may be made again from the capture.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct CaptureFinding {
    /// Version of the engine that found it.
    pub engine: String,
    /// Why nothing could be measured, or none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub refused: Option<String>,
    /// No light above the noise.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub dark: bool,
    /// Mode spacing, Hz, where two modes or more were seen.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub mode_spacing: Option<f64>,
    /// Budget of that spacing.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub budget: Vec<StoredLine>,
    /// Free spectral range used, Hz.
    pub free_spectral_range: f64,
    /// Orders seen.
    pub order_count: u32,
    /// Finesse with the detector's pole out.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub finesse: Option<f64>,
    /// Mean photodiode level less dark, V.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub mean_level: Option<f64>,
    /// Standard deviation of the photodiode's noise, V.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub noise: Option<f64>,
    /// Ramp voltage at both ends of the ramp measured, V.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub ramp_ends: Option<(f64, f64)>,
    /// Axial modes, ascending on the scan axis.
    pub modes: Vec<ModeFinding>,
    /// Peaks off the comb.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub off_axis: Vec<ModeFinding>,
    /// Remarks in words.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub warnings: Vec<String>,
    /// The thinned trace, where a chart shows this capture.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub trace: Option<Trace>,
}

/// One peak.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct ModeFinding {
    /// Position on the scan axis against a fixed ramp voltage, folded into one order, Hz.
    pub position: f64,
    /// Its standard uncertainty, Hz.
    pub u_position: f64,
    /// Offset from the first mode, Hz.
    pub offset: f64,
    /// Its standard uncertainty, Hz.
    pub u_offset: f64,
    /// Height of the fitted line in the main photodiode, V, mean over orders.
    pub peak_height: f64,
    /// Its standard uncertainty, V.
    pub u_peak_height: f64,
    /// Full width at half maximum, Hz.
    pub fwhm: f64,
    /// Area of all light, both photodiodes together, V·Hz.
    pub area: f64,
    /// Height in the crossed photodiode, V, where the bench has one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub crossed_height: Option<f64>,
    /// (order, ramp voltage V) wherever it was seen.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub places: Vec<(i32, f64)>,
    /// Standard uncertainty of one such voltage, V.
    #[serde(default)]
    pub u_ramp: f64,
}

/// The letter of a mode on every chart, by its place among a capture's modes: a … z, then a1, b1 …
pub fn mode_letter(index: usize) -> String {
    let letter = (b'a'..=b'z').nth(index % 26).map_or('a', char::from);
    if index < 26 { letter.to_string() } else { format!("{letter}{}", index / 26) }
}

/// One line of a budget.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct StoredLine {
    /// See [`crate::uncertainty::BudgetLine`].
    pub source_id: String,
    /// In words.
    pub line: String,
    /// Type A (else B).
    pub type_a: bool,
    /// Standard uncertainty of the input.
    pub standard_uncertainty: f64,
    /// Degrees of freedom; absent where infinite (JSON has no infinity).
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub dof: Option<f64>,
    /// ∂(value)/∂(input).
    pub sensitivity: f64,
    /// More words.
    #[serde(default, skip_serializing_if = "String::is_empty")]
    pub note: String,
}

/// A sweep thinned to what a chart can show: least and greatest signal of each column, so that no peak is lost.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct Trace {
    /// Scan detuning of each column, Hz, ascending.
    pub detuning: Vec<f64>,
    /// Least signal in the column, V less the dark level.
    pub low: Vec<f64>,
    /// Greatest signal in the column, V less the dark level.
    pub high: Vec<f64>,
    /// Where the fitted modes stand on this axis, Hz: (mode index in `modes`, detuning), every order shown.
    pub marks: Vec<(usize, f64)>,
}
