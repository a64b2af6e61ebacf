//! Rounds a value and its expanded uncertainty together.
//! Must not round what is used to judge: verdicts take unrounded values.

/// Decimals beyond `most` that a small uncertainty may ask for: a value must not stand beside `± 0.00`.
const BEYOND: usize = 2;

/// Decimals so that the expanded uncertainty keeps two significant digits (JCGM 100:2008, 7.2.6), at most `most`;
/// up to two more where it would otherwise read as zero.
///
/// `expanded` in the unit shown. Not finite or not positive: `most`.
pub fn decimals_for(expanded: f64, most: usize) -> usize {
    if !(expanded.is_finite() && expanded > 0.0) {
        return most;
    }
    let first = expanded.log10().floor() as i32;
    // 0.0996 rounds to 0.10: one decimal less than its own first digit says.
    let bumped = if expanded / 10f64.powi(first) >= 9.95 { first + 1 } else { first };
    let wanted = (1 - bumped).max(0) as usize;
    if reads_as_zero(expanded, wanted.min(most)) { wanted.min(most + BEYOND) } else { wanted.min(most) }
}

/// Value and expanded uncertainty with the same decimals: `("998.7", "3.0")`.
///
/// An uncertainty too small for the decimals allowed reads `< 0.0001`, one that is exactly zero `0`.
pub fn joint(value: f64, expanded: f64, most: usize) -> (String, String) {
    let decimals = decimals_for(expanded, most);
    let spread = if expanded == 0.0 {
        "0".to_owned()
    } else if expanded > 0.0 && reads_as_zero(expanded, decimals) {
        format!("< {:.decimals$}", 10f64.powi(-(decimals as i32)))
    } else {
        format!("{expanded:.decimals$}")
    };
    (format!("{value:.decimals$}"), spread)
}

fn reads_as_zero(positive: f64, decimals: usize) -> bool {
    format!("{positive:.decimals$}").bytes().all(|b| matches!(b, b'0' | b'.'))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rounds_together() {
        assert_eq!(joint(998.73, 3.02, 3), ("998.7".into(), "3.0".into()));
        assert_eq!(joint(0.5049, 0.0151, 4), ("0.505".into(), "0.015".into()));
        assert_eq!(joint(1.0, 0.0997, 4), ("1.00".into(), "0.10".into()));
        assert_eq!(joint(12.34, f64::NAN, 1), ("12.3".into(), "NaN".into()));
    }

    #[test]
    fn a_small_uncertainty_never_reads_as_zero() {
        assert_eq!(joint(38.60289, 0.0034, 2), ("38.6029".into(), "0.0034".into()));
        assert_eq!(joint(149.15177, 0.000_289, 2), ("149.1518".into(), "0.0003".into()));
        assert_eq!(joint(149.15177, 0.000_02, 2), ("149.1518".into(), "< 0.0001".into()));
        assert_eq!(joint(12.0, 0.02, 0), ("12.00".into(), "0.02".into()));
        assert_eq!(joint(1.0, 1e-9, 0), ("1.00".into(), "< 0.01".into()));
        assert_eq!(joint(0.25, 0.0, 2), ("0.25".into(), "0".into()));
        assert_eq!(joint(10.0033, 0.00126, 3), ("10.003".into(), "0.001".into()), "one digit is enough to be seen");
    }
}
