//! From what is out of its limits, and what was seen, to the likely cause (practice of the trade; sizes are the limits').
//! Must not judge, and must not name a cause where none fits, or two fit equally.
//! Main types: [`Sign`], [`Cause`]; main function: [`likely_cause`].

/// One thing found about a tube. Keys are those of measurands, or `visual.<step>`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sign<'a> {
    /// Below its limit.
    Low(&'a str),
    /// Above its limit.
    High(&'a str),
    /// Inside its limits.
    Normal(&'a str),
    /// It has a value, inside its limits or not.
    Measured(&'a str),
    /// About twice the middle of its limits.
    Twice(&'a str),
    /// What a person saw: key, word.
    Seen(&'a str, &'a str),
}

/// A likely cause.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Cause {
    /// Air leaked in.
    Contamination,
    /// Helium went through the glass.
    HeliumLost,
    /// The cathode is worn.
    Wear,
    /// A mirror is out of line.
    MirrorWalkedOff,
    /// A mirror is covered by cathode metal.
    MirrorSputtered,
    /// The discharge burns beside the bore.
    BrokenBore,
    /// Film or dirt on the window inside the resonator.
    WindowFilm,
    /// Bore or mirror lets transverse modes lase.
    Bore,
    /// Another type of tube.
    WrongType,
    /// A polarizer hides every second mode.
    PolarizerInTheWay,
    /// The tube swaps axes.
    SwapsForLife,
}

/// One signature.
struct Signature {
    cause: Cause,
    /// Each of these groups must show one of its signs.
    needs: &'static [&'static [Sign<'static>]],
    /// Each of these that shows makes it likelier.
    supports: &'static [Sign<'static>],
    /// None of these may show.
    never: &'static [Sign<'static>],
}

const POWER_LOW: &[Sign<'static>] = &[Sign::Low("power")];
/// Colours that air gives.
const PALE: [Sign<'static>; 3] = [
    Sign::Seen("visual.discharge", "white"),
    Sign::Seen("visual.discharge", "pinkish"),
    Sign::Seen("visual.discharge", "bluish"),
];
const DEEP: Sign<'static> = Sign::Seen("visual.discharge", "deep red-orange");
/// Discharge or voltage not as they should be.
const STRANGE: &[Sign<'static>] =
    &[PALE[0], PALE[1], PALE[2], DEEP, Sign::Low("run_voltage"), Sign::High("run_voltage")];

/// The signatures. A tube's voltage may be low or high when air is in it: contamination never looks at its sign.
const SIGNATURES: &[Signature] = &[
    Signature {
        cause: Cause::Contamination,
        needs: &[
            POWER_LOW,
            &[PALE[0], PALE[1], PALE[2], Sign::Seen("visual.getter", "milky"), Sign::Seen("visual.getter", "brown")],
        ],
        supports: &[
            Sign::Seen("visual.getter", "milky"),
            Sign::Seen("visual.getter", "brown"),
            Sign::High("start_delay"),
            Sign::High("start_tries"),
        ],
        never: &[DEEP],
    },
    Signature {
        cause: Cause::HeliumLost,
        needs: &[POWER_LOW, &[DEEP]],
        supports: &[Sign::Low("lasing_span")],
        never: &[Sign::Seen("visual.getter", "milky"), Sign::Seen("visual.getter", "brown")],
    },
    Signature {
        cause: Cause::Wear,
        needs: &[&[Sign::High("run_voltage")], &[Sign::High("dropout_fraction"), Sign::High("dropout_current")]],
        supports: &[Sign::Low("power"), Sign::High("power_peak_current"), Sign::Seen("visual.cathode", "film")],
        // A worn cathode colours the discharge too.
        never: &[],
    },
    Signature {
        cause: Cause::MirrorWalkedOff,
        needs: &[POWER_LOW, &[Sign::Seen("visual.press_test", "rises")]],
        supports: &[],
        never: STRANGE,
    },
    Signature {
        cause: Cause::MirrorSputtered,
        needs: &[POWER_LOW, &[Sign::Seen("visual.cathode", "film"), Sign::Seen("visual.output_mirror", "film")]],
        supports: &[],
        never: STRANGE,
    },
    Signature {
        cause: Cause::BrokenBore,
        needs: &[&[Sign::Low("run_voltage")], &[Sign::Seen("visual.bore", "glow outside")]],
        supports: &[Sign::Low("power")],
        never: &[],
    },
    Signature {
        cause: Cause::WindowFilm,
        needs: &[POWER_LOW, &[Sign::Low("lasing_span")], &[Sign::Measured("extinction")]],
        supports: &[],
        never: STRANGE,
    },
    Signature { cause: Cause::Bore, needs: &[&[Sign::High("off_axis_ratio")]], supports: &[], never: &[] },
    Signature {
        cause: Cause::WrongType,
        needs: &[&[Sign::Low("mode_spacing"), Sign::High("mode_spacing")]],
        supports: &[],
        never: &[Sign::Twice("mode_spacing")],
    },
    Signature {
        cause: Cause::PolarizerInTheWay,
        needs: &[&[Sign::High("mode_spacing")], &[Sign::Twice("mode_spacing")]],
        supports: &[],
        never: &[],
    },
    Signature { cause: Cause::SwapsForLife, needs: &[&[Sign::High("swap_count")]], supports: &[], never: &[] },
];

impl Signature {
    /// Signs that speak for it; none where it does not fit, or says nothing about `explains`.
    fn weight(&self, signs: &[Sign<'_>], explains: &str) -> Option<usize> {
        let shows = |sign: &Sign<'static>| signs.contains(sign);
        let fits = self.needs.iter().all(|group| group.iter().any(shows)) && !self.never.iter().any(shows);
        let named = self.needs.iter().flat_map(|group| group.iter()).filter(|sign| shows(sign));
        let about = named.clone().any(|sign| sign.key() == explains);
        // A support that is needed already counts once.
        let needed: Vec<&Sign<'static>> = named.collect();
        let more = self.supports.iter().filter(|sign| shows(sign) && !needed.contains(sign)).count();
        (fits && about).then_some(needed.len() + more)
    }
}

impl<'a> Sign<'a> {
    fn key(&self) -> &'a str {
        match self {
            Self::Low(key) | Self::High(key) | Self::Normal(key) | Self::Measured(key) | Self::Twice(key) => key,
            Self::Seen(key, _) => key,
        }
    }
}

/// The likely cause of what is out of its limits; none where no signature fits, or two fit equally well.
///
/// * `signs`: all that was found, what is inside its limits too.
/// * `explains`: key of the finding to be explained; a cause says something about it.
pub fn likely_cause(signs: &[Sign<'_>], explains: &str) -> Option<Cause> {
    let mut fitting: Vec<(usize, Cause)> =
        SIGNATURES.iter().filter_map(|one| Some((one.weight(signs, explains)?, one.cause))).collect();
    fitting.sort_by_key(|(weight, _)| std::cmp::Reverse(*weight));
    match fitting[..] {
        [(best, _), (next, _), ..] if best == next => None,
        [(_, cause), ..] => Some(cause),
        [] => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SOUND_LOOKS: [Sign<'static>; 3] = [
        Sign::Seen("visual.discharge", "salmon"),
        Sign::Seen("visual.getter", "bright"),
        Sign::Seen("visual.output_mirror", "clean"),
    ];

    /// Signs beside sound looks and voltage, unless they replace them.
    fn with<'a>(signs: &[Sign<'a>]) -> Vec<Sign<'a>> {
        let sound = SOUND_LOOKS.into_iter().chain([Sign::Normal("run_voltage")]);
        let kept = sound.filter(|sound| signs.iter().all(|sign| sign.key() != sound.key()));
        kept.chain(signs.iter().copied()).collect()
    }

    #[test]
    fn every_signature_of_the_trade_names_its_cause() {
        let colour = |word| Sign::Seen("visual.discharge", word);
        let cases: [(&[Sign<'_>], &str, Cause); 11] = [
            (&[Sign::Low("power"), colour("bluish"), Sign::High("start_tries")], "power", Cause::Contamination),
            (&[Sign::Low("power"), colour("deep red-orange")], "power", Cause::HeliumLost),
            (&[Sign::High("run_voltage"), Sign::High("dropout_fraction")], "run_voltage", Cause::Wear),
            (&[Sign::Low("power"), Sign::Seen("visual.press_test", "rises")], "power", Cause::MirrorWalkedOff),
            (&[Sign::Low("power"), Sign::Seen("visual.cathode", "film")], "power", Cause::MirrorSputtered),
            (&[Sign::Low("run_voltage"), Sign::Seen("visual.bore", "glow outside")], "run_voltage", Cause::BrokenBore),
            (&[Sign::Low("power"), Sign::Low("lasing_span"), Sign::Measured("extinction")], "power", Cause::WindowFilm),
            (&[Sign::High("off_axis_ratio")], "off_axis_ratio", Cause::Bore),
            (&[Sign::High("mode_spacing")], "mode_spacing", Cause::WrongType),
            (&[Sign::High("mode_spacing"), Sign::Twice("mode_spacing")], "mode_spacing", Cause::PolarizerInTheWay),
            (&[Sign::High("swap_count")], "swap_count", Cause::SwapsForLife),
        ];
        for (signs, explains, cause) in cases {
            assert_eq!(likely_cause(&with(signs), explains), Some(cause), "{signs:?}");
        }
    }

    #[test]
    fn nothing_is_named_where_nothing_fits_or_two_fit_equally() {
        assert_eq!(likely_cause(&with(&[Sign::Low("power")]), "power"), None, "low power alone");
        assert_eq!(likely_cause(&[], "power"), None);
        let both = [Sign::Seen("visual.press_test", "rises"), Sign::Seen("visual.cathode", "film")];
        assert_eq!(likely_cause(&with(&[Sign::Low("power"), both[0], both[1]]), "power"), None);
        // A cause of another row does not explain this one.
        assert_eq!(likely_cause(&with(&[Sign::Low("power"), Sign::High("off_axis_ratio")]), "power"), None);
    }

    #[test]
    fn contamination_never_looks_at_the_sign_of_the_voltage() {
        let told = |voltage| {
            let signs = [Sign::Low("power"), Sign::Seen("visual.discharge", "white"), voltage];
            likely_cause(&with(&signs), "power")
        };
        let of = [Sign::Low("run_voltage"), Sign::Normal("run_voltage"), Sign::High("run_voltage")].map(told);
        assert_eq!(of, [Some(Cause::Contamination); 3]);
        // And without any other sign a voltage alone says nothing.
        assert_eq!(likely_cause(&with(&[Sign::Low("power"), Sign::Low("run_voltage")]), "power"), None);
    }
}
