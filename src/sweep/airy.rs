//! The line of a Fabry-Perot interferometer along one ramp, with its derivatives.
//! Must not fit.
//! Main entry: [`light`]; main type: [`Bins`].

use std::f64::consts::{PI, TAU};

/// Phases of the bins of one ramp.
pub(super) struct Bins {
    /// sin and cos of 2π times the detuning in orders.
    turns: Vec<(f64, f64)>,
    /// What a bin's mean adds to its middle, times the second derivative by phase, rad².
    bow: Vec<f64>,
}

impl Bins {
    /// * `detuning`: of each bin's middle, orders. `x`: sample positions. `bow`: as of the samples.
    pub fn new(detuning: &[f64], x: &[f64], bow: &[f64]) -> Self {
        let last = x.len().saturating_sub(1);
        let speed = |i: usize| {
            let (a, b) = (i.saturating_sub(1), (i + 1).min(last));
            if b > a { TAU * (detuning[b] - detuning[a]) / (x[b] - x[a]) } else { 0.0 }
        };
        Self {
            turns: detuning.iter().map(|v| (TAU * v).sin_cos()).collect(),
            bow: bow.iter().enumerate().map(|(i, b)| if *b > 0.0 { b * speed(i).powi(2) } else { 0.0 }).collect(),
        }
    }
}

/// A light of unit height in every bin, not weighted.
pub(super) struct Light {
    /// Mean over the bin.
    pub value: Vec<f64>,
    /// Derivative by detuning, per order.
    pub slope: Vec<f64>,
    /// Derivative by full width at half maximum, per order.
    pub by_width: Vec<f64>,
}

/// A = 1 / (1 + K sin²(ψ/2)), ψ the phase from the light's place, K = 1 / sin²(π w/2) for a full width w at half maximum
/// in orders (Airy; `K = (2F/π)²` for high finesse F = 1/w).
///
/// * `place`, `width`: orders.
pub(super) fn light(bins: &Bins, place: f64, width: f64) -> Light {
    let n = bins.turns.len();
    let (sin_place, cos_place) = (TAU * place).sin_cos();
    let (sin_half, cos_half) = (PI * width / 2.0).sin_cos();
    let k = 1.0 / (sin_half * sin_half);
    let k_by_width = -PI * cos_half * k / sin_half;
    let mut light = Light { value: vec![0.0; n], slope: vec![0.0; n], by_width: vec![0.0; n] };
    let out = light.value.iter_mut().zip(&mut light.slope).zip(&mut light.by_width);
    for (((sin, cos), bow), ((value, slope), by_width)) in bins.turns.iter().zip(&bins.bow).zip(out) {
        let c = cos * cos_place + sin * sin_place;
        let s = sin * cos_place - cos * sin_place;
        let square = (1.0 - c) / 2.0;
        let a = 1.0 / (1.0 + k * square);
        let bent = -0.5 * k * c * a * a + 0.5 * k * k * s * s * a * a * a;
        *value = a + bow * bent;
        *slope = -PI * k * s * a * a;
        *by_width = -square * a * a * k_by_width;
    }
    light
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn half_height_at_half_width_and_derivatives_by_difference() {
        let x: Vec<f64> = (0..9).map(f64::from).collect();
        let detuning: Vec<f64> = x.iter().map(|x| 0.3 + 0.01 * (x - 4.0)).collect();
        let bins = Bins::new(&detuning, &x, &[0.0; 9]);
        let at = light(&bins, 0.3, 0.04);
        assert!(
            (at.value[4] - 1.0).abs() < 1e-12 && (at.value[6] - 0.5).abs() < 1e-12 && (at.value[2] - 0.5).abs() < 1e-12
        );
        let step = 1e-6;
        let (left, right) = (light(&bins, 0.3 + step, 0.04), light(&bins, 0.3 - step, 0.04));
        let (narrow, wide) = (light(&bins, 0.3, 0.04 - step), light(&bins, 0.3, 0.04 + step));
        for i in 0..9 {
            assert!((at.slope[i] - (right.value[i] - left.value[i]) / (2.0 * step)).abs() < 1e-5, "{i}");
            assert!((at.by_width[i] - (wide.value[i] - narrow.value[i]) / (2.0 * step)).abs() < 1e-5, "{i}");
        }
    }

    #[test]
    fn a_bin_is_the_mean_of_its_samples() {
        // Bins of five samples across a line of forty: fourth order is all that is left.
        let fine: Vec<f64> = (0..205).map(|i| 0.001 * (f64::from(i) - 100.0)).collect();
        let mean = |values: &[f64]| values.chunks(5).map(|c| c.iter().sum::<f64>() / 5.0).collect::<Vec<f64>>();
        let x: Vec<f64> = (0..205).map(f64::from).collect();
        let all = light(&Bins::new(&fine, &x, &[0.0; 205]), 0.0, 0.04);
        let binned = light(&Bins::new(&mean(&fine), &mean(&x), &[1.0; 41]), 0.0, 0.04);
        for (a, b) in mean(&all.value).iter().zip(&binned.value) {
            assert!((a - b).abs() < 1e-4, "{a} {b}");
        }
    }
}
