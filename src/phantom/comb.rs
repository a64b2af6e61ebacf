//! The modes of a tube at one moment: where they are, how strong, and on which axis.
//! Must not know the interferometer.
//! Main types: [`Comb`], [`Mode`].

use super::{
    gain::GainLine,
    tube::{Incident, TubeTruth},
    walk,
};
use crate::constants::{MODE_PULLING, SPEED_OF_LIGHT};

/// Spacing at which neighbouring modes would no longer share gain, Hz. Set so that total-power ripple is that of sound
/// tubes: 5–10 % at 127 mm, under 2 % at 200 mm, under 1 % at 330 mm (tables of measured tubes, common practice); a
/// model of shared spectral holes alone gives several times that.
const INDEPENDENT_SPACING: f64 = 10e9;
/// Cubic share of the pulling: leaves a comb of even spacing but for some tens of kilohertz, as beats of three modes
/// show (1–100 kHz, common practice).
const UNEVEN_PULLING: f64 = 0.1;
/// Phases over which a cycle is averaged.
const N_PHASES: u32 = 256;

/// The two families of a random-polarized tube.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Axis {
    /// On the strong axis.
    Strong,
    /// On the other.
    Across,
}

/// One axial mode.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Mode {
    /// Longitudinal number, counted from an arbitrary one; the same mode keeps it while it walks.
    pub number: i64,
    /// Frequency less line centre, with pulling, Hz.
    pub detuning: f64,
    /// Output, W.
    pub power: f64,
    /// Its polarization.
    pub axis: Axis,
}

/// The comb of one tube.
#[derive(Debug, Clone, PartialEq)]
pub struct Comb {
    line: GainLine,
    /// c/2L, Hz.
    spacing: f64,
    competition: f64,
    phase: f64,
    /// Mean over a cycle of the summed output, without and with competition.
    reference: f64,
    mean_output: f64,
    /// Strongest mode at the best phase over the mean total; 0 below threshold.
    highest_output: f64,
}

impl Comb {
    /// The comb of a tube whose cold comb stands at `phase` spacings.
    pub fn new(tube: &TubeTruth, phase: f64) -> Self {
        let line = GainLine::new(tube.gas_temperature, tube.gain_ratio, tube.homogeneous_half_width);
        let spacing = SPEED_OF_LIGHT.value / (2.0 * tube.mirror_spacing);
        let competition = (1.0 - spacing / INDEPENDENT_SPACING).clamp(0.0, 1.0);
        let mut comb =
            Self { line, spacing, competition, phase, reference: 1.0, mean_output: 1.0, highest_output: 0.0 };
        let places: Vec<f64> = (0..N_PHASES).map(|k| f64::from(k) / f64::from(N_PHASES)).collect();
        let n = f64::from(N_PHASES);
        // First the mean of independent modes, to which competition holds; then the mean that results.
        comb.reference =
            places.iter().map(|&place| comb.independent(place).map(|mode| mode.2).sum::<f64>()).sum::<f64>() / n;
        let outputs: Vec<f64> = places.iter().flat_map(|&place| comb.outputs(place)).map(|mode| mode.2).collect();
        let mean = outputs.iter().sum::<f64>() / n;
        if mean > 0.0 {
            comb.mean_output = mean;
            comb.highest_output = outputs.iter().copied().fold(0.0, f64::max) / mean;
        }
        comb
    }

    /// c/2L, Hz.
    pub fn empty_spacing(&self) -> f64 {
        self.spacing
    }

    /// Spacing of the pulled comb, Hz: what an interferometer shows.
    pub fn mode_spacing(&self) -> f64 {
        self.spacing * (1.0 - MODE_PULLING.value)
    }

    /// The gain line.
    pub fn line(&self) -> &GainLine {
        &self.line
    }

    /// Output of the strongest mode at the best phase, over mean total output.
    pub fn highest_share(&self) -> f64 {
        self.highest_output
    }

    /// Place of the comb in mode spacings, falling as the tube grows; includes hops.
    pub fn place(&self, tube: &TubeTruth, seconds: f64) -> f64 {
        let hops: f64 = tube
            .incidents
            .iter()
            .map(|incident| match *incident {
                Incident::Hop { at, size } if seconds >= at => size,
                _ => 0.0,
            })
            .sum();
        self.phase - walk::cycles(tube, seconds) + hops / self.spacing
    }

    /// The modes at a time since first light, ascending in frequency. Empty below threshold.
    pub fn modes(&self, tube: &TubeTruth, seconds: f64) -> Vec<Mode> {
        let outputs = self.outputs(self.place(tube, seconds));
        let scale = tube.power * walk::output_share(tube, seconds) / self.mean_output;
        let swapped = tube
            .incidents
            .iter()
            .filter(|incident| matches!(incident, Incident::Swap { at } if seconds >= *at))
            .count()
            % 2
            == 1;
        let mode = |(number, detuning, output): (i64, f64, f64)| {
            let odd = match tube.swap_detuning {
                // One place under the line decides the axis: the family changes as a mode walks past it.
                Some(place) => ((detuning - place) / self.spacing).floor() as i64,
                None => number,
            }
            .rem_euclid(2)
                == 1;
            let axis = if !tube.single_axis && (odd != swapped) { Axis::Across } else { Axis::Strong };
            Mode { number, detuning: self.pulled(detuning), power: output * scale, axis }
        };
        outputs.into_iter().map(mode).collect()
    }

    /// Modes without competition at a place of the comb: (number, detuning, output).
    fn independent(&self, place: f64) -> impl Iterator<Item = (i64, f64, f64)> + use<> {
        let (line, spacing) = (self.line, self.spacing);
        let half = line.half_range() / spacing;
        let first = (-half - place).ceil() as i64;
        let last = (half - place).floor() as i64;
        (first..=last).map(move |number| {
            let detuning = (number as f64 + place) * spacing;
            (number, detuning, line.output(detuning))
        })
    }

    /// Modes with competition: all are scaled alike, so that the total hardly changes as the comb walks.
    ///
    /// I_j = I_j⁰ · (⟨S⟩/S)^κ with S the sum of independent outputs, ⟨S⟩ its mean over a cycle, κ = 1 − Δν/10 GHz: the
    /// nearer the modes, the more of the gain they share. κ is empirical (see [`INDEPENDENT_SPACING`]).
    fn outputs(&self, place: f64) -> Vec<(i64, f64, f64)> {
        let mut modes: Vec<_> = self.independent(place).collect();
        let sum: f64 = modes.iter().map(|mode| mode.2).sum();
        if sum > 0.0 {
            let factor = (self.reference / sum).powf(self.competition);
            modes.iter_mut().for_each(|mode| mode.2 *= factor);
        }
        modes
    }

    /// A mode's frequency with the pull of the line's dispersion toward its centre.
    fn pulled(&self, detuning: f64) -> f64 {
        let x = detuning / self.line.doppler;
        detuning * (1.0 - MODE_PULLING.value * (1.0 - UNEVEN_PULLING * x * x))
    }
}
