//! Lines of a spectrum: whether the highest stands above chance, where it is and how strong.
//! Must not know units; frequencies are per unit of the sample interval.
//! Main functions: [`whitened`], [`highest`], [`hann_line`], [`hann_power`].

use std::f64::consts::{LN_2, PI, TAU};

use super::spectra::Periodogram;
use super::summary::median;

/// Equivalent noise width of a Hann window, in steps of frequency (exact: N·Σw²/(Σw)²).
pub const HANN_NOISE_WIDTH: f64 = 1.5;

/// Most bins between the places at which the running median is taken; fewer near frequency 0, where spectra are steep.
const STRIDE: usize = 16;
/// Bins next to frequency 0 that hold what a taper leaves of the mean.
const OF_THE_MEAN: usize = 3;
/// Fewest bins on either side.
const LEAST_HALF: usize = 5;

/// A density over its running median, scaled so that noise alone has mean 1.
///
/// * `density`: of a periodogram, from frequency 0 up.
/// * `half`: bins on either side over which the median runs.
///
/// Method: the ordinates of noise are exponential, whose median is ln 2 of their mean. The window is symmetric about its
/// bin, so that a slope does not bias it; toward frequency 0 it shrinks. The median is taken at every bin k/16, at most
/// every 16th. A bin whose median is 0 comes out as 0.
pub fn whitened(density: &[f64], half: usize) -> Vec<f64> {
    let mut out = Vec::with_capacity(density.len());
    while out.len() < density.len() {
        let first = out.len();
        let block = &density[first..density.len().min(first + (first / STRIDE).clamp(1, STRIDE))];
        let middle = first + block.len() / 2;
        let reach = half.min(middle.saturating_sub(OF_THE_MEAN)).max(LEAST_HALF);
        let end = (middle + reach + 1).min(density.len());
        let floor = median(&density[middle.saturating_sub(reach)..end]).unwrap_or(0.0) / LN_2;
        out.extend(block.iter().map(|value| if floor > 0.0 { value / floor } else { 0.0 }));
    }
    out
}

/// The highest ordinate of a whitened spectrum.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Highest {
    /// Its index.
    pub index: usize,
    /// Fisher's g: its share of the sum of all.
    pub g: f64,
    /// Probability that noise alone shows as large a share, at most 1.
    pub probability: f64,
}

/// Fisher's test for the highest of `ordinates`.
///
/// Formula: P(g) ≤ n(1 − g)^(n−1), the first term of the exact series and an upper bound of it (R. A. Fisher, Proc. R.
/// Soc. A 125, 54, 1929). `None` for fewer than 8 ordinates, or a sum that is not above 0.
pub fn highest(ordinates: &[f64]) -> Option<Highest> {
    let n = ordinates.len();
    let sum: f64 = ordinates.iter().sum();
    let index = (0..n).max_by(|&a, &b| ordinates[a].total_cmp(&ordinates[b]))?;
    if n < 8 || !(sum > 0.0 && sum.is_finite()) {
        return None;
    }
    let g = ordinates[index] / sum;
    let probability = (n as f64 * (1.0 - g).max(0.0).powf(n as f64 - 1.0)).min(1.0);
    Some(Highest { index, g, probability })
}

/// A sine found in a spectrum.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tone {
    /// Its frequency.
    pub frequency: f64,
    /// Its mean square, signal².
    pub power: f64,
}

/// Frequency and mean square of a sine whose highest bin in a Hann periodogram is `index`.
///
/// Formula: with r the root of the ratio of the higher neighbour to the highest bin, the sine lies δ = (2r − 1)/(1 + r)
/// bins toward that neighbour; its mean square is 1.5·step·density / W(δ)², W(δ) = sinc(δ)/(1 − δ²) (transform of the
/// Hann window; common practice). `None` at the ends or without power.
pub fn hann_line(spectrum: &Periodogram, index: usize) -> Option<Tone> {
    let density = &spectrum.density;
    let (left, middle, right) = (*density.get(index.checked_sub(1)?)?, *density.get(index)?, *density.get(index + 1)?);
    if !(middle > 0.0 && middle.is_finite()) {
        return None;
    }
    let (side, neighbour) = if right >= left { (1.0, right) } else { (-1.0, left) };
    let r = (neighbour / middle).max(0.0).sqrt();
    let offset = ((2.0 * r - 1.0) / (1.0 + r)).clamp(0.0, 0.5);
    let response = if offset > 1e-6 { (PI * offset).sin() / (PI * offset) / (1.0 - offset * offset) } else { 1.0 };
    Some(Tone {
        frequency: (index as f64 + side * offset) * spectrum.frequency_step,
        power: HANN_NOISE_WIDTH * spectrum.frequency_step * middle / response.powi(2),
    })
}

/// Mean square of `signal` about `mean` at one frequency through a Hann window, signal².
///
/// * `turns`: frequency times sample interval, turns a sample.
///
/// Formula: 2|Σ w x e^(−iωt)|²/(Σw)²; noise of density S adds 1.5·S/T on average.
pub fn hann_power(signal: &[f64], mean: f64, turns: f64) -> f64 {
    let n = signal.len() as f64;
    let (mut cosine, mut sine, mut weights) = (0.0, 0.0, 0.0);
    for (i, value) in signal.iter().enumerate() {
        let weight = 0.5 - 0.5 * (TAU * i as f64 / n).cos();
        let (s, c) = (TAU * turns * i as f64).sin_cos();
        cosine += weight * (value - mean) * c;
        sine += weight * (value - mean) * s;
        weights += weight;
    }
    if weights > 0.0 { 2.0 * (cosine * cosine + sine * sine) / (weights * weights) } else { 0.0 }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::numerics::spectra::{Window, periodogram};

    fn sine(n: usize, frequency: f64, rms: f64) -> Vec<f64> {
        (0..n).map(|i| 1.0 + rms * 2f64.sqrt() * (TAU * frequency * i as f64 / 1000.0 + 0.7).sin()).collect()
    }

    #[test]
    fn a_sine_anywhere_between_bins_has_its_frequency_and_level() {
        for frequency in [100.0, 100.2, 100.37, 100.5, 100.8] {
            let signal = sine(1000, frequency, 0.02);
            let spectrum = periodogram(&signal, 1e-3, Window::Hann).unwrap();
            let top = (1..spectrum.density.len() - 1)
                .max_by(|&a, &b| spectrum.density[a].total_cmp(&spectrum.density[b]))
                .unwrap();
            let found = hann_line(&spectrum, top).unwrap();
            // The image at minus the frequency and the mean add some 1e-5 at 100 bins.
            assert!((found.frequency - frequency).abs() < 1e-3, "{found:?} at {frequency}");
            assert!((found.power.sqrt() / 0.02 - 1.0).abs() < 1e-3, "{found:?} at {frequency}");
            assert!((hann_power(&signal, 1.0, frequency / 1000.0).sqrt() / 0.02 - 1.0).abs() < 1e-4);
        }
    }

    #[test]
    fn fisher_finds_a_line_and_not_chance() {
        // Critical value of g at 5 % for 50 ordinates: 0.13135 (from summing the exact series in another program); the bound
        // of one term is 0.5 % higher there.
        let mut ordinates = vec![1.0; 50];
        ordinates[7] = 0.13135 * 49.0 / (1.0 - 0.13135);
        let found = highest(&ordinates).unwrap();
        assert_eq!(found.index, 7);
        assert!((found.probability - 0.05).abs() < 0.001, "{found:?}");
        ordinates[7] = 40.0;
        assert!(highest(&ordinates).unwrap().probability < 1e-9);
        assert_eq!(highest(&[1.0; 7]), None);
        assert_eq!(highest(&[0.0; 50]), None);
    }

    #[test]
    fn whitening_takes_a_sloping_floor_away() {
        // Exponential ordinates by inversion of an even grid, shuffled by a stride prime to 997; floor falls 100 times.
        let draw = |i: usize| -(1.0 - ((i * 389 % 997) as f64 + 0.5) / 997.0).ln();
        let density: Vec<f64> = (0..997).map(|i| draw(i) * 10f64.powf(-(i as f64) / 498.5)).collect();
        let white = whitened(&density, 50);
        for part in white.chunks(249).take(4) {
            let mean = part.iter().sum::<f64>() / part.len() as f64;
            // 249 exponential ordinates: 6 % of the mean, and 10 % of the median below it; three of both.
            assert!((mean - 1.0).abs() < 0.35, "{mean}");
        }
        assert_eq!(whitened(&[0.0; 20], 3), vec![0.0; 20]);
    }
}
