//! Orthogonal reduction of a tall system `J·δ ≈ −r` to a small triangular one, and solutions of the small one.
//! Must not know where the system comes from or decide when a fit is finished.
//! Main type: [`Triangle`].

use nalgebra::{DMatrix, DVector};

/// Rows reduced at a time; keeps the working matrix in the processor's cache for tens of parameters.
const BLOCK_ROWS: usize = 256;

/// Smallest accepted ratio of extreme singular values of the column-scaled triangle. Below it the covariance would
/// carry fewer than about three sound digits in double precision (2.2e-16 / 1e-13), so none is given.
const LEAST_RECIPROCAL_CONDITION: f64 = 1e-13;

/// Most sweeps of the singular value search; a few per column are usual.
const SVD_SWEEPS: usize = 1000;

/// `R` and `Qᵀr` of the factorization `J = Q·R`, with n columns.
#[derive(Debug, Clone)]
pub(crate) struct Triangle {
    /// n × n upper triangle.
    pub r: DMatrix<f64>,
    /// The part of the residual vector that the columns of `J` span, n values.
    pub projected: DVector<f64>,
}

impl Triangle {
    /// Reduces a row-major `jacobian` (`residuals.len()` × `columns`). `None` if a length is wrong or anything is not
    /// finite.
    pub fn reduce(jacobian: &[f64], residuals: &[f64], columns: usize) -> Option<Self> {
        if columns == 0 || residuals.len().checked_mul(columns)? != jacobian.len() {
            return None;
        }
        let size = columns + 1;
        let mut top = DMatrix::<f64>::zeros(size, size);
        for (rows, values) in jacobian.chunks(BLOCK_ROWS * columns).zip(residuals.chunks(BLOCK_ROWS)) {
            let mut stacked = DMatrix::<f64>::zeros(size + values.len(), size);
            stacked.rows_mut(0, size).copy_from(&top);
            for (i, (row, value)) in rows.chunks_exact(columns).zip(values).enumerate() {
                for (j, entry) in row.iter().enumerate() {
                    stacked[(size + i, j)] = *entry;
                }
                stacked[(size + i, columns)] = *value;
            }
            top = stacked.qr().r();
        }
        if top.iter().any(|x| !x.is_finite()) {
            return None;
        }
        Some(Self {
            r: top.view((0, 0), (columns, columns)).into_owned(),
            projected: top.view((0, columns), (columns, 1)).column(0).into_owned(),
        })
    }

    /// Euclidean length of each column of `J`; 1 for a column of zeros, so that it can divide.
    pub fn column_lengths(&self) -> Vec<f64> {
        self.r.column_iter().map(|c| c.norm()).map(|x| if x > 0.0 { x } else { 1.0 }).collect()
    }

    /// `Jᵀ·r`, half the gradient of the sum of squares.
    pub fn gradient(&self) -> Vec<f64> {
        self.r.tr_mul(&self.projected).iter().copied().collect()
    }

    /// Sum of squares that the linear model expects to be removed by the step `delta`.
    pub fn expected_reduction(&self, delta: &[f64]) -> f64 {
        let after = &self.projected + &self.r * DVector::from_column_slice(delta);
        self.projected.norm_squared() - after.norm_squared()
    }

    /// Minimizes `|Qᵀr + R·δ|² + damping·|D·δ|²` over the columns in `free`; the other entries of δ are 0.
    /// `None` if the system is singular to working precision.
    pub fn damped_step(&self, damping: f64, scale: &[f64], free: &[usize]) -> Option<Vec<f64>> {
        let (n, k) = (self.r.ncols(), free.len());
        let mut delta = vec![0.0; n];
        if k == 0 {
            return Some(delta);
        }
        let root = damping.max(0.0).sqrt();
        // In scaled unknowns D·δ the damping is a multiple of the unit matrix.
        let mut stacked = DMatrix::<f64>::zeros(n + k, k + 1);
        for (column, &j) in free.iter().enumerate() {
            for i in 0..n {
                stacked[(i, column)] = self.r[(i, j)] / scale[j];
            }
            stacked[(n + column, column)] = root;
        }
        for i in 0..n {
            stacked[(i, k)] = -self.projected[i];
        }
        let small = stacked.qr().r();
        let right = small.view((0, k), (k, 1)).into_owned();
        let scaled = small.view((0, 0), (k, k)).solve_upper_triangular(&right)?;
        for (column, &j) in free.iter().enumerate() {
            delta[j] = scaled[(column, 0)] / scale[j];
        }
        delta.iter().all(|x| x.is_finite()).then_some(delta)
    }

    /// `(JᵀJ)⁻¹` over the columns in `free`, row-major n × n with zeros in the other rows and columns.
    /// `None` if the columns are dependent to working precision, or none is free.
    pub fn inverse_normal(&self, free: &[usize]) -> Option<Vec<f64>> {
        let (n, k) = (self.r.ncols(), free.len());
        if k == 0 {
            return None;
        }
        let lengths = self.column_lengths();
        let scaled = DMatrix::from_fn(n, k, |i, c| self.r[(i, free[c])] / lengths[free[c]]);
        let small = scaled.qr().r();
        let singular = small.clone().try_svd(false, false, f64::EPSILON, SVD_SWEEPS)?.singular_values;
        let (least, largest) = (singular.min(), singular.max());
        if least.is_nan() || least <= LEAST_RECIPROCAL_CONDITION * largest {
            return None;
        }
        let inverse = small.solve_upper_triangular(&DMatrix::identity(k, k))?;
        let product = &inverse * inverse.transpose();
        let mut full = vec![0.0; n * n];
        for (a, &i) in free.iter().enumerate() {
            for (b, &j) in free.iter().enumerate() {
                full[i * n + j] = product[(a, b)] / (lengths[i] * lengths[j]);
            }
        }
        full.iter().all(|x| x.is_finite()).then_some(full)
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn blocks_give_the_same_normal_matrix_as_the_plain_sum() {
        // 600 rows: three blocks, the last one partial.
        let rows = 600;
        let jacobian: Vec<f64> =
            (0..rows).flat_map(|i| [1.0, (i as f64 * 0.01).sin(), (i as f64 * 0.003).cos()]).collect();
        let residuals: Vec<f64> = (0..rows).map(|i| (i as f64 * 0.37).sin()).collect();
        let t = Triangle::reduce(&jacobian, &residuals, 3).unwrap();
        let plain = DMatrix::from_row_slice(rows, 3, &jacobian);
        // Rounding of sums of 600 terms of order one: 600 × 2.2e-16 × 600 < 1e-10.
        assert!((plain.tr_mul(&plain) - t.r.tr_mul(&t.r)).amax() < 1e-10);
        assert!((plain.tr_mul(&DVector::from_column_slice(&residuals)) - t.r.tr_mul(&t.projected)).amax() < 1e-10);
    }

    #[test]
    fn dependent_columns_have_no_covariance() {
        let jacobian: Vec<f64> = (0..10).flat_map(|i| [i as f64, 2.0 * i as f64]).collect();
        let t = Triangle::reduce(&jacobian, &[1.0; 10], 2).unwrap();
        assert!(t.inverse_normal(&[0, 1]).is_none());
        assert!(t.inverse_normal(&[0]).is_some());
        assert!(t.inverse_normal(&[]).is_none());
    }

    #[test]
    fn bad_shapes_and_values_are_refused() {
        assert!(Triangle::reduce(&[1.0; 5], &[1.0; 3], 2).is_none());
        assert!(Triangle::reduce(&[], &[], 0).is_none());
        assert!(Triangle::reduce(&[1.0, f64::NAN], &[1.0; 2], 1).is_none());
        assert!(Triangle::reduce(&[1.0, 1.0], &[1.0, f64::INFINITY], 1).is_none());
    }
}
