//! The detector's single pole on bins of unequal size.
//! Must not fit.
//! Main type: [`Lag`].

/// One-pole low pass over given places: y' = (f − y)/τ, f straight between neighbours, started at rest.
///
/// yᵢ = a yᵢ₋₁ + α fᵢ₋₁ + β fᵢ with t = h/τ, a = e⁻ᵗ, g = (1 − a)/t, α = g − a, β = 1 − g: the exact integral for such f.
pub(super) struct Lag {
    steps: Vec<Step>,
}

/// Weights of one step from place to place, and their derivatives by τ.
#[derive(Clone, Copy)]
struct Step {
    a: f64,
    alpha: f64,
    beta: f64,
    da: f64,
    dalpha: f64,
    dbeta: f64,
}

impl Step {
    fn new(h: f64, pole: f64) -> Self {
        let t = h / pole;
        let a = (-t).exp();
        // The series avoids 1 − (1 − t/2) for steps far below τ.
        let (g, dg) = if t < 1e-3 {
            (1.0 - t / 2.0 + t * t / 6.0, -0.5 + t / 3.0)
        } else {
            ((1.0 - a) / t, (a * t - (1.0 - a)) / (t * t))
        };
        let by_pole = -t / pole;
        Self { a, alpha: g - a, beta: 1.0 - g, da: -a * by_pole, dalpha: (dg + a) * by_pole, dbeta: -dg * by_pole }
    }
}

impl Lag {
    /// * `places`: ascending, samples. `pole`: time constant, samples; below 0.001 it counts as 0.001.
    pub fn new(places: &[f64], pole: f64) -> Self {
        let pole = pole.max(1e-3);
        let mut steps: Vec<Step> = Vec::with_capacity(places.len());
        let mut last = f64::NAN;
        for pair in places.windows(2) {
            let h = pair[1] - pair[0];
            match steps.last() {
                Some(step) if h == last => steps.push(*step),
                _ => steps.push(Step::new(h, pole)),
            }
            last = h;
        }
        Self { steps }
    }

    /// Filters values that begin at place `from`.
    pub fn apply(&self, values: &mut [f64], from: usize) {
        let Some(&first) = values.first() else { return };
        let (mut y, mut before) = (first, first);
        for (value, s) in values[1..].iter_mut().zip(&self.steps[from..]) {
            y = s.a * y + s.alpha * before + s.beta * *value;
            before = *value;
            *value = y;
        }
    }

    /// Filters values that begin at the first place; returns the derivative of the output by the pole.
    pub fn derivative(&self, values: &mut [f64]) -> Vec<f64> {
        let Some(&first) = values.first() else { return Vec::new() };
        let (mut y, mut before, mut dy) = (first, first, 0.0);
        let mut derivative = vec![0.0; values.len()];
        for (i, s) in self.steps.iter().enumerate() {
            let value = values[i + 1];
            dy = s.a * dy + s.da * y + s.dalpha * before + s.dbeta * value;
            y = s.a * y + s.alpha * before + s.beta * value;
            before = value;
            values[i + 1] = y;
            derivative[i + 1] = dy;
        }
        derivative
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_step_and_a_slope_by_hand_and_the_derivative_by_difference() {
        let places = [0.0, 1.0, 3.0, 3.5, 6.0, 10.0];
        // A slope f = x lags by τ(1 − e^(−x/τ)): y = x − τ + τ e^(−x/τ).
        let mut slope = places.to_vec();
        Lag::new(&places, 2.0).apply(&mut slope, 0);
        for (x, y) in places.iter().zip(&slope) {
            assert!((y - (x - 2.0 + 2.0 * (-x / 2.0f64).exp())).abs() < 1e-12, "{x}: {y}");
        }
        let values = [1.0, 4.0, 2.0, 7.0, 1.0, 0.0];
        let filtered = |pole: f64| {
            let mut y = values.to_vec();
            Lag::new(&places, pole).apply(&mut y, 0);
            y
        };
        let derivative = Lag::new(&places, 2.0).derivative(&mut values.to_vec());
        for (i, d) in derivative.iter().enumerate() {
            let by_difference = (filtered(2.0 + 1e-5)[i] - filtered(2.0 - 1e-5)[i]) / 2e-5;
            assert!((d - by_difference).abs() < 1e-8, "{i}: {d} {by_difference}");
        }
    }
}
