//! The line on laser class and the usual cautions; what stands above a question that sends a hand near the tube.
//! Must not give a class as tested, nor a clearance: local rules and licensed practice decide.
//! Main functions: [`caution`], [`of_question`].

use crate::record::question::Expects;
use crate::uncertainty::{COVERAGE, coverage_factor};

/// Upper accessible emission limits at 633 nm, continuous, W (IEC 60825-1; from memory, to be checked in the standard).
const CLASSES: [(&str, f64); 3] = [("2", 1e-3), ("3R", 5e-3), ("3B", 0.5)];

/// The line for the highest power seen at any point of the walk, (W, standard uncertainty W), or for none.
pub(crate) fn caution(greatest_power: Option<(f64, f64)>) -> String {
    let class = match greatest_power {
        Some((power, u)) => {
            let highest = power + coverage_factor(COVERAGE, f64::INFINITY) * u;
            let class = CLASSES.iter().find(|(_, limit)| highest <= *limit).map_or("4", |(name, _)| name);
            format!("Power in the range of class {class} (IEC 60825-1): treat as at least class {class}.")
        }
        None => "Power not measured: treat as at least class 3B (IEC 60825-1).".into(),
    };
    format!(
        "{class} Laser radiation; start pulses of up to 10 kV; charge stays in tube and ballast after switch-off; \
         glass under vacuum. This record gives no clearance."
    )
}

const SWITCHING: &str = "High voltage and laser light: start pulses reach 10 kV. Tube seated, leads covered, beam stop \
    in place, eyewear on, hands clear. Local rules and licensed practice decide who may switch on.";
const METERS: &str = "High voltage: read the meter and touch nothing. A probe goes on or off only with the supply off and \
    tube and ballast discharged with an insulated tool.";
const BEAM: &str = "Laser light: eyewear on, a beam stop behind, no reflection toward an eye. High voltage is on: hands \
    stay clear of the tube and its leads.";
const LOOKS: &str = "Laser light and high voltage: never look along the beam. Before a hand or a lamp comes near the \
    glass: supply off, tube and ballast discharged with an insulated tool. Local rules decide who may.";

/// What stands above a question: what endangers whoever does it, and what to do against that; empty where nothing does.
///
/// * `word`: the question's word; one that is not known here goes by what is done for it: a hand near the beam, a look.
pub(super) fn of_question(word: &str, expects: &Expects, high_voltage: bool) -> &'static str {
    match (word, expects) {
        _ if high_voltage => SWITCHING,
        ("start_voltage" | "run_current" | "run_voltage" | "dropout_current", _) => METERS,
        (_, Expects::Done) => BEAM,
        (_, Expects::Choice(_)) => LOOKS,
        (_, Expects::Number { .. } | Expects::Whole { .. }) => "",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hands_near_the_tube_are_cautioned() {
        let number = Expects::Number { ucum: "kV".into(), lowest: 0.0, highest: 1.0 };
        let needs = |word: &str, expects: &Expects, on: bool, words: &[&str]| {
            let said = of_question(word, expects, on);
            assert!(words.iter().all(|word| said.contains(word)), "{word}: {said}");
        };
        needs("start_delay", &number, true, &["High voltage", "hands clear", "licensed practice"]);
        needs("run_voltage", &number, false, &["High voltage", "supply off", "insulated tool"]);
        needs("turn_45.0", &Expects::Done, false, &["Laser light", "eyewear"]);
        needs("choice", &Expects::Choice(vec![]), false, &["supply off", "insulated tool", "Local rules"]);
        assert_eq!(of_question("tries", &Expects::Whole { lowest: 0, highest: 3 }, false), "");
    }

    #[test]
    fn class_counts_the_uncertainty() {
        assert!(caution(Some((0.9e-3, 0.02e-3))).contains("class 2 "));
        assert!(caution(Some((0.98e-3, 0.02e-3))).contains("class 3R "), "0.98 mW + 0.04 mW is above 1 mW");
        assert!(caution(Some((7e-3, 0.1e-3))).contains("class 3B "));
        assert!(caution(None).contains("not measured"));
    }
}
