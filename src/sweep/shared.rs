//! One scan axis for all captures at the same ramp settings: hertz against ramp voltage, from every repeat seen so far.
//! Must not know combs: a mode's own repeat one order on is all it needs.
//! Main type: [`SharedAxis`].

use nalgebra::{DMatrix, DVector};

use super::Place;
use super::axis::legendre_sum;

/// Highest degree gathered; how many are used depends on how many orders the ramp holds.
const MOST_TERMS: usize = 8;
/// Terms beyond the number of whole orders. More could draw a wave that repeats from order to order, which no repeat sees.
const TERMS_BEYOND_ORDERS: f64 = 2.0;
/// Chi-square a further term must earn: one degree of freedom at 0.1 %.
const SIGNIFICANT: f64 = 10.83;
/// Repeats wanted for every term.
const PAIRS_A_TERM: f64 = 4.0;

/// Gathers repeats (the same light at two voltages, a whole number of orders apart) and solves for the axis.
///
/// Σ cᵢ [Pᵢ(v₂) − Pᵢ(v₁)] = (k₂ − k₁)·FSR, i from 1, v the ramp mapped to [−1, 1]: linear in c, closed, and every
/// capture's own comb position drops out (`measurement.md` §2: one axis shared over the captures of a run).
#[derive(Debug, Clone, PartialEq)]
pub struct SharedAxis {
    middle: f64,
    half: f64,
    fsr: f64,
    normal: DMatrix<f64>,
    gradient: DVector<f64>,
    square: f64,
    n_pairs: f64,
    coefficients: Vec<f64>,
}

impl SharedAxis {
    /// * `ends`: ramp voltages between which peaks will be seen, V. * `fsr`: Hz.
    pub fn new(ends: (f64, f64), fsr: f64) -> Self {
        Self {
            middle: (ends.0 + ends.1) / 2.0,
            half: ((ends.1 - ends.0) / 2.0).abs(),
            fsr,
            normal: DMatrix::zeros(MOST_TERMS, MOST_TERMS),
            gradient: DVector::zeros(MOST_TERMS),
            square: 0.0,
            n_pairs: 0.0,
            coefficients: Vec::new(),
        }
    }

    fn mapped(&self, ramp: f64) -> f64 {
        (ramp - self.middle) / self.half
    }

    /// Takes the repeats of one mode in one capture; `u_ramp`: standard uncertainty of a place, V.
    pub fn add(&mut self, places: &[Place], u_ramp: f64) {
        let usable = u_ramp > 0.0 && u_ramp.is_finite() && self.half > 0.0;
        for pair in places.windows(2).filter(|_| usable) {
            let (a, b) = (self.mapped(pair[0].ramp), self.mapped(pair[1].ramp));
            let orders = f64::from(pair[1].order - pair[0].order);
            if !(a.is_finite() && b.is_finite()) || orders == 0.0 {
                continue;
            }
            // Two places of equal uncertainty; in units of the ramp's half, so that sums stay near one.
            let weight = (u_ramp / self.half).powi(-2) / 2.0;
            let row: Vec<f64> = (1..=MOST_TERMS).map(|i| basis(i, b) - basis(i, a)).collect();
            for i in 0..MOST_TERMS {
                for j in 0..MOST_TERMS {
                    self.normal[(i, j)] += weight * row[i] * row[j];
                }
                self.gradient[i] += weight * row[i] * orders;
            }
            self.square += weight * orders * orders;
            self.n_pairs += 1.0;
        }
    }

    /// Solves with what was taken so far; `false` leaves the axis as it was.
    pub fn solve(&mut self) -> bool {
        // A straight first fit tells how many orders the ramp holds: P₁ runs over 2, one order is 1.
        let Some((line, _)) = self.with_terms(1) else { return false };
        let seen = ((2.0 * line[0].abs()).floor() + TERMS_BEYOND_ORDERS) as usize;
        let most = ((self.n_pairs / PAIRS_A_TERM) as usize).min(seen).clamp(1, MOST_TERMS);
        let fits: Vec<(DVector<f64>, f64)> = (1..=most).map_while(|terms| self.with_terms(terms)).collect();
        let Some(first) = fits.first() else { return false };
        // Noise scale: c₁ volts-to-hertz turns the residual sum into a plain chi-square.
        let per_order = first.0[0].abs().powi(2).recip().max(1e-300);
        let chi: Vec<f64> = fits.iter().map(|fit| fit.1.max(0.0) * per_order).collect();
        let richest = fits.len();
        let scale = (chi[richest - 1] / (self.n_pairs - richest as f64).max(1.0)).max(1.0);
        let best = (0..richest).min_by(|a, b| {
            let merit = |i: usize| chi[i] / scale + SIGNIFICANT * i as f64;
            merit(*a).total_cmp(&merit(*b))
        });
        let Some(best) = best else { return false };
        self.coefficients = fits[best].0.iter().copied().collect();
        true
    }

    /// Least squares with a number of terms: coefficients in orders, and the residual sum.
    fn with_terms(&self, terms: usize) -> Option<(DVector<f64>, f64)> {
        let normal = self.normal.view((0, 0), (terms, terms)).into_owned();
        let gradient = self.gradient.rows(0, terms).into_owned();
        let scale: Vec<f64> = (0..terms).map(|i| normal[(i, i)].max(1e-300).sqrt()).collect();
        let scaled = DMatrix::from_fn(terms, terms, |i, j| normal[(i, j)] / (scale[i] * scale[j]));
        let right = DVector::from_fn(terms, |i, _| gradient[i] / scale[i]);
        let solved = scaled.cholesky()?.solve(&right);
        let coefficients = DVector::from_fn(terms, |i, _| solved[i] / scale[i]);
        Some((coefficients.clone(), self.square - coefficients.dot(&gradient)))
    }

    /// Detuning from the middle of the ramp, Hz; none before the first [`SharedAxis::solve`].
    pub fn detuning(&self, ramp: f64) -> Option<f64> {
        if self.coefficients.is_empty() {
            return None;
        }
        let mut all = vec![0.0];
        all.extend(&self.coefficients);
        Some((legendre_sum(&all, self.mapped(ramp)) - legendre_sum(&all, 0.0)) * self.fsr)
    }

    /// A mode's place within the order, in [0, FSR), Hz, and its standard uncertainty from noise, Hz.
    pub fn position(&self, places: &[Place], u_ramp: f64) -> Option<(f64, f64)> {
        let first = places.first()?;
        let mut sum = 0.0;
        for place in places {
            sum += self.detuning(place.ramp)? - f64::from(place.order - first.order) * self.fsr;
        }
        let n = places.len() as f64;
        let step = 1e-3 * self.half;
        let slope = (self.detuning(first.ramp + step)? - self.detuning(first.ramp - step)?) / (2.0 * step);
        Some(((sum / n).rem_euclid(self.fsr), slope.abs() * u_ramp / n.sqrt()))
    }
}

fn basis(degree: usize, u: f64) -> f64 {
    let mut unit = [0.0; MOST_TERMS + 1];
    unit[degree] = 1.0;
    legendre_sum(&unit[..=degree], u)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// A bent, non-polynomial ramp: orders against volts on 1 to 9 V.
    fn truth(ramp: f64) -> f64 {
        2.5 * ((ramp - 1.0) / 8.0 + 0.6f64).powf(1.12)
    }

    fn inverse(order: f64) -> f64 {
        let (mut a, mut b) = (0.0, 10.0);
        for _ in 0..80 {
            let m = (a + b) / 2.0;
            if truth(m) < order { a = m } else { b = m }
        }
        a
    }

    #[test]
    fn walking_modes_straighten_any_smooth_ramp() {
        let fsr = 6.4e9;
        let mut axis = SharedAxis::new((1.0, 9.0), fsr);
        let places = |phase: f64| {
            (0..4)
                .map(|k| Place { ramp: inverse(phase + f64::from(k)), order: k })
                .filter(|p| p.ramp > 1.0 && p.ramp < 9.0)
                .collect::<Vec<_>>()
        };
        for step in 0..400 {
            axis.add(&places(f64::from(step) / 400.0 + 0.8), 1e-4);
        }
        assert!(axis.solve());
        // Whatever the phase, a comb tooth 1 GHz on reads 1 GHz on.
        for step in 0..50 {
            let phase = 0.8 + f64::from(step) / 60.0;
            let (a, _) = axis.position(&places(phase), 1e-4).unwrap();
            let (b, _) = axis.position(&places(phase + 1e9 / fsr), 1e-4).unwrap();
            let spacing = (b - a).rem_euclid(fsr);
            // 1 MHz: what degree 4 leaves of this power law between its orders, a thousandth of the spacing.
            assert!((spacing - 1e9).abs() < 1e6, "{spacing} at {phase}");
        }
    }

    #[test]
    fn without_repeats_there_is_no_axis() {
        let mut axis = SharedAxis::new((1.0, 9.0), 6.4e9);
        axis.add(&[Place { ramp: 3.0, order: 0 }], 1e-3);
        assert!(!axis.solve());
        assert_eq!(axis.detuning(3.0), None);
    }
}
