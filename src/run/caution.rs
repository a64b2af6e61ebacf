//! The line on laser class and the usual cautions; what stands above a question that sends a hand near the tube.
//! Must not give a class as tested, nor a clearance: local rules and licensed practice decide.
//! Main functions: [`caution`], [`of_question`].

use crate::{
    phrase::{Phrase, Saying, name, questions, reasons, said},
    record::question::Expects,
    uncertainty::{COVERAGE, coverage_factor},
};

/// Upper accessible emission limits at 633 nm, continuous, W (IEC 60825-1; from memory, to be checked in the standard).
const CLASSES: [(&str, f64); 3] = [("2", 1e-3), ("3R", 5e-3), ("3B", 0.5)];

/// The line for the highest power seen at any point of the walk, (W, standard uncertainty W), or for none.
pub(crate) fn caution(greatest_power: Option<(f64, f64)>) -> Saying {
    let class = match greatest_power {
        Some((power, u)) => {
            let highest = power + coverage_factor(COVERAGE, f64::INFINITY) * u;
            let class = CLASSES.iter().find(|(_, limit)| highest <= *limit).map_or("4", |(name, _)| name);
            reasons::CLASS.with([name(class)])
        }
        None => (&reasons::CLASS_UNKNOWN).into(),
    };
    reasons::CAUTION.with([said(class)])
}

/// What stands above a question: what endangers whoever does it, and what to do against that; none where nothing does.
///
/// * `word`: the question's word; one that is not known here goes by what is done for it: a hand near the beam, a look.
pub(super) fn of_question(word: &str, expects: &Expects, high_voltage: bool) -> Option<&'static Phrase> {
    Some(match (word, expects) {
        _ if high_voltage => &questions::MIND_SWITCHING,
        ("start_voltage" | "run_current" | "run_voltage" | "dropout_current", _) => &questions::MIND_METERS,
        (_, Expects::Done) => &questions::MIND_BEAM,
        (_, Expects::Choice(_)) => &questions::MIND_LOOKS,
        (_, Expects::Number { .. } | Expects::Whole { .. }) => return None,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hands_near_the_tube_are_cautioned() {
        let number = Expects::Number { ucum: "kV".into(), lowest: 0.0, highest: 1.0 };
        let needs = |word: &str, expects: &Expects, on: bool, words: &[&str]| {
            let said = of_question(word, expects, on).map_or("", |phrase| phrase.en);
            assert!(words.iter().all(|word| said.contains(word)), "{word}: {said}");
        };
        needs("start_delay", &number, true, &["High voltage", "hands clear", "licensed practice"]);
        needs("run_voltage", &number, false, &["High voltage", "supply off", "insulated tool"]);
        needs("turn_45.0", &Expects::Done, false, &["Laser light", "eyewear"]);
        needs("choice", &Expects::Choice(vec![]), false, &["supply off", "insulated tool", "Local rules"]);
        assert_eq!(of_question("tries", &Expects::Whole { lowest: 0, highest: 3 }, false), None);
    }

    #[test]
    fn class_counts_the_uncertainty() {
        assert!(caution(Some((0.9e-3, 0.02e-3))).english().contains("class 2 "));
        assert!(caution(Some((0.98e-3, 0.02e-3))).english().contains("class 3R "), "0.98 mW + 0.04 mW is above 1 mW");
        assert!(caution(Some((7e-3, 0.1e-3))).english().contains("class 3B "));
        assert!(caution(None).english().contains("not measured"));
    }
}
