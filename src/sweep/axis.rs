//! The scan axis: hertz against sample position, from the repeat of the orders and the evenness of the comb at once.
//! Must not decide which peak is which.
//! Main entries: [`solve`], [`choose`]; main type: [`AxisFit`].

use nalgebra::{DMatrix, DVector};

/// One peak with its place in orders and comb: ν(x) = order · FSR + tooth · Δν.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Placed {
    /// Index of the peak in the line fit.
    pub peak: usize,
    /// Centre mapped to [−1, 1] over the ramp.
    pub u: f64,
    /// Order.
    pub order: i32,
    /// Tooth of the comb.
    pub tooth: i32,
}

/// A solved axis.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct AxisFit {
    /// Legendre coefficients from degree 0, Hz.
    pub coefficients: Vec<f64>,
    /// Comb spacing, Hz, where more than one tooth was placed.
    pub spacing: Option<f64>,
    /// Standard uncertainty of the spacing by the covariance of the centres alone, Hz.
    pub u_spacing: f64,
    /// Σ of squared whitened residuals.
    pub chi_square: f64,
    /// Degrees of freedom.
    pub dof: i64,
    /// Residuals, Hz, in the order of the peaks placed.
    pub residuals: Vec<f64>,
}

impl AxisFit {
    /// Detuning at u, Hz.
    pub fn at(&self, u: f64) -> f64 {
        legendre_sum(&self.coefficients, u)
    }

    /// Hertz per unit of u.
    pub fn slope(&self, u: f64) -> f64 {
        let h = 1e-4;
        (self.at(u + h) - self.at(u - h)) / (2.0 * h)
    }

    /// Largest slope over smallest on the ramp; infinite if the axis turns back.
    pub fn is_one_way(&self, from: f64, to: f64) -> bool {
        (0..=32).all(|i| self.slope(from + (to - from) * f64::from(i) / 32.0) > 0.0)
    }
}

/// Σ cᵢ Pᵢ(u), Clenshaw's recurrence.
pub(super) fn legendre_sum(coefficients: &[f64], u: f64) -> f64 {
    let (mut b1, mut b2) = (0.0, 0.0);
    for (k, c) in coefficients.iter().enumerate().rev() {
        let k = k as f64;
        let b = c + (2.0 * k + 1.0) / (k + 1.0) * u * b1 - (k + 1.0) / (k + 2.0) * b2;
        b2 = b1;
        b1 = b;
    }
    b1
}

fn legendre(degree: usize, u: f64) -> f64 {
    let mut unit = vec![0.0; degree + 1];
    unit[degree] = 1.0;
    legendre_sum(&unit, u)
}

/// Solves Σ cᵢ Pᵢ(u) − tooth·Δν = order·FSR for c and Δν, weighted by the covariance of the centres.
///
/// * `covariance`: of the placed peaks' frequencies, Hz², in the same order.
/// * `terms`: highest degree, at least 1.
/// * `with_comb`: Δν is unknown too; else every tooth must be 0.
///
/// Linear and closed: whiten by Cholesky, then normal equations (Legendre polynomials keep them well conditioned).
pub(super) fn solve(
    placed: &[Placed],
    covariance: &DMatrix<f64>,
    fsr: f64,
    terms: usize,
    with_comb: bool,
) -> Option<AxisFit> {
    let n = placed.len();
    let unknowns = terms + 1 + usize::from(with_comb);
    if n < unknowns {
        return None;
    }
    // In units of the FSR all numbers are near one.
    let design =
        DMatrix::from_fn(
            n,
            unknowns,
            |i, j| {
                if j <= terms { legendre(j, placed[i].u) } else { -f64::from(placed[i].tooth) }
            },
        );
    let wanted = DVector::from_fn(n, |i, _| f64::from(placed[i].order));
    let whitener = (covariance / (fsr * fsr)).cholesky()?.l();
    let white_design = whitener.solve_lower_triangular(&design)?;
    let white_wanted = whitener.solve_lower_triangular(&wanted)?;
    let qr = white_design.clone().qr();
    let r = qr.r();
    // A vanishing diagonal means that what was seen does not fix an unknown.
    let largest = (0..unknowns).map(|i| r[(i, i)].abs()).fold(0.0, f64::max);
    if (0..unknowns).any(|i| r[(i, i)].abs() < 1e-9 * largest) {
        return None;
    }
    let solution = r.solve_upper_triangular(&(qr.q().transpose() * &white_wanted))?;
    let inverse = r.clone().try_inverse()?;
    let white_residuals = &white_wanted - &white_design * &solution;
    let residuals = (&wanted - &design * &solution) * fsr;
    let variance_of = |i: usize| (0..unknowns).map(|k| inverse[(i, k)].powi(2)).sum::<f64>();
    Some(AxisFit {
        coefficients: (0..=terms).map(|i| solution[i] * fsr).collect(),
        spacing: with_comb.then(|| solution[terms + 1] * fsr),
        u_spacing: if with_comb { variance_of(terms + 1).sqrt() * fsr } else { f64::INFINITY },
        chi_square: white_residuals.norm_squared(),
        dof: n as i64 - unknowns as i64,
        residuals: residuals.iter().copied().collect(),
    })
}

/// Highest degree ever tried: with a handful of orders more would follow noise.
const MOST_TERMS: usize = 6;
/// Chi-square of one degree of freedom at 0.1 %.
const SIGNIFICANT: f64 = 10.83;
/// A term is admissible if it inflates the spacing's uncertainty by less than this over the best one with fewer terms.
const MOST_INFLATION: f64 = 6.0;

/// The axis chosen among degrees, and what the choice costs.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Choice {
    /// The axis.
    pub fit: AxisFit,
    /// Its degree.
    pub terms: usize,
    /// Factor on u for residuals larger than the centres' covariance allows (Birge ratio), at least 1.
    pub birge: f64,
    /// Standard uncertainty for what one more term would change, beyond what scatter explains, Hz.
    pub truncation: f64,
}

/// Chooses the number of terms by the chi-square each must earn at 0.1 %, never by less.
pub(super) fn choose(placed: &[Placed], covariance: &DMatrix<f64>, fsr: f64, with_comb: bool) -> Option<Choice> {
    let (from, to) = placed.iter().fold((f64::MAX, f64::MIN), |(a, b), p| (a.min(p.u), b.max(p.u)));
    let mut fits: Vec<AxisFit> = Vec::new();
    for terms in 1..=MOST_TERMS {
        match solve(placed, covariance, fsr, terms, with_comb) {
            Some(fit) => fits.push(fit),
            None => break,
        }
    }
    let usable = |fit: &AxisFit| fit.is_one_way(from, to);
    // Noise scale from the richest model that keeps two degrees of freedom.
    let scale = fits
        .iter()
        .rev()
        .find(|fit| fit.dof >= 2 && usable(fit))
        .map_or(1.0, |fit| (fit.chi_square / fit.dof as f64).max(1.0));
    let merit = |i: usize| fits[i].chi_square / scale + SIGNIFICANT * i as f64;
    let tightest = fits.iter().map(|fit| fit.u_spacing).fold(f64::INFINITY, f64::min);
    let admissible = |i: usize| {
        usable(&fits[i]) && fits[i].dof >= 0 && (!with_comb || fits[i].u_spacing < MOST_INFLATION * tightest)
    };
    let best = (0..fits.len()).filter(|i| admissible(*i)).min_by(|a, b| merit(*a).total_cmp(&merit(*b)))?;
    let fit = fits[best].clone();
    let birge = if fit.dof > 0 { (fit.chi_square / fit.dof as f64).max(1.0).sqrt() } else { scale.sqrt() };
    let truncation = match (fit.spacing, fits.get(best + 1).and_then(|next| next.spacing.map(|s| (s, next)))) {
        (Some(spacing), Some((other, next))) if next.dof >= 0 && admissible(best + 1) => {
            // For nested models var(difference) = var(richer) − var(poorer).
            let by_chance = (next.u_spacing.powi(2) - fit.u_spacing.powi(2)).max(0.0) * birge * birge;
            ((other - spacing).powi(2) - by_chance).max(0.0).sqrt()
        }
        // No degree of freedom is left to see a further term: allow what the last one changed, if there was one.
        (Some(spacing), _) if best > 0 => fits[best - 1].spacing.map_or(0.0, |before| (before - spacing).abs() / 4.0),
        _ => 0.0,
    };
    Some(Choice { fit, terms: best + 1, birge, truncation })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn legendre_by_hand() {
        // P2(0.5) = -0.125, P3(0.5) = -0.4375.
        assert!((legendre(2, 0.5) + 0.125).abs() < 1e-15);
        assert!((legendre(3, 0.5) + 0.4375).abs() < 1e-15);
    }

    #[test]
    fn recovers_a_bent_axis_and_its_comb() {
        let truth = [0.3e9, 7e9, 0.5e9];
        let (fsr, spacing) = (6.4e9, 0.4e9);
        let mut placed = Vec::new();
        for order in -1..=1 {
            for tooth in 0..3 {
                let wanted = f64::from(order) * fsr + f64::from(tooth) * spacing;
                // Bisection on the truth.
                let (mut a, mut b) = (-1.2, 1.2);
                for _ in 0..80 {
                    let m = (a + b) / 2.0;
                    if legendre_sum(&truth, m) < wanted { a = m } else { b = m }
                }
                if a.abs() < 1.0 {
                    placed.push(Placed { peak: placed.len(), u: a, order, tooth });
                }
            }
        }
        let covariance = DMatrix::identity(placed.len(), placed.len()) * 1e10;
        let choice = choose(&placed, &covariance, fsr, true).expect("fixed by three orders");
        assert_eq!(choice.terms, 2);
        // Noise-free: what remains is rounding of the bisection.
        assert!((choice.fit.spacing.unwrap_or(0.0) - spacing).abs() < 10.0);
    }
}
