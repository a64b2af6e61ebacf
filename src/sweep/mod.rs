//! One capture of a scanned interferometer → scale → peaks → comb → what it says of the tube, with remarks.
//! Must not open a file, and never takes volts for hertz: the repeat of the orders is the frequency scale.
//! Main entry: [`measure`]; main type: [`Measurement`].

mod airy;
mod assign;
mod axis;
mod comb;
mod detect;
mod fitted;
mod flatten;
mod global;
mod lag;
mod lines;
mod measure;
mod model;
mod orders;
mod outcome;
mod refine;
mod remarks;
mod repeat;
mod samples;
mod segment;
mod separable;
mod shared;
mod steady;
mod trace;

pub use measure::measure;
pub use remarks::{Refusal, Warning};
pub use shared::SharedAxis;
pub use trace::{ThinTrace, thin_trace};

use crate::uncertainty::Measured;

/// Version of the engine, stored with every finding.
pub const ENGINE: &str = concat!("sweep-", env!("CARGO_PKG_VERSION"));

/// What must be known beside the capture.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Free spectral range of the interferometer, Hz.
    pub free_spectral_range: f64,
    /// Its relative standard uncertainty.
    pub u_free_spectral_range: f64,
    /// Nominal mode spacing of the type, Hz: settles assignments that fit equally well, never the value.
    pub nominal_spacing: Option<f64>,
    /// A mode counts if its area exceeds this share of the strongest.
    pub mode_floor: f64,
    /// Source id of the free spectral range in budgets: the certificate's number.
    pub fsr_source_id: String,
}

/// One peak an order, as fitted.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Mode {
    /// Position on the scan axis against a fixed ramp voltage, folded into [0, FSR), Hz; ascending with ramp voltage.
    pub position: f64,
    /// Its standard uncertainty, Hz.
    pub u_position: f64,
    /// Offset from the first mode after the largest gap, Hz.
    pub offset: f64,
    /// Its standard uncertainty, Hz.
    pub u_offset: f64,
    /// Height in the main photodiode, V, mean over the orders.
    pub peak_height: f64,
    /// Its standard uncertainty, V.
    pub u_peak_height: f64,
    /// Height over that of the strongest mode, both photodiodes together.
    pub relative_height: f64,
    /// Area of all light, both photodiodes together, V·Hz: π/2 · height · FWHM of a Lorentzian.
    pub area: f64,
    /// Full width at half maximum with the detector's pole out, Hz.
    pub fwhm: f64,
    /// Height in the crossed photodiode, V.
    pub crossed_height: Option<f64>,
    /// Where on the ramp it was seen, once an order.
    pub places: Vec<Place>,
    /// Standard uncertainty of one such place, V.
    pub u_ramp: f64,
}

/// A mode in one order.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    /// Ramp voltage, V (seconds since the capture's first sample where there is no ramp channel).
    pub ramp: f64,
    /// Order, ascending with ramp voltage; its zero means nothing.
    pub order: i32,
}

/// What one capture says.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Measurement {
    /// Why nothing at all can be measured.
    pub refused: Option<Refusal>,
    /// Why there is no spacing although peaks were measured: one mode an order, two combs that fit equally well.
    pub no_spacing: Option<Refusal>,
    /// Remarks that a reader must see.
    pub warnings: Vec<Warning>,
    /// Spacing of neighbouring axial modes, Hz.
    pub mode_spacing: Option<Measured>,
    /// Axial modes, ascending with rising ramp voltage from the first after the largest gap.
    pub modes: Vec<Mode>,
    /// Axial modes whose area exceeds the floor; weaker ones are listed, not counted.
    pub mode_count: usize,
    /// Peaks off the comb, in the same form.
    pub off_axis: Vec<Mode>,
    /// Orders seen, whole or in part.
    pub order_count: u32,
    /// FSR over FWHM, the detector's pole taken out.
    pub finesse: Option<f64>,
    /// FSR over the width as recorded.
    pub finesse_apparent: Option<f64>,
    /// Free spectral range used, Hz.
    pub free_spectral_range: f64,
    /// Nothing above the noise.
    pub dark: bool,
    /// Mean of the signal above the baseline, V.
    pub mean_level: Option<f64>,
    /// Standard deviation of the noise, V.
    pub noise: Option<f64>,
    /// Ramp voltage at both ends of the ramp that was measured, V, in the order of time; none without a ramp channel.
    pub ramp_ends: Option<(f64, f64)>,
    /// The scan axis found, for drawing.
    pub axis: Option<ScanAxis>,
}

/// Scan detuning against sample position, of the ramp that was measured.
#[derive(Debug, Clone, PartialEq)]
pub struct ScanAxis {
    /// First sample of the measured ramp.
    pub start: usize,
    /// One past its last sample.
    pub end: usize,
    /// Legendre coefficients over the ramp mapped to [−1, 1], Hz, zero at the reference voltage.
    pub coefficients: Vec<f64>,
    /// The detuning rises with time (rising ramp).
    pub rising: bool,
    /// The signal points downward.
    pub inverted: bool,
    /// Fitted baseline, V, in the middle of the ramp.
    pub baseline: f64,
}

impl ScanAxis {
    /// Scan detuning at a sample position, Hz.
    pub fn detuning(&self, sample: f64) -> f64 {
        let half = (self.end - self.start).max(2) as f64 / 2.0;
        axis::legendre_sum(&self.coefficients, (sample - self.start as f64 - half) / half)
    }
}
