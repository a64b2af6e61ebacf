//! Derivatives by central differences, for models without formulas and for checking formulas.
//! Must not be used where a formula is at hand: it costs two evaluations per parameter and half the digits.
//! Main entry: [`central_differences`].

use super::Model;

/// Derivatives of the residuals by central differences, row-major `n_points` × `n_parameters`.
///
/// * `parameters`: where; one per parameter. A wrong length gives an empty vector.
/// * `scales`: a typical size of each parameter, for the step where the parameter itself is near 0; missing entries
///   count as 0.
///
/// # Method
/// (r(p + h) − r(p − h)) / 2h with h = ε^(1/3)·max(|p|, |scale|), or ε^(1/3) if both are 0: balances the cubic
/// error of the formula against rounding, leaving about ten digits (common practice).
pub fn central_differences(model: &dyn Model, parameters: &[f64], scales: &[f64]) -> Vec<f64> {
    let (n, m) = (model.n_parameters(), model.n_points());
    if parameters.len() != n {
        return Vec::new();
    }
    let mut jacobian = vec![0.0; n * m];
    let (mut above, mut below) = (vec![0.0; m], vec![0.0; m]);
    for j in 0..n {
        let typical = parameters[j].abs().max(scales.get(j).map_or(0.0, |s| s.abs()));
        let step = f64::EPSILON.cbrt() * if typical > 0.0 { typical } else { 1.0 };
        let mut moved = parameters.to_vec();
        moved[j] = parameters[j] + step;
        let high = moved[j];
        model.evaluate(&moved, &mut above, None);
        moved[j] = parameters[j] - step;
        let low = moved[j];
        model.evaluate(&moved, &mut below, None);
        for i in 0..m {
            jacobian[i * n + j] = (above[i] - below[i]) / (high - low);
        }
    }
    jacobian
}
