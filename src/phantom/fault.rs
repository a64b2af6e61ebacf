//! Faults of tubes and supplies: each is a change of what is true of the tube, by an amount.
//! Must not leave a name behind: whoever measures the tube sees only what it does.
//! Main types: [`Fault`], [`FaultKind`]; the table: [`FAULT_KINDS`].

use std::str::FromStr;

use super::{gain::output_ratio, scenario::nearest_word, tube::TubeTruth};
use crate::{
    constants::{BOROSILICATE, RED_LINE},
    quantity::{Dimension, QuantityError, parse_as},
};

/// A kind of fault.
#[derive(Debug, Clone, Copy)]
pub struct FaultKind {
    /// Its name in scenario files and on the command line.
    pub word: &'static str,
    /// What the amount measures.
    pub dimension: Dimension,
    /// Least and greatest amount, SI, inclusive.
    pub bounds: (f64, f64),
    /// The same in words.
    pub range: &'static str,
    /// What the amount is, and what the fault does.
    pub about: &'static str,
    /// The change.
    act: fn(&mut TubeTruth, f64),
}

/// Every kind of fault.
pub const FAULT_KINDS: &[FaultKind] = &[
    FaultKind {
        word: "helium-lost",
        dimension: Dimension::Ratio,
        bounds: (0.0, 1.0),
        range: "0 to 100 %",
        about: "share of the helium lost: less gain and light, deeper red-orange",
        act: helium_lost,
    },
    FaultKind {
        word: "wide-bore",
        dimension: Dimension::Ratio,
        bounds: (0.0, 0.5),
        range: "0 to 50 %",
        about: "bore wider than designed: off-axis light at ordinary power",
        act: wide_bore,
    },
    FaultKind {
        word: "walked-mirror",
        dimension: Dimension::Angle,
        bounds: (0.0, 5e-3),
        range: "0 to 5 mrad",
        about: "tilt of one mirror: more loss; power rises when its mount is pressed one way",
        act: walked_mirror,
    },
    FaultKind {
        word: "axis-swaps",
        dimension: Dimension::Frequency,
        bounds: (-2e9, 2e9),
        range: "-2 to 2 GHz",
        about: "detuning at which the axes are exchanged in every cycle; 0 is line centre",
        act: axis_swaps,
    },
    FaultKind {
        word: "mirror-distance",
        dimension: Dimension::Length,
        bounds: (-0.1, 0.1),
        range: "-100 to 100 mm",
        about: "mirrors further apart (or nearer, below zero) than they should be",
        act: mirror_distance,
    },
    FaultKind {
        word: "draught",
        dimension: Dimension::Temperature,
        bounds: (0.0, 50.0),
        range: "0 to 50 K",
        about: "amplitude of a wandering temperature: the comb never settles",
        act: draught,
    },
    FaultKind {
        word: "supply-ripple",
        dimension: Dimension::Ratio,
        bounds: (0.0, 0.5),
        range: "0 to 50 %",
        about: "rms ripple of the light at twice the mains frequency",
        act: supply_ripple,
    },
    FaultKind {
        word: "air-leak",
        dimension: Dimension::Ratio,
        bounds: (0.0, 1.0),
        range: "0 to 100 %",
        about: "share of air in the gas: power rises, peaks, falls; pinkish to white; hard start; voltage up or down",
        act: air_leak,
    },
    FaultKind {
        word: "wear",
        dimension: Dimension::Ratio,
        bounds: (0.0, 1.0),
        range: "0 to 100 %",
        about: "share of the cathode spent: run voltage and dropout current risen, film near the cathode",
        act: wear,
    },
];

/// One fault: a kind and how much of it.
#[derive(Debug, Clone, Copy)]
pub struct Fault {
    kind: &'static FaultKind,
    amount: f64,
}

/// Why a text names no fault.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum FaultError {
    /// No amount.
    #[error("`{0}` has no amount; expected a kind and an amount such as `helium-lost = 45 %`")]
    NoAmount(String),
    /// Not a kind.
    #[error("`{given}` is no kind of fault; the nearest known one is `{nearest}`")]
    Unknown {
        /// What was given.
        given: String,
        /// The nearest known kind.
        nearest: &'static str,
    },
    /// Not an amount of that kind.
    #[error("`{kind}`: {source}")]
    Amount {
        /// The kind.
        kind: &'static str,
        /// What is wrong with it.
        source: QuantityError,
    },
    /// More, or less, than there can be.
    #[error("`{kind}` is {given}; expected {range}, both inclusive")]
    OutOfRange {
        /// The kind.
        kind: &'static str,
        /// What was given.
        given: String,
        /// What would do.
        range: &'static str,
    },
}

impl FromStr for Fault {
    type Err = FaultError;

    /// Reads `KIND = AMOUNT`.
    fn from_str(text: &str) -> Result<Self, FaultError> {
        let Some((word, amount)) = text.split_once('=') else { return Err(FaultError::NoAmount(text.trim().into())) };
        let (word, given) = (word.trim(), amount.trim());
        let Some(kind) = FAULT_KINDS.iter().find(|kind| kind.word == word) else {
            let nearest = nearest_word(word, FAULT_KINDS.iter().map(|kind| kind.word)).unwrap_or_default();
            return Err(FaultError::Unknown { given: word.into(), nearest });
        };
        let amount =
            parse_as(given, kind.dimension).map_err(|source| FaultError::Amount { kind: kind.word, source })?;
        Self::new(kind, amount).ok_or(FaultError::OutOfRange {
            kind: kind.word,
            given: given.into(),
            range: kind.range,
        })
    }
}

impl Fault {
    /// A fault of a kind by an amount, SI. None where the amount is out of the kind's bounds.
    pub fn new(kind: &'static FaultKind, amount: f64) -> Option<Self> {
        (amount >= kind.bounds.0 && amount <= kind.bounds.1).then_some(Self { kind, amount })
    }

    /// Makes the change. An amount of zero changes nothing (of `axis-swaps`: swaps at line centre).
    pub fn befall(&self, tube: &mut TubeTruth) {
        (self.kind.act)(tube, self.amount);
    }
}

/// Changes the gain over loss by a factor, and the output with it.
fn scale_gain(tube: &mut TubeTruth, factor: f64) {
    let before = tube.gain_ratio;
    tube.gain_ratio *= factor;
    tube.power *= output_ratio(before, tube.gain_ratio);
}

/// Share of the homogeneous width that no helium takes away: the natural width (from memory).
const NATURAL_SHARE: f64 = 0.1;

/// With the helium h that is left: gain ∝ √h, since fewer metastable atoms pump the neon but electrons grow hotter as the
/// pressure falls; homogeneous width ∝ h but for its natural share, and with it the output that a gain yields, as the
/// holes that light burns grow narrow. Both from memory; signs as in tables of fault signatures (common practice).
fn helium_lost(tube: &mut TubeTruth, lost: f64) {
    tube.condition.helium *= 1.0 - lost;
    scale_gain(tube, (1.0 - lost).sqrt());
    let narrower = 1.0 - lost * (1.0 - NATURAL_SHARE);
    tube.homogeneous_half_width *= narrower;
    tube.power *= narrower;
}

/// How far short of threshold the bore that was designed leaves the first transverse mode.
const TRANSVERSE_MARGIN: f64 = 1.15;
/// 2a²/w² of that bore: it is about three and a half beam radii wide (common practice).
const DESIGN_APERTURE: f64 = 6.0;
/// Output of a transverse mode over that of an axial one with the same excess gain: they share part of the bore. A figure
/// of the model.
const TRANSVERSE_SHARE: f64 = 0.5;

/// The first transverse mode loses (1 + x)·e^(−x), x = 2a²/w², at a bore of radius a (share of a TEM01 doughnut outside
/// an aperture, by integration of its intensity); its gain over loss falls short of threshold in the bore that was
/// designed, and its height follows its excess gain in a wider one.
fn wide_bore(tube: &mut TubeTruth, wider: f64) {
    tube.condition.bore *= 1.0 + wider;
    let outside = |x: f64| (1.0 + x) * (-x).exp();
    let loss = outside(DESIGN_APERTURE * tube.condition.bore.powi(2)) / outside(DESIGN_APERTURE);
    let extra = (TRANSVERSE_MARGIN * tube.gain_ratio - 1.0).max(0.0);
    let share = TRANSVERSE_SHARE * output_ratio(tube.gain_ratio, tube.gain_ratio / (1.0 + extra * loss));
    tube.off_axis_share = tube.off_axis_share.max(share);
}

fn walked_mirror(tube: &mut TubeTruth, tilt: f64) {
    let before = tube.condition.tilt_loss(0.0);
    tube.condition.mirror_tilt += tilt;
    scale_gain(tube, before / tube.condition.tilt_loss(0.0));
}

fn axis_swaps(tube: &mut TubeTruth, detuning: f64) {
    tube.swap_detuning = Some(detuning);
}

/// Shortest distance of mirrors that can be simulated, m.
const SHORTEST: f64 = 0.02;

/// Walk from cold to rest goes with the length: N∞ = αLΔT/(λ/2).
fn mirror_distance(tube: &mut TubeTruth, further: f64) {
    let before = tube.mirror_spacing;
    tube.mirror_spacing = (before + further).max(SHORTEST);
    tube.walk_cycles *= tube.mirror_spacing / before;
}

/// Walk αLΔT/(λ/2) of the comb for a temperature ΔT, in mode spacings (geometry).
fn draught(tube: &mut TubeTruth, kelvin: f64) {
    tube.draught_cycles += BOROSILICATE.value * tube.mirror_spacing * kelvin / (0.5 * RED_LINE.value);
}

fn supply_ripple(tube: &mut TubeTruth, ripple: f64) {
    tube.line_ripple = tube.line_ripple.hypot(ripple);
}

/// Air that doubles the time to start, and air for each further strike. Figures of the model: small shares of air make
/// starting a good deal harder (common practice).
const SLOWING_AIR: f64 = 0.002;
const AIR_A_STRIKE: f64 = 0.01;

fn air_leak(tube: &mut TubeTruth, air: f64) {
    let before = tube.condition.gain_in_all_air();
    tube.condition.air += air;
    scale_gain(tube, tube.condition.gain_in_all_air() / before);
    tube.start_delay *= 1.0 + air / SLOWING_AIR;
    tube.tries += (air / AIR_A_STRIKE) as u64;
}

/// Run voltage of a tube at its end over that of a new one, less 1: + 10 % in high use, + 25 % at the end (common
/// practice).
const VOLTAGE_AT_END: f64 = 0.25;
/// Dropout current at the end over the run current: it rises up to it (common practice).
const DROPOUT_AT_END: f64 = 0.98;
/// Gain lost at the end, and its rise with the fourth power: power is flat for most of a tube's life (common practice).
const GAIN_LOST_AT_END: f64 = 0.4;
/// Time to start at the end over that of a new tube, less 1. A figure of the model: very hard start (common practice).
const DELAY_AT_END: f64 = 9.0;

fn wear(tube: &mut TubeTruth, spent: f64) {
    let before = tube.condition.cathode_spent;
    tube.condition.cathode_spent = (before + spent).min(1.0);
    let spent = tube.condition.cathode_spent - before;
    tube.run_voltage *= 1.0 + VOLTAGE_AT_END * spent;
    tube.dropout_current += (DROPOUT_AT_END * tube.run_current - tube.dropout_current).max(0.0) * spent;
    tube.start_delay *= 1.0 + DELAY_AT_END * spent.powi(3);
    scale_gain(tube, 1.0 - GAIN_LOST_AT_END * spent.powi(4));
}
