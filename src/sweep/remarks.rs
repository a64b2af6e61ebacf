//! Refusals and warnings of the engine, each a plain sentence that says what to do.
//! Must not decide when they apply.
//! Main types: [`Refusal`], [`Warning`].

use std::fmt;

use crate::phrase::{Saying, figure, outside};

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

impl Refusal {
    /// The refusal from the table of sentences. Stored events hold its English, which is known again there.
    pub fn saying(&self) -> Saying {
        let megahertz = |hertz: f64| figure(format!("{:.1}", hertz / 1e6));
        let percent = |share: f64| figure(format!("{:.0}", share * 100.0));
        match self {
            Self::TooShort { samples } => outside::TOO_SHORT.with([figure(samples)]),
            Self::NotFinite { sample } => outside::NOT_FINITE.with([figure(sample)]),
            Self::Dark => (&outside::DARK).into(),
            Self::Clutter { count } => outside::CLUTTER.with([figure(count)]),
            Self::Fringes { share } => outside::FRINGES.with([percent(*share)]),
            Self::OneOrder => (&outside::ONE_ORDER).into(),
            Self::NoRepeat { share } => outside::NO_REPEAT.with([percent(*share)]),
            Self::NoComb { share } => outside::NO_COMB.with([percent(*share)]),
            Self::Ambiguous { first, second, nominal: Some(nominal) } => {
                outside::AMBIGUOUS_NEAR.with([megahertz(*first), megahertz(*second), megahertz(*nominal)])
            }
            Self::Ambiguous { first, second, nominal: None } => {
                outside::AMBIGUOUS.with([megahertz(*first), megahertz(*second)])
            }
            Self::OneMode => (&outside::ONE_MODE).into(),
            Self::NoFit => (&outside::NO_FIT).into(),
            Self::WeakScale => (&outside::WEAK_SCALE).into(),
            Self::FarTooSlow { ratio } => outside::FAR_TOO_SLOW.with([figure(format!("{ratio:.0}"))]),
            Self::FewLevels { levels } => outside::FEW_LEVELS.with([figure(format!("{levels:.0}"))]),
            Self::Unsteady { change } => outside::UNSTEADY.with([percent(*change)]),
            Self::FalseComb { spacing, nominal } => {
                let phrase = if spacing < nominal { &outside::FALSE_COMB_PART } else { &outside::FALSE_COMB_MULTIPLE };
                phrase.with([megahertz(*spacing), megahertz(*nominal)])
            }
            Self::NoTurn => (&outside::NO_TURN).into(),
            Self::Setting(what) => Saying::outside(what),
        }
    }
}

impl fmt::Display for Refusal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.saying().english())
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::phrase::Language;

    /// Every refusal but a setting, which no stored event can hold.
    fn all() -> [Refusal; 20] {
        let combs = |nominal| Refusal::Ambiguous { first: 300.1e6, second: 150.04e6, nominal };
        [
            Refusal::TooShort { samples: 12 },
            Refusal::NotFinite { sample: 0 },
            Refusal::Dark,
            Refusal::Clutter { count: 77 },
            Refusal::Fringes { share: 0.4 },
            Refusal::OneOrder,
            Refusal::NoRepeat { share: 0.125 },
            Refusal::NoComb { share: 0.5 },
            combs(None),
            combs(Some(999.3e6)),
            Refusal::OneMode,
            Refusal::NoFit,
            Refusal::WeakScale,
            Refusal::FarTooSlow { ratio: 31.4 },
            Refusal::FewLevels { levels: 3.0 },
            Refusal::Unsteady { change: 0.31 },
            Refusal::FalseComb { spacing: 499.6e6, nominal: 999.3e6 },
            Refusal::FalseComb { spacing: 1998.6e6, nominal: 999.3e6 },
            Refusal::NoTurn,
            Refusal::Setting(String::new()),
        ]
    }

    #[test]
    fn what_is_stored_is_known_again_in_every_language() {
        for refusal in all() {
            let again = Saying::outside(&refusal.to_string());
            assert_eq!(again.english(), refusal.to_string());
            assert_eq!(again.text(Language::German), refusal.saying().text(Language::German));
            assert!(matches!(refusal, Refusal::Setting(_)) || again.text(Language::German) != again.english());
        }
    }
}
