//! Behaviour of the fit apart from certified data (that is `tests/strd.rs`).
//! Must not repeat the certified sets.
//! Cases: bounds, dependent parameters, bad input, undefined regions.
#![allow(clippy::unwrap_used)]

use super::*;

/// A model from two closures.
struct Plain<F> {
    n_parameters: usize,
    n_points: usize,
    residual: F,
}

impl<F: Fn(usize, &[f64]) -> f64> Model for Plain<F> {
    fn n_parameters(&self) -> usize {
        self.n_parameters
    }
    fn n_points(&self) -> usize {
        self.n_points
    }
    fn evaluate(&self, parameters: &[f64], residuals: &mut [f64], jacobian: Option<&mut [f64]>) {
        for (i, r) in residuals.iter_mut().enumerate() {
            *r = (self.residual)(i, parameters);
        }
        if let Some(jacobian) = jacobian {
            jacobian.copy_from_slice(&central_differences(self, parameters, &[]));
        }
    }
}

fn line(i: usize, p: &[f64]) -> f64 {
    // Data 1, 2, 2, 5 at x = 0..3: intercept 0.7, slope 1.2, sum of squares 1.8 (by hand, see `linear`).
    p[0] + p[1] * i as f64 - [1.0, 2.0, 2.0, 5.0][i]
}

fn plain<F: Fn(usize, &[f64]) -> f64>(n_parameters: usize, n_points: usize, residual: F) -> Plain<F> {
    Plain { n_parameters, n_points, residual }
}

#[test]
fn a_line_gives_the_values_of_the_normal_equations() {
    let found = fit(&plain(2, 4, line), &[0.0, 0.0], &Options::default()).unwrap();
    // Central differences of a line leave about ten digits.
    assert!((found.parameters[0] - 0.7).abs() < 1e-9 && (found.parameters[1] - 1.2).abs() < 1e-9);
    assert!((found.sum_of_squares - 1.8).abs() < 1e-9);
    assert!((found.standard_error(1).unwrap() - 0.18f64.sqrt()).abs() < 1e-8);
    assert!((found.correlation(0, 1).unwrap() + 0.3 / 0.14f64.sqrt()).abs() < 1e-8);
    assert_eq!(found.degrees_of_freedom, 2);
    assert!(found.stopped.converged() && found.at_bound.is_empty());
    assert_eq!(found.standard_error(2), None);
}

#[test]
fn a_bound_holds_and_is_told() {
    let bounds = Some(vec![(f64::NEG_INFINITY, f64::INFINITY), (0.0, 1.0)]);
    let found = fit(&plain(2, 4, line), &[5.0, 0.5], &Options { bounds, ..Options::default() }).unwrap();
    // With slope 1: intercept = mean of 1, 1, 0, 2.
    assert_eq!(found.at_bound, [1]);
    assert_eq!(found.parameters[1], 1.0);
    assert!((found.parameters[0] - 1.0).abs() < 1e-9);
    assert_eq!(found.degrees_of_freedom, 3);
    assert_eq!(found.standard_error(1), None);
    // Sum of squares 0 + 0 + 1 + 1 over 3, variance 1/4 of that.
    assert!((found.standard_error(0).unwrap() - (2.0f64 / 12.0).sqrt()).abs() < 1e-8);
    assert!(found.stopped.converged());
}

#[test]
fn an_inactive_bound_changes_nothing_and_equal_bounds_hold() {
    let bounds = Some(vec![(-10.0, 10.0), (-10.0, 10.0)]);
    let found = fit(&plain(2, 4, line), &[-10.0, 10.0], &Options { bounds, ..Options::default() }).unwrap();
    assert!(found.at_bound.is_empty() && (found.parameters[1] - 1.2).abs() < 1e-9);
    let bounds = Some(vec![(0.5, 0.5), (2.0, 2.0)]);
    let held = fit(&plain(2, 4, line), &[0.0, 0.0], &Options { bounds, ..Options::default() }).unwrap();
    assert_eq!((held.stopped, held.at_bound.as_slice()), (StopReason::AllAtBound, [0, 1].as_slice()));
    assert_eq!(held.covariance, None);
}

#[test]
fn dependent_parameters_give_values_without_uncertainty() {
    let model = plain(2, 4, |i, p: &[f64]| p[0] + p[1] - [1.0, 2.0, 2.0, 5.0][i]);
    let found = fit(&model, &[0.0, 0.0], &Options::default()).unwrap();
    assert!((found.parameters[0] + found.parameters[1] - 2.5).abs() < 1e-8, "{found:?}");
    assert!(found.stopped.converged());
    assert_eq!((found.covariance.clone(), found.standard_error(0)), (None, None));
}

#[test]
fn steps_back_from_where_the_model_is_undefined() {
    // ln(p) over 4 points with data ln 2; the first full step from 9 leads below 0.
    let found = fit(&plain(1, 4, |_, p: &[f64]| p[0].ln() - 2f64.ln()), &[9.0], &Options::default()).unwrap();
    assert!((found.parameters[0] - 2.0).abs() < 1e-8, "{found:?}");
}

#[test]
fn exact_data_and_few_evaluations() {
    let exact = fit(&plain(1, 3, |_, p: &[f64]| p[0] - 2.0), &[2.0], &Options::default()).unwrap();
    assert_eq!((exact.stopped, exact.sum_of_squares, exact.evaluations), (StopReason::ZeroResidual, 0.0, 1));
    let short = Options { max_evaluations: 1, ..Options::default() };
    let found = fit(&plain(2, 4, line), &[0.0, 0.0], &short).unwrap();
    assert_eq!(found.stopped, StopReason::MaxEvaluations);
    assert!(found.covariance.is_some());
    let two = fit(&plain(2, 2, line), &[0.0, 0.0], &Options::default()).unwrap();
    assert_eq!((two.degrees_of_freedom, two.reduced_chi_square(), two.standard_error(0)), (0, None, None));
}

#[test]
fn bad_input_is_an_error() {
    let options = Options::default();
    let start = |p: &[f64]| fit(&plain(2, 4, line), p, &options).unwrap_err();
    assert_eq!(start(&[1.0]), FitError::StartLength { found: 1, expected: 2 });
    assert_eq!(start(&[1.0, f64::NAN]), FitError::NotFiniteAtStart);
    assert!(matches!(fit(&plain(0, 4, |_, _| 0.0), &[], &options), Err(FitError::StartLength { .. })));
    assert!(matches!(fit(&plain(2, 1, line), &[0.0; 2], &options), Err(FitError::TooFewPoints { .. })));
    assert_eq!(fit(&plain(1, 2, |_, _| f64::NAN), &[0.0], &options), Err(FitError::NotFiniteAtStart));
    for (pairs, index) in
        [(vec![(0.0, 1.0)], 1), (vec![(0.0, 1.0), (1.0, 0.0)], 1), (vec![(f64::NAN, 1.0), (0.0, 1.0)], 0), (vec![], 0)]
    {
        let bounded = Options { bounds: Some(pairs), ..Options::default() };
        assert_eq!(fit(&plain(2, 4, line), &[0.0; 2], &bounded), Err(FitError::Bounds { index }));
    }
}

/// Law: at a minimum within bounds the gradient is 0 for free parameters and points inward for those on a bound.
#[test]
fn bounded_fits_of_random_lines_and_curves_end_at_a_minimum() {
    let mut state = 7u64;
    let mut next = move || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64 * 2.0 - 1.0
    };
    for _ in 0..300 {
        let (n, m) = (4, 9);
        let design: Vec<f64> = (0..n * m).map(|_| next()).collect();
        let data: Vec<f64> = (0..m).map(|_| 2.0 * next()).collect();
        // Strongly correlated columns: the hard case for bounds.
        let mixed: Vec<f64> = design
            .chunks_exact(n)
            .flat_map(|row| [row[0], row[0] + 0.1 * row[1], row[0] - 0.1 * row[2], row[3]])
            .collect();
        let model = plain(n, m, |i, p: &[f64]| {
            mixed[i * n..(i + 1) * n].iter().zip(p).map(|(a, b)| a * b).sum::<f64>() - data[i]
        });
        let bounds: Vec<(f64, f64)> = (0..n).map(|_| (-0.3 - next().abs(), 0.3 + next().abs())).collect();
        let found = fit(&model, &[0.0; 4], &Options { bounds: Some(bounds.clone()), ..Options::default() }).unwrap();
        assert!(found.stopped.converged(), "{found:?}");
        for j in 0..n {
            let gradient: f64 = (0..m).map(|i| mixed[i * n + j] * found.residuals[i]).sum();
            let p = found.parameters[j];
            let inward = (p <= bounds[j].0 && gradient > 0.0) || (p >= bounds[j].1 && gradient < 0.0);
            // The cost tolerance 1e-13 of sums near 10 leaves a gradient of about √(1e-12)·|column|.
            assert!(inward || gradient.abs() < 1e-5, "{j}: {gradient} {found:?}");
        }
    }
}
