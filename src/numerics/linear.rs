//! Weighted linear least squares by orthogonal reduction.
//! Must not know what the columns mean; no nonlinear models.
//! Main entry: [`weighted`].

use super::triangle::Triangle;

/// Result of [`weighted`].
#[derive(Debug, Clone, PartialEq)]
pub struct LinearFit {
    /// One coefficient per column of the design.
    pub coefficients: Vec<f64>,
    /// `(AᵀW²A)⁻¹`, row-major n × n, not scaled by the scatter. It is the covariance when the weights are 1/u.
    pub covariance: Vec<f64>,
    /// Σ (wᵢ·(aᵢ·c − yᵢ))².
    pub sum_of_squares: f64,
    /// Rows with a weight above zero minus columns.
    pub degrees_of_freedom: usize,
}

impl LinearFit {
    /// Sum of squares over degrees of freedom; `None` with no degrees of freedom.
    pub fn reduced_chi_square(&self) -> Option<f64> {
        (self.degrees_of_freedom > 0).then(|| self.sum_of_squares / self.degrees_of_freedom as f64)
    }

    /// Standard error of coefficient `index` scaled by the scatter found (√ of reduced chi-square × variance).
    /// `None` with no degrees of freedom or for an index out of range.
    pub fn standard_error(&self, index: usize) -> Option<f64> {
        Some((self.unscaled_variance(index)? * self.reduced_chi_square()?).sqrt())
    }

    /// Standard error of coefficient `index` that follows from the weights alone (they must be 1/u); `None` for an
    /// index out of range.
    pub fn standard_error_from_weights(&self, index: usize) -> Option<f64> {
        Some(self.unscaled_variance(index)?.sqrt())
    }

    fn unscaled_variance(&self, index: usize) -> Option<f64> {
        let n = self.coefficients.len();
        if index < n { self.covariance.get(index * n + index).copied() } else { None }
    }
}

/// Why [`weighted`] gave no result.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum LinearError {
    /// The lengths do not belong together.
    #[error(
        "linear fit: {design} design values, {rows} rows, {weights} weights; expected rows × columns values, a weight per row"
    )]
    Lengths {
        /// Values in the design.
        design: usize,
        /// Values on the right-hand side.
        rows: usize,
        /// Weights given.
        weights: usize,
    },
    /// A value is NaN or infinite, or a weight is negative.
    #[error(
        "linear fit: a value is not finite or a weight is negative; expected finite values and weights of at least 0"
    )]
    NotFinite,
    /// Fewer rows with a weight than coefficients.
    #[error("linear fit: {rows} rows with a weight for {columns} coefficients; expected at least as many rows")]
    TooFewRows {
        /// Rows with a weight above zero.
        rows: usize,
        /// Coefficients wanted.
        columns: usize,
    },
    /// The columns are dependent to working precision.
    #[error("linear fit: the columns of the design depend on each other; leave one out")]
    Singular,
}

/// Weighted linear least squares: the `c` that minimizes Σ (wᵢ·(aᵢ·c − yᵢ))².
///
/// * `design`: row-major, `rhs.len()` rows × n columns; n follows from the lengths.
/// * `rhs`: the observations yᵢ.
/// * `weights`: one per row; they multiply the residual, so they are **1/u, not 1/u²**. A row of weight 0 does not
///   count.
///
/// # Errors
/// [`LinearError`] for lengths that do not belong together, values that are not finite, too few rows, or dependent
/// columns.
///
/// # Method
/// 1. Multiply each row by its weight. 2. Householder QR of `[A | −y]`. 3. Back substitution; `(AᵀW²A)⁻¹ = R⁻¹R⁻ᵀ`.
///
/// Source: orthogonal factorization for least squares, common practice (Golub & Van Loan, *Matrix Computations*,
/// chapter 5; from memory).
///
/// ```
/// use tubewright::numerics::linear::weighted;
/// // y = 1 + 2·x
/// let fit = weighted(&[1.0, 0.0, 1.0, 1.0, 1.0, 2.0], &[1.0, 3.0, 5.0], &[1.0; 3])?;
/// assert!((fit.coefficients[1] - 2.0).abs() < 1e-12);
/// # Ok::<(), tubewright::numerics::linear::LinearError>(())
/// ```
pub fn weighted(design: &[f64], rhs: &[f64], weights: &[f64]) -> Result<LinearFit, LinearError> {
    let rows = rhs.len();
    if rows == 0 || weights.len() != rows || design.is_empty() || !design.len().is_multiple_of(rows) {
        return Err(LinearError::Lengths { design: design.len(), rows, weights: weights.len() });
    }
    if design.iter().chain(rhs).any(|x| !x.is_finite()) || weights.iter().any(|w| !w.is_finite() || *w < 0.0) {
        return Err(LinearError::NotFinite);
    }
    let columns = design.len() / rows;
    let used = weights.iter().filter(|w| **w > 0.0).count();
    if used < columns {
        return Err(LinearError::TooFewRows { rows: used, columns });
    }
    let scaled: Vec<f64> =
        design.chunks_exact(columns).zip(weights).flat_map(|(row, w)| row.iter().map(move |x| x * w)).collect();
    let negative: Vec<f64> = rhs.iter().zip(weights).map(|(y, w)| -y * w).collect();
    let triangle = Triangle::reduce(&scaled, &negative, columns).ok_or(LinearError::NotFinite)?;
    let free: Vec<usize> = (0..columns).collect();
    let covariance = triangle.inverse_normal(&free).ok_or(LinearError::Singular)?;
    let scale = triangle.column_lengths();
    let coefficients = triangle.damped_step(0.0, &scale, &free).ok_or(LinearError::Singular)?;
    // From the residuals themselves: where the fit is nearly exact, the corner of the triangle is only rounding.
    let sum_of_squares = design
        .chunks_exact(columns)
        .zip(rhs.iter().zip(weights))
        .map(|(row, (y, w))| (row.iter().zip(&coefficients).map(|(a, c)| a * c).sum::<f64>() - y) * w)
        .map(|r| r * r)
        .sum();
    Ok(LinearFit { coefficients, covariance, sum_of_squares, degrees_of_freedom: used - columns })
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// Normal equations of this line by hand: n = 4, Σx = 6, Σx² = 14, Σy = 10, Σxy = 21
    /// → slope (4·21 − 6·10)/(4·14 − 36) = 24/20, intercept (10 − 1.2·6)/4 = 0.7.
    #[test]
    fn line_by_hand() {
        let design = [1.0, 0.0, 1.0, 1.0, 1.0, 2.0, 1.0, 3.0];
        let fit = weighted(&design, &[1.0, 2.0, 2.0, 5.0], &[1.0; 4]).unwrap();
        assert!((fit.coefficients[0] - 0.7).abs() < 1e-14);
        assert!((fit.coefficients[1] - 1.2).abs() < 1e-14);
        // Residuals y − (0.7 + 1.2x): 0.3, 0.1, −1.1, 0.7 → 0.09 + 0.01 + 1.21 + 0.49.
        assert!((fit.sum_of_squares - 1.8).abs() < 1e-13);
        assert_eq!(fit.degrees_of_freedom, 2);
        // (XᵀX)⁻¹ = [14 −6; −6 4]/20.
        for (got, want) in fit.covariance.iter().zip([0.7, -0.3, -0.3, 0.2]) {
            assert!((got - want).abs() < 1e-14);
        }
        assert!((fit.standard_error(1).unwrap() - (0.2f64 * 0.9).sqrt()).abs() < 1e-13);
        assert_eq!(fit.standard_error(2), None);
    }

    #[test]
    fn a_row_of_weight_zero_does_not_count() {
        let fit = weighted(&[1.0, 1.0, 1.0], &[1.0, 3.0, 1e9], &[1.0, 1.0, 0.0]).unwrap();
        assert!((fit.coefficients[0] - 2.0).abs() < 1e-12);
        assert_eq!(fit.degrees_of_freedom, 1);
    }

    #[test]
    fn faults_are_errors() {
        assert!(matches!(weighted(&[], &[], &[]), Err(LinearError::Lengths { .. })));
        assert!(matches!(weighted(&[1.0; 3], &[1.0; 2], &[1.0; 2]), Err(LinearError::Lengths { .. })));
        assert!(matches!(weighted(&[1.0; 2], &[1.0; 2], &[1.0]), Err(LinearError::Lengths { .. })));
        assert_eq!(weighted(&[1.0; 2], &[1.0, f64::NAN], &[1.0; 2]), Err(LinearError::NotFinite));
        assert_eq!(weighted(&[1.0; 2], &[1.0; 2], &[1.0, -1.0]), Err(LinearError::NotFinite));
        assert!(matches!(weighted(&[1.0; 2], &[1.0], &[1.0]), Err(LinearError::TooFewRows { .. })));
        assert_eq!(weighted(&[1.0; 8], &[1.0; 4], &[1.0; 4]), Err(LinearError::Singular));
    }
}
