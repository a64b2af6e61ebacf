//! Nonlinear least squares with a full account of the fit.
//! Must not know what is fitted; decides nothing about whether a result is good enough.
//! Main entries: [`Model`], [`Options`], [`fit`], [`Fit`].

mod differences;
mod solver;

pub use differences::central_differences;
pub use solver::fit;

/// A model to be fitted: weighted residuals and their derivatives.
pub trait Model {
    /// Number of parameters, at least 1.
    fn n_parameters(&self) -> usize;

    /// Number of data points, at least the number of parameters.
    fn n_points(&self) -> usize;

    /// Writes all `n_points` residuals **(model − data)·weight**, with weight = 1/u or 1, and, if asked, their
    /// derivatives ∂residualᵢ/∂parameterⱼ at `jacobian[i · n_parameters + j]`. Both slices have the exact length and
    /// hold zeros or old values on entry. A value that is not finite means "no model here": the fit steps back.
    fn evaluate(&self, parameters: &[f64], residuals: &mut [f64], jacobian: Option<&mut [f64]>);
}

/// When [`fit`] stops, and where parameters may go.
#[derive(Debug, Clone, PartialEq)]
pub struct Options {
    /// Most calls of [`Model::evaluate`]; the final polish may add up to forty.
    pub max_evaluations: usize,
    /// Stop when a step is below this fraction of the parameters, both measured in units of `D` (see [`fit`]).
    pub relative_step_tolerance: f64,
    /// Stop when the part of the residual that parameters can still remove is below this fraction of the sum of
    /// squares, or when an undisturbed step lowers the sum by less than this fraction.
    pub relative_cost_tolerance: f64,
    /// One `(lowest, highest)` per parameter, both allowed values; ±infinity for none; equal values hold the
    /// parameter fixed.
    pub bounds: Option<Vec<(f64, f64)>>,
}

impl Default for Options {
    fn default() -> Self {
        Self { max_evaluations: 1000, relative_step_tolerance: 1e-10, relative_cost_tolerance: 1e-13, bounds: None }
    }
}

/// Why a fit ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StopReason {
    /// The last step was below the relative step tolerance.
    SmallStep,
    /// The sum of squares could not fall by more than the relative cost tolerance.
    SmallCostChange,
    /// Every residual is exactly zero.
    ZeroResidual,
    /// Every parameter is held by a bound.
    AllAtBound,
    /// The evaluations ran out.
    MaxEvaluations,
    /// No step, however short, lowered the sum of squares; the derivatives may be wrong.
    NoProgress,
    /// The derivatives became infinite or NaN at the best point found.
    NotFinite,
}

impl StopReason {
    /// True if a minimum was reached, as far as the tolerances tell.
    pub fn converged(self) -> bool {
        match self {
            Self::SmallStep | Self::SmallCostChange | Self::ZeroResidual | Self::AllAtBound => true,
            Self::MaxEvaluations | Self::NoProgress | Self::NotFinite => false,
        }
    }
}

/// The account of a fit. "Finished" ([`Fit::stopped`]) and "uncertainty obtained" ([`Fit::covariance`]) are separate.
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// Best parameters found, in the model's order.
    pub parameters: Vec<f64>,
    /// Inverse of JᵀJ at the best parameters, row-major n × n, **not scaled** by the scatter; `None` if the
    /// derivatives are dependent. Parameters at a bound count as known: their rows and columns are 0 and
    /// [`Fit::standard_error`] is `None`.
    pub covariance: Option<Vec<f64>>,
    /// Residuals at the best parameters, (model − data)·weight.
    pub residuals: Vec<f64>,
    /// Sum of the squared residuals.
    pub sum_of_squares: f64,
    /// Points minus parameters that are not at a bound.
    pub degrees_of_freedom: usize,
    /// Calls of [`Model::evaluate`] made.
    pub evaluations: usize,
    /// Why the fit ended.
    pub stopped: StopReason,
    /// Indices of the parameters that sit on a bound, rising.
    pub at_bound: Vec<usize>,
}

impl Fit {
    /// Sum of squares over degrees of freedom; `None` with no degrees of freedom.
    pub fn reduced_chi_square(&self) -> Option<f64> {
        (self.degrees_of_freedom > 0).then(|| self.sum_of_squares / self.degrees_of_freedom as f64)
    }

    /// Standard error of parameter `index`, scaled by the scatter found: √(covarianceᵢᵢ · reduced chi-square).
    /// `None` if there is no covariance, no degree of freedom, the parameter is at a bound, or the index is out of
    /// range.
    pub fn standard_error(&self, index: usize) -> Option<f64> {
        Some((self.variance(index)? * self.reduced_chi_square()?).sqrt())
    }

    /// Standard error of parameter `index` from the weights alone (they must be 1/u). `None` as for
    /// [`Fit::standard_error`], except that no degree of freedom is needed.
    pub fn standard_error_from_weights(&self, index: usize) -> Option<f64> {
        Some(self.variance(index)?.sqrt())
    }

    /// Entry (`i`, `j`) of the unscaled covariance; `None` if there is none or an index is out of range.
    pub fn covariance_at(&self, i: usize, j: usize) -> Option<f64> {
        let n = self.parameters.len();
        if i < n && j < n { self.covariance.as_ref()?.get(i * n + j).copied() } else { None }
    }

    /// Correlation of two parameters, −1 to 1; `None` if either has no variance.
    pub fn correlation(&self, i: usize, j: usize) -> Option<f64> {
        Some(self.covariance_at(i, j)? / (self.variance(i)? * self.variance(j)?).sqrt())
    }

    fn variance(&self, index: usize) -> Option<f64> {
        if self.at_bound.contains(&index) { None } else { self.covariance_at(index, index) }
    }
}

/// Why [`fit`] gave no result at all.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum FitError {
    /// The start does not have one value per parameter, or there is no parameter.
    #[error("fit: {found} starting values for {expected} parameters; expected one for each and at least one")]
    StartLength {
        /// Values given.
        found: usize,
        /// Parameters of the model.
        expected: usize,
    },
    /// Fewer points than parameters.
    #[error("fit: {points} points for {parameters} parameters; expected at least as many points")]
    TooFewPoints {
        /// Points of the model.
        points: usize,
        /// Parameters of the model.
        parameters: usize,
    },
    /// A pair of bounds is missing, NaN or the wrong way round.
    #[error(
        "fit: bounds of parameter {index} are missing or not in order; expected lowest ≤ highest for each parameter"
    )]
    Bounds {
        /// Index of the first faulty pair.
        index: usize,
    },
    /// The start, its residuals or their derivatives are not finite.
    #[error("fit: the start, its residuals or their derivatives are not finite; start elsewhere or remove bad points")]
    NotFiniteAtStart,
}

#[cfg(test)]
mod tests;
