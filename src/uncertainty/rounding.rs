//! Rounds a value and its expanded uncertainty together.
//! Must not round what is used to judge: verdicts take unrounded values.

/// Decimals so that the expanded uncertainty keeps two significant digits (JCGM 100:2008, 7.2.6), at most `most`.
///
/// `expanded` in the unit shown. Not finite or not positive: `most`.
pub fn decimals_for(expanded: f64, most: usize) -> usize {
    if !(expanded.is_finite() && expanded > 0.0) {
        return most;
    }
    let first = expanded.log10().floor() as i32;
    // 0.0996 rounds to 0.10: one decimal less than its own first digit says.
    let bumped = if format!("{:.1e}", expanded).contains("e") && (expanded / 10f64.powi(first)) >= 9.95 {
        first + 1
    } else {
        first
    };
    (1 - bumped).clamp(0, most as i32) as usize
}

/// Value and expanded uncertainty with the same decimals: `("998.7", "3.0")`.
pub fn joint(value: f64, expanded: f64, most: usize) -> (String, String) {
    let decimals = decimals_for(expanded, most);
    (format!("{value:.decimals$}"), format!("{expanded:.decimals$}"))
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
}
