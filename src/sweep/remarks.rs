//! Refusals and warnings of the engine, each a plain sentence that says what to do.
//! Must not decide when they apply.
//! Main types: [`Refusal`], [`Warning`].

use std::fmt;

/// Why a capture, or its spacing, cannot be measured.
#[derive(Debug, Clone, PartialEq)]
pub enum Refusal {
    /// Too few samples on one ramp.
    TooShort {
        /// Samples on the longest ramp.
        samples: usize,
    },
    /// A sample is no finite number.
    NotFinite {
        /// Its place in the capture, from 0.
        sample: usize,
    },
    /// Nothing stands above the noise.
    Dark,
    /// More peaks than any comb has.
    Clutter {
        /// Peaks on one ramp.
        count: usize,
    },
    /// Broad fringes, no peaks.
    Fringes {
        /// Width of the bumps over their distance.
        share: f64,
    },
    /// The peaks do not repeat: no frequency scale.
    OneOrder,
    /// Peaks do not form orders that repeat.
    NoRepeat {
        /// Share of the peaks' height that repeats.
        share: f64,
    },
    /// The repeating peaks form no comb.
    NoComb {
        /// Share of their height that fits the best comb.
        share: f64,
    },
    /// Two combs fit equally well.
    Ambiguous {
        /// One spacing, Hz.
        first: f64,
        /// The other, Hz.
        second: f64,
        /// The nominal spacing given, which is near neither, Hz.
        nominal: Option<f64>,
    },
    /// One mode an order.
    OneMode,
    /// The fit did not come to rest.
    NoFit,
    /// The scale is not determined by what was seen.
    WeakScale,
    /// The detector follows the ramp so slowly that lines run into each other.
    FarTooSlow {
        /// Its time constant over the time the ramp takes for one line.
        ratio: f64,
    },
    /// The digitizer has too few steps on the highest peak.
    FewLevels {
        /// Steps from the baseline to the highest peak.
        levels: f64,
    },
    /// Modes change in height from order to order, not all alike.
    Unsteady {
        /// Greatest change of one against the others, as a share.
        change: f64,
    },
    /// A whole part or a multiple of the nominal spacing.
    FalseComb {
        /// The spacing found, Hz.
        spacing: f64,
        /// The nominal one, Hz.
        nominal: f64,
    },
    /// Without a ramp channel, and the record is not one ramp without a turn.
    NoTurn,
    /// A setting is not usable.
    Setting(String),
}

impl fmt::Display for Refusal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::TooShort { samples } => {
                write!(f, "the longest ramp has {samples} samples; at least 100 are needed: record more samples a ramp")
            }
            Self::NotFinite { sample } => write!(f, "sample {sample} is not a finite number; record the capture again"),
            Self::Dark => {
                write!(f, "no peak stands above the noise: is the tube lit and the beam on the interferometer?")
            }
            Self::Clutter { count } => write!(
                f,
                "clutter: {count} peaks on one ramp, more than any comb has; realign the interferometer, or reduce the ramp"
            ),
            Self::Fringes { share } => write!(
                f,
                "broad fringes, no peaks: the bumps are {:.0} % as wide as their distance; a finesse of 6 or more is needed",
                share * 100.0
            ),
            Self::OneOrder => write!(
                f,
                "one order only: nothing repeats, so there is no frequency scale; raise the ramp until every mode shows twice"
            ),
            Self::NoRepeat { share } => write!(
                f,
                "the peaks do not repeat: only {:.0} % of their height is found again one order on; raise the ramp until every mode \
                 shows twice, or realign the interferometer",
                share * 100.0
            ),
            Self::NoComb { share } => write!(
                f,
                "the peaks form no comb: only {:.0} % of their height fits evenly spaced modes; realign and repeat",
                share * 100.0
            ),
            Self::Ambiguous { first, second, nominal } => {
                write!(f, "spacings of {:.1} MHz and {:.1} MHz fit equally well", first / 1e6, second / 1e6)?;
                match nominal {
                    Some(nominal) => write!(f, ", and neither is near the nominal {:.1} MHz", nominal / 1e6)?,
                    None => write!(f, "; give the nominal spacing")?,
                }
                write!(f, ", or use an interferometer of another free spectral range")
            }
            Self::OneMode => write!(
                f,
                "one mode an order: a spacing needs two; take more captures while the tube walks, or remove the polarizer"
            ),
            Self::NoFit => write!(f, "the fit of the peaks did not come to rest; realign and repeat"),
            Self::WeakScale => write!(
                f,
                "the peaks seen do not fix the frequency scale; raise the ramp until every mode shows at least twice"
            ),
            Self::FarTooSlow { ratio } => write!(
                f,
                "the detector is far too slow for this ramp: its time constant is {ratio:.0} times what the ramp takes for one \
                 line; slow the ramp tenfold, or take the low-pass filter out"
            ),
            Self::FewLevels { levels } => write!(
                f,
                "the highest peak is only {levels:.0} steps of the digitizer high; raise the gain until it fills half of the range"
            ),
            Self::Unsteady { change } => write!(
                f,
                "one mode changes in height by {:.0} % against the others from order to order: the tube hopped or swapped in \
                 mid-sweep, or two captures were spliced; take another capture",
                change * 100.0
            ),
            Self::FalseComb { spacing, nominal } if spacing < nominal => write!(
                f,
                "the spacing reads {:.1} MHz, a whole part of the nominal {:.1} MHz: light between the modes looks like a comb of \
                 its own; realign, set the gain so that no peak is lost, and repeat",
                spacing / 1e6,
                nominal / 1e6
            ),
            Self::FalseComb { spacing, nominal } => write!(
                f,
                "the spacing reads {:.1} MHz, a multiple of the nominal {:.1} MHz: modes between those seen are missing; realign, \
                 set the gain so that no peak is lost, and repeat",
                spacing / 1e6,
                nominal / 1e6
            ),
            Self::NoTurn => write!(
                f,
                "no usable ramp channel, and the modes come out as if the ramp turned within the record; record the ramp, or at \
                 least two and a half of its periods"
            ),
            Self::Setting(what) => f.write_str(what),
        }
    }
}

/// What a reader of the result must know.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// No uncertainty was given for the free spectral range.
    NoFsrUncertainty,
    /// No ramp channel, or none that ramps.
    NoRamp,
    /// Flat tops were left out of the fit.
    Clipped {
        /// Samples left out.
        samples: usize,
    },
    /// The detector is slow for this ramp.
    SlowDetector {
        /// Its time constant, s.
        time_constant: f64,
    },
    /// Signal points down.
    Inverted,
    /// The spacing reads twice nominal.
    TwiceNominal,
    /// Peaks off the comb.
    OffAxis {
        /// How many an order.
        count: usize,
        /// Highest, of the strongest mode.
        ratio: f64,
    },
    /// Peaks that do not repeat were left out.
    Stray {
        /// How many.
        count: usize,
    },
    /// Orders differ in height.
    UnequalOrders,
    /// The comb departs from even spacing.
    UnevenComb {
        /// Root mean square departure, Hz.
        rms: f64,
    },
    /// Residuals are larger than the noise.
    Misfit {
        /// Reduced chi-square.
        chi_square: f64,
    },
    /// Fewer than two whole orders: the scale rests on a straight or bent line only.
    FewOrders,
    /// The digitizer's steps are coarser than the noise.
    CoarseSteps,
    /// The ramp was cut out by the repeat of the signal.
    OwnRepeat {
        /// Samples of one ramp period.
        period: f64,
    },
    /// A moving baseline was taken out.
    Baseline {
        /// How far it moved, of the highest peak.
        share: f64,
    },
    /// Modes change in height from order to order, not all alike, by less than what is refused.
    HeightsChange {
        /// Greatest change of one against the others, as a share.
        change: f64,
    },
}

impl fmt::Display for Warning {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NoFsrUncertainty => {
                write!(
                    f,
                    "no uncertainty given for the free spectral range: the stated uncertainty is that of the sweep alone"
                )
            }
            Self::NoRamp => write!(f, "no usable ramp channel: the whole capture was taken as one ramp"),
            Self::Clipped { samples } => {
                write!(f, "clipped tops: {samples} samples were left out of the fit; lower the gain")
            }
            Self::SlowDetector { time_constant } => write!(
                f,
                "the detector is slow for this ramp: time constant {:.3} ms taken out; slow the ramp",
                time_constant * 1e3
            ),
            Self::Inverted => write!(f, "the photodiode signal points downward; it was turned over"),
            Self::TwiceNominal => write!(
                f,
                "the spacing reads twice nominal: a polarizing element ahead of the interferometer hides alternate modes"
            ),
            Self::OffAxis { count, ratio } => write!(
                f,
                "{count} peak(s) an order off the comb, up to {:.1} % of the strongest mode: off-axis light or an \
                 interferometer ghost; realign and repeat",
                ratio * 100.0
            ),
            Self::Stray { count } => write!(f, "{count} peak(s) that do not repeat were left out"),
            Self::UnequalOrders => {
                write!(
                    f,
                    "alternate orders are unequal in height: the beam is matched on axis, or realign the interferometer"
                )
            }
            Self::UnevenComb { rms } => {
                write!(f, "the modes depart from even spacing by {:.2} MHz (root mean square)", rms / 1e6)
            }
            Self::Misfit { chi_square } => write!(
                f,
                "residuals exceed the noise (reduced chi-square {chi_square:.1}); uncertainties were raised accordingly"
            ),
            Self::FewOrders => write!(f, "two orders only: the curvature of the ramp rests on the comb itself"),
            Self::CoarseSteps => write!(f, "the digitizer's steps are coarser than the noise"),
            Self::OwnRepeat { period } => {
                write!(f, "one ramp was cut out by the signal's own repeat, every {period:.0} samples; record the ramp")
            }
            Self::Baseline { share } => write!(
                f,
                "the baseline moves by {:.0} % of the highest peak (mains, ambient light, coupling or the ramp itself); it was \
                 taken out: shield the photodiode",
                share * 100.0
            ),
            Self::HeightsChange { change } => write!(
                f,
                "one mode changes in height by {:.0} % against the others from order to order: the tube may have hopped in \
                 mid-sweep, or the gain is not linear; repeat",
                change * 100.0
            ),
        }
    }
}
