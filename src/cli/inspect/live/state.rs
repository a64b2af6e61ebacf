//! What the live block shows, as plain data.
//! Must not draw.
//! Main type: [`State`].

use crate::record::finding::{CaptureFinding, Trace};
use crate::record::sheet::WalkChart;

/// All of it at one moment.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct State {
    /// Step at hand.
    pub step: String,
    /// Its number, from 1.
    pub step_number: usize,
    /// Steps of the recipe.
    pub n_steps: usize,
    /// Captures so far.
    pub captures: u64,
    /// Bench time since the run was opened, s.
    pub elapsed_s: f64,
    /// Bench time to the end of the step and of the run, s, where they can be said.
    pub left_s: (Option<f64>, Option<f64>),
    /// Bench seconds in one second of wall time, where they differ.
    pub rate: Option<f64>,
    /// The latest sweep.
    pub sweep: Option<Sweep>,
    /// The walk so far.
    pub walk: Option<WalkChart>,
}

/// A sweep as the block shows it.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Sweep {
    /// Its number in the run.
    pub number: u64,
    /// The thinned trace; none if no axis was found in it.
    pub trace: Option<Trace>,
    /// Signal that fills the whole height, V: one height for a whole step, so that modes are seen to rise and fall.
    pub top: f64,
    /// Axial modes; marks of the trace from this index on are off the comb.
    pub n_modes: usize,
    /// Peaks off the comb.
    pub n_off_axis: usize,
    /// Mode spacing, Hz.
    pub mode_spacing: Option<f64>,
    /// Whether there is anything to see.
    pub seen: Seen,
}

/// Whether a sweep shows anything.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub(super) enum Seen {
    /// Modes.
    #[default]
    Light,
    /// No light.
    Dark,
    /// Nothing could be measured, for this reason.
    Refused(String),
}

impl Sweep {
    /// From what was measured.
    ///
    /// * `top`: greatest signal of the sweeps before in the same step, V.
    pub fn of(number: u64, finding: &CaptureFinding, trace: Option<Trace>, top: f64) -> Self {
        let seen = match &finding.refused {
            Some(reason) => Seen::Refused(reason.clone()),
            None if finding.dark => Seen::Dark,
            None => Seen::Light,
        };
        let highs = trace.iter().flat_map(|trace| &trace.high).copied();
        let top = highs.filter(|high| high.is_finite()).fold(top, f64::max);
        Self {
            number,
            trace,
            top,
            n_modes: finding.modes.len(),
            n_off_axis: finding.off_axis.len(),
            mode_spacing: finding.mode_spacing.filter(|spacing| spacing.is_finite()),
            seen,
        }
    }
}
