//! The scan axis: hertz against sample position, from the repeat of the orders and the evenness of the comb at once.
//! Must not decide which peak is which.
//! Main entries: [`solve`], [`choose`]; main type: [`AxisFit`].

use nalgebra::{DMatrix, DVector};

use crate::numerics::distributions::excess_ratio;

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
    /// Class of the peak: one light in every order.
    pub class: usize,
}

/// What stands for the places of modes within an order.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Offsets {
    /// Teeth of an even comb: one unknown, its spacing.
    Comb,
    /// An unknown offset for every class but the first: nothing is assumed of the modes.
    Classes(usize),
}

impl Offsets {
    fn unknowns(self) -> usize {
        match self {
            Self::Comb => 1,
            Self::Classes(n) => n.saturating_sub(1),
        }
    }
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

    /// Root mean square residual, Hz.
    pub fn rms(&self) -> f64 {
        let n = self.residuals.len().max(1) as f64;
        (self.residuals.iter().map(|r| r * r).sum::<f64>() / n).sqrt()
    }

    /// Whether the axis never turns back between two places.
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
/// * `offsets`: an even comb, or a free offset for every class (`Σ cᵢ Pᵢ(u) − ν_j = order·FSR`).
///
/// Linear and closed: whiten by Cholesky, then normal equations (Legendre polynomials keep them well conditioned).
pub(super) fn solve(
    placed: &[Placed],
    covariance: &DMatrix<f64>,
    fsr: f64,
    terms: usize,
    offsets: Offsets,
) -> Option<AxisFit> {
    solve_with(placed, covariance, fsr, terms, offsets, None)
}

/// The same, with the highest coefficient held near zero: `prior` is its standard deviation, Hz.
fn solve_with(
    placed: &[Placed],
    covariance: &DMatrix<f64>,
    fsr: f64,
    terms: usize,
    offsets: Offsets,
    prior: Option<f64>,
) -> Option<AxisFit> {
    let n = placed.len();
    let unknowns = terms + 1 + offsets.unknowns();
    let with_comb = offsets == Offsets::Comb;
    if n + usize::from(prior.is_some()) < unknowns {
        return None;
    }
    // In units of the FSR all numbers are near one.
    let design = DMatrix::from_fn(n, unknowns, |i, j| match offsets {
        _ if j <= terms => legendre(j, placed[i].u),
        Offsets::Comb => -f64::from(placed[i].tooth),
        Offsets::Classes(_) => -f64::from(u8::from(placed[i].class == j - terms)),
    });
    let wanted = DVector::from_fn(n, |i, _| f64::from(placed[i].order));
    let whitener = (covariance / (fsr * fsr)).cholesky()?.l();
    let white_design = whitener.solve_lower_triangular(&design)?;
    let white_wanted = whitener.solve_lower_triangular(&wanted)?;
    let (white_design, white_wanted) = match prior {
        Some(sigma) if sigma > 0.0 => {
            let mut row = white_design.insert_row(n, 0.0);
            row[(n, terms)] = fsr / sigma;
            (row, white_wanted.push(0.0))
        }
        _ => (white_design, white_wanted),
    };
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
pub(super) const MOST_TERMS: usize = 6;
/// Chi-square of one degree of freedom at 0.1 %.
pub(super) const SIGNIFICANT: f64 = 10.83;
/// A term is admissible if it inflates the spacing's uncertainty by less than this over the best one with fewer terms.
pub(super) const MOST_INFLATION: f64 = 6.0;

/// From this many terms on a ramp counts as outside any polynomial family.
const SERIES_TERMS: usize = 5;
/// What is left out of a series, as a share of what its last terms changed (found: 0.1 to 0.2 on power-law and creeping ramps).
const SERIES_SHARE: f64 = 0.15;

/// Root mean square of what the last two terms changed in the spacing, Hz; 0 with fewer than two fits.
fn last_changes(fits: &[AxisFit]) -> f64 {
    let spacings: Vec<f64> = fits.iter().rev().take(3).filter_map(|fit| fit.spacing).collect();
    let changes: Vec<f64> = spacings.windows(2).map(|w| (w[0] - w[1]).powi(2)).collect();
    // One change alone is the step from a straight line to the first bend: it says nothing of a series.
    if changes.len() < 2 { 0.0 } else { (changes.iter().sum::<f64>() / changes.len() as f64).sqrt() }
}

/// A ramp's next coefficient over its last: smooth piezo ramps fall off by three or more a degree (found).
pub(super) const FALL_OFF: f64 = 0.35;

/// Change of the spacing that a term too weakly seen to be fitted may still cause, Hz.
///
/// The next coefficient is let in with an expected size of [`FALL_OFF`] times the last one; what the spacing then moves,
/// and what its uncertainty grows by, is the truncation.
fn expected_term(
    placed: &[Placed],
    covariance: &DMatrix<f64>,
    fsr: f64,
    offsets: Offsets,
    fit: &AxisFit,
    birge: f64,
) -> Option<f64> {
    let terms = fit.coefficients.len() - 1;
    let last = fit.coefficients.last()?.abs();
    let sigma = if terms < 2 { 0.1 * last } else { FALL_OFF * last };
    let wider = solve_with(placed, covariance, fsr, terms + 1, offsets, Some(sigma))?;
    let moved = wider.spacing? - fit.spacing?;
    let grown = (wider.u_spacing.powi(2) - fit.u_spacing.powi(2)).max(0.0) * birge * birge;
    // Where the term is well seen, `moved` is what `grown` expects: the two are one effect, counted once.
    Some((moved * moved).max(grown).sqrt())
}

/// The axis chosen among degrees, and what the choice costs.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Choice {
    /// The axis.
    pub fit: AxisFit,
    /// Its degree.
    pub terms: usize,
    /// Factor on u for residuals larger than the centres' covariance allows (Birge ratio), at least 1.
    pub birge: f64,
    /// The same for the places of single lines: they do not gain what the comb does.
    pub birge_of_places: f64,
    /// Standard uncertainty for what one more term would change, beyond what scatter explains, Hz.
    pub truncation: f64,
    /// The part of it that stands for a series that goes on, Hz.
    pub series: f64,
    /// All degrees tried, from 1.
    pub tried: Vec<AxisFit>,
}

/// Factor on stated uncertainties for residuals that contradict them; of a fit without any left over, what others say.
fn birge_of(fit: &AxisFit, scale: f64) -> f64 {
    if fit.dof > 0 { excess_ratio(fit.chi_square, fit.dof as f64) } else { scale.sqrt() }
}

/// Chooses the number of terms by the chi-square each must earn at 0.1 %, never by less.
pub(super) fn choose(placed: &[Placed], covariance: &DMatrix<f64>, fsr: f64, offsets: Offsets) -> Option<Choice> {
    let with_comb = offsets == Offsets::Comb;
    let (from, to) = placed.iter().fold((f64::MAX, f64::MIN), |(a, b), p| (a.min(p.u), b.max(p.u)));
    let mut fits: Vec<AxisFit> = Vec::new();
    let unknowns = |terms: usize| terms + 1 + offsets.unknowns();
    // A quarter of the peaks must be left over to contradict the model chosen; richer ones only bear witness.
    let spare = if placed.len() <= 5 { 0 } else { placed.len() / 4 };
    let spares = |terms: usize| terms == 1 || unknowns(terms) + spare <= placed.len();
    for terms in 1..=MOST_TERMS {
        match solve(placed, covariance, fsr, terms, offsets) {
            Some(fit) => fits.push(fit),
            None => break,
        }
    }
    let usable = |fit: &AxisFit| fit.is_one_way(from, to);
    // Noise scale: the best that any model leaves, at least what the centres' covariance says.
    let scale = fits
        .iter()
        .filter(|fit| fit.dof >= 1 && usable(fit))
        .map(|fit| (fit.chi_square / fit.dof as f64).max(1.0))
        .fold(f64::INFINITY, f64::min);
    let scale = if scale.is_finite() { scale } else { 1.0 };
    let merit = |i: usize| fits[i].chi_square / scale + SIGNIFICANT * i as f64;
    // A poor model is tight about a wrong value: its residuals are counted in before it may rule out a richer one.
    let spread = |fit: &AxisFit| fit.u_spacing * birge_of(fit, scale);
    let tightest = |i: usize| fits[..=i].iter().filter(|fit| usable(fit)).map(spread).fold(f64::INFINITY, f64::min);
    let admissible = |i: usize| {
        usable(&fits[i]) && fits[i].dof >= 0 && (!with_comb || spread(&fits[i]) <= MOST_INFLATION * tightest(i))
    };
    let best =
        (0..fits.len()).filter(|i| admissible(*i) && spares(*i + 1)).min_by(|a, b| merit(*a).total_cmp(&merit(*b)))?;
    let fit = fits[best].clone();
    let birge = birge_of(&fit, scale);
    let next = fits.get(best + 1).filter(|next| next.dof >= 0 && admissible(best + 1));
    let beyond = match (fit.spacing, next.and_then(|next| next.spacing.map(|s| (s, next)))) {
        (Some(spacing), Some((other, next))) => {
            // For nested models var(difference) = var(richer) − var(poorer).
            let by_chance = (next.u_spacing.powi(2) - fit.u_spacing.powi(2)).max(0.0) * birge * birge;
            ((other - spacing).powi(2) - by_chance).max(0.0).sqrt()
        }
        _ => 0.0,
    };
    // A ramp that needs many terms, or all there are data for, is no polynomial: its series goes on.
    let goes_on = best + 1 >= SERIES_TERMS || (next.is_none() && best + 1 >= 3);
    let series = if goes_on { SERIES_SHARE * last_changes(&fits[..=best]) } else { 0.0 };
    let truncation = expected_term(placed, covariance, fsr, offsets, &fit, birge).unwrap_or(beyond).hypot(series);
    Some(Choice { fit, terms: best + 1, birge, birge_of_places: birge, truncation, series, tried: fits })
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
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
                    placed.push(Placed { peak: placed.len(), u: a, order, tooth, class: tooth as usize });
                }
            }
        }
        let covariance = DMatrix::identity(placed.len(), placed.len()) * 1e10;
        let choice = choose(&placed, &covariance, fsr, Offsets::Comb).unwrap();
        assert_eq!(choice.terms, 2);
        // Noise-free: what remains is rounding of the bisection.
        assert!((choice.fit.spacing.unwrap_or(0.0) - spacing).abs() < 10.0);
    }
}
