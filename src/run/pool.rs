//! Combines one quantity over several captures: what scatters averages down, what is common does not.
//! Must not know where the captures come from.
//! Main function: [`pool`].

use crate::{
    numerics::distributions::excess_ratio,
    record::finding::StoredLine,
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// A value that stands farther from the median than this many robust standard deviations is left out and counted.
const FARTHEST: f64 = 6.0;

/// The result of [`pool`].
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Pooled {
    /// Mean with its budget.
    pub measured: Measured,
    /// Captures used.
    pub used: usize,
    /// Captures that stood apart.
    pub left_out: usize,
    /// √(χ²/(n − 1)) of the used captures against their own scatter lines; none for one capture.
    pub birge: Option<f64>,
}

/// Weighted mean over captures; none without a finite value.
///
/// * `captures`: (value, its budget), the budget's Type A lines independent between captures, its Type B lines fully
///   correlated where source id and words agree.
///
/// 1. Leave out what stands far from the median. 2. Weight by the inverse square of the Type A part, or evenly where one
///    has none. 3. u_A = 1/√Σw, times the Birge ratio R = √(χ²/(n − 1)) where χ² is larger than chance allows (Birge
///    1932; common practice in adjusting constants). 4. Type B contributions are averaged with the same weights and never shrink.
pub(crate) fn pool(captures: &[(f64, &[StoredLine])]) -> Option<Pooled> {
    let finite: Vec<_> = captures.iter().filter(|(value, _)| value.is_finite()).copied().collect();
    let kept = without_outliers(&finite);
    let n = kept.len();
    if n == 0 {
        return None;
    }
    let scatter: Vec<f64> = kept.iter().map(|(_, lines)| type_a(lines)).collect();
    let known = scatter.iter().all(|u| u.is_finite() && *u > 0.0);
    let weights: Vec<f64> = scatter.iter().map(|u| if known { u.powi(-2) } else { 1.0 }).collect();
    let total: f64 = weights.iter().sum();
    if !(total.is_finite() && total > 0.0) {
        return None;
    }
    let value = kept.iter().zip(&weights).map(|((value, _), w)| value * w).sum::<f64>() / total;
    let chi_square: f64 = kept.iter().zip(&weights).map(|((v, _), w)| w * (v - value).powi(2)).sum();
    let ratio = (n > 1).then(|| (chi_square / (n - 1) as f64).sqrt());
    let mut budget = Vec::new();
    let inner = total.sqrt().recip();
    let line = match (known, ratio) {
        (true, Some(ratio)) if excess_ratio(chi_square, (n - 1) as f64) > 1.0 => Some((inner * ratio, (n - 1) as f64)),
        (true, _) => Some((inner, own_dof(&kept))),
        (false, Some(ratio)) => Some((inner * ratio, (n - 1) as f64)),
        (false, None) => None,
    };
    if let Some((u, dof)) = line {
        let words = if n == 1 { "scatter of one capture".into() } else { format!("scatter of {n} captures") };
        budget.push(BudgetLine::direct("scatter", &words, Evaluation::TypeA, u, dof));
    }
    budget.extend(common(&kept, &weights, total));
    let birge = if known { ratio } else { None };
    Some(Pooled { measured: Measured { value, budget }, used: n, left_out: finite.len() - n, birge })
}

fn without_outliers<'a>(captures: &[(f64, &'a [StoredLine])]) -> Vec<(f64, &'a [StoredLine])> {
    if captures.len() < 5 {
        return captures.to_vec();
    }
    let middle = median(captures.iter().map(|(value, _)| *value).collect());
    // 1.4826 turns the median deviation of a normal distribution into its standard deviation.
    let spread = 1.4826 * median(captures.iter().map(|(value, _)| (value - middle).abs()).collect());
    let allowed = (FARTHEST * spread).max(1e-6 * middle.abs());
    captures.iter().filter(|(value, _)| (value - middle).abs() <= allowed).copied().collect()
}

/// Median of finite values; 0 for none.
pub(crate) fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len();
    match (values.get(n / 2), n % 2) {
        (Some(upper), 1) => *upper,
        (Some(upper), _) => 0.5 * (upper + values[n / 2 - 1]),
        (None, _) => 0.0,
    }
}

fn type_a(lines: &[StoredLine]) -> f64 {
    lines.iter().filter(|l| l.type_a).map(|l| (l.sensitivity * l.standard_uncertainty).powi(2)).sum::<f64>().sqrt()
}

/// Degrees of freedom of all captures' Type A lines together.
fn own_dof(captures: &[(f64, &[StoredLine])]) -> f64 {
    captures
        .iter()
        .flat_map(|(_, lines)| lines.iter())
        .filter(|l| l.type_a)
        .map(|l| l.dof.unwrap_or(f64::INFINITY))
        .sum()
}

/// The Type B lines, one for each source and wording, in the order of their first appearance.
fn common(captures: &[(f64, &[StoredLine])], weights: &[f64], total: f64) -> Vec<BudgetLine> {
    let mut lines: Vec<BudgetLine> = Vec::new();
    for ((_, stored), weight) in captures.iter().zip(weights) {
        for line in stored.iter().filter(|line| !line.type_a) {
            let share = weight / total * (line.sensitivity * line.standard_uncertainty).abs();
            match lines.iter_mut().find(|l| l.source_id == line.source_id && l.line == line.line) {
                Some(found) => found.sensitivity += share,
                None => {
                    let mut first = live_line(line);
                    first.sensitivity = share;
                    lines.push(first);
                }
            }
        }
    }
    for line in &mut lines {
        // The shares were gathered in the result's unit; the line keeps the input's own uncertainty.
        if line.standard_uncertainty > 0.0 {
            line.sensitivity /= line.standard_uncertainty;
        }
    }
    lines
}

/// The live form of a stored line.
pub(crate) fn live_line(line: &StoredLine) -> BudgetLine {
    BudgetLine {
        source_id: line.source_id.clone(),
        line: line.line.clone(),
        evaluation: if line.type_a { Evaluation::TypeA } else { Evaluation::TypeB },
        standard_uncertainty: line.standard_uncertainty,
        dof: line.dof.unwrap_or(f64::INFINITY),
        sensitivity: line.sensitivity,
        note: line.note.clone(),
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn line(source_id: &str, type_a: bool, u: f64) -> StoredLine {
        StoredLine {
            source_id: source_id.into(),
            line: source_id.into(),
            type_a,
            standard_uncertainty: u,
            dof: None,
            sensitivity: 1.0,
            note: String::new(),
        }
    }

    #[test]
    fn scatter_averages_down_and_the_certificate_does_not() {
        let budget = [line("scatter", true, 2.0), line("SIM-0001", false, 3.0)];
        let captures: Vec<(f64, &[StoredLine])> =
            [99.0, 101.0, 99.5, 100.5].iter().map(|v| (*v, &budget[..])).collect();
        let pooled = pool(&captures).unwrap();
        assert!((pooled.measured.value - 100.0).abs() < 1e-12);
        // χ² = (1 + 1 + 0.25 + 0.25)/4 over 3: below 1, so u_A = 2/√4.
        assert!((pooled.measured.budget[0].contribution() - 1.0).abs() < 1e-12);
        assert!((pooled.measured.budget[1].contribution() - 3.0).abs() < 1e-12);
    }

    #[test]
    fn a_scatter_larger_than_stated_widens() {
        let budget = [line("scatter", true, 1.0)];
        let captures: Vec<(f64, &[StoredLine])> = [97.0, 103.0].iter().map(|v| (*v, &budget[..])).collect();
        let pooled = pool(&captures).unwrap();
        // χ² = 18 over 1: R = 4.243, u = 4.243/√2 = 3.
        assert!((pooled.measured.u() - 3.0).abs() < 1e-12);
        assert_eq!(pooled.measured.dof(), 1.0);
    }

    #[test]
    fn what_stands_apart_is_left_out_and_counted() {
        let budget = [line("scatter", true, 1.0)];
        let values = [100.0, 100.5, 99.5, 100.2, 99.8, 200.0];
        let captures: Vec<(f64, &[StoredLine])> = values.iter().map(|v| (*v, &budget[..])).collect();
        let pooled = pool(&captures).unwrap();
        assert_eq!((pooled.used, pooled.left_out), (5, 1));
        assert!((pooled.measured.value - 100.0).abs() < 1e-9);
        assert!(pool(&[(f64::NAN, &budget[..])]).is_none());
    }
}
