//! The line on laser class and the usual cautions.
//! Must not give a class as tested, nor a clearance: local rules and licensed practice decide.
//! Main function: [`caution`].

use crate::{
    phrase::{Saying, name, reasons, said},
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn class_counts_the_uncertainty() {
        assert!(caution(Some((0.9e-3, 0.02e-3))).english().contains("class 2 "));
        assert!(caution(Some((0.98e-3, 0.02e-3))).english().contains("class 3R "), "0.98 mW + 0.04 mW is above 1 mW");
        assert!(caution(Some((7e-3, 0.1e-3))).english().contains("class 3B "));
        assert!(caution(None).english().contains("not measured"));
    }
}
