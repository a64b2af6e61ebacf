//! Periodicity and noise density of equally spaced samples.
//! Must not know units; frequencies are per unit of the sample interval given.
//! Main entries: [`autocorrelation`], [`dominant_lag`], [`periodogram`].

use std::f64::consts::PI;

use rustfft::FftPlanner;
use rustfft::num_complex::Complex64;

use super::peaks::parabolic_vertex;

/// Autocorrelation of `signal` about its mean for lags 0 to n − 1, 1 at lag 0.
///
/// Order: index = lag in samples. Scaling: every lag is divided by the value at lag 0, so long lags fade as (n −
/// lag)/n. `None` for fewer than two samples, a value that is not finite, or a constant signal.
///
/// # Method
/// 1. Subtract the mean. 2. Pad with zeros to at least 2n, so that ends do not meet. 3. Inverse transform of the
///    squared magnitude.
///
/// Source: Wiener–Khinchin relation (common practice).
///
/// ```
/// use tubewright::numerics::spectra::autocorrelation;
/// let r = autocorrelation(&[1.0, -1.0, 1.0, -1.0]).unwrap_or_default();
/// assert!((r[1] + 0.75).abs() < 1e-12);
/// ```
pub fn autocorrelation(signal: &[f64]) -> Option<Vec<f64>> {
    let n = signal.len();
    let centered = centered(signal)?;
    let padded = n.checked_mul(2)?.checked_next_power_of_two()?;
    let mut buffer: Vec<Complex64> = centered.into_iter().map(|x| Complex64::new(x, 0.0)).collect();
    buffer.resize(padded, Complex64::new(0.0, 0.0));
    let mut planner = FftPlanner::new();
    planner.plan_fft_forward(padded).process(&mut buffer);
    for value in &mut buffer {
        *value = Complex64::new(value.norm_sqr(), 0.0);
    }
    planner.plan_fft_inverse(padded).process(&mut buffer);
    let whole = buffer[0].re;
    (whole > 0.0 && whole.is_finite()).then(|| buffer[..n].iter().map(|value| value.re / whole).collect())
}

/// The strongest period found by [`dominant_lag`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Lag {
    /// Lag in samples, interpolated by a parabola.
    pub lag: f64,
    /// Autocorrelation there; at most about 1.
    pub correlation: f64,
}

/// Highest local maximum of the autocorrelation between `min_lag` and `max_lag`, in samples, ends included.
/// `None` where [`autocorrelation`] has none, or without a maximum in that range. Lag 0 never counts.
pub fn dominant_lag(signal: &[f64], min_lag: usize, max_lag: usize) -> Option<Lag> {
    let correlation = autocorrelation(signal)?;
    let range = min_lag.max(1)..=max_lag.min(correlation.len().saturating_sub(2));
    let best = range
        .filter(|&i| correlation[i - 1] < correlation[i] && correlation[i] >= correlation[i + 1])
        .max_by(|&a, &b| correlation[a].total_cmp(&correlation[b]))?;
    let (lag, correlation) = parabolic_vertex(&correlation, best)?;
    Some(Lag { lag, correlation })
}

/// Taper applied before the transform of [`periodogram`].
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Window {
    /// None; keeps total power exactly.
    Rectangular,
    /// Raised cosine, periodic form; keeps strong lines from spreading.
    Hann,
}

/// One-sided power spectral density.
#[derive(Debug, Clone, PartialEq)]
pub struct Periodogram {
    /// Distance of neighbouring frequencies, 1/(n·sample_interval). Entry k of `density` is at k times this.
    pub frequency_step: f64,
    /// Signal² per unit of frequency, n/2 + 1 entries from frequency 0 up.
    pub density: Vec<f64>,
}

impl Periodogram {
    /// Root mean square of the signal between two frequencies, both included: √(Σ density · frequency_step). 0 for an
    /// empty band.
    pub fn rms_between(&self, lowest: f64, highest: f64) -> f64 {
        let inside = |k: usize| (lowest..=highest).contains(&(k as f64 * self.frequency_step));
        let sum: f64 =
            self.density.iter().enumerate().filter(|(k, _)| inside(*k)).map(|(_, d)| d).fold(0.0, |a, d| a + d);
        (sum * self.frequency_step).sqrt()
    }
}

/// Periodogram of `signal` about its mean.
///
/// * `sample_interval`: time per sample, above 0; frequencies come out per unit of it.
/// * Scaling: Σ density · frequency_step is the mean square about the mean (exactly for [`Window::Rectangular`], on
///   average for the other).
///
/// `None` for fewer than two samples, a value that is not finite, or an interval that is not above 0.
/// Formula: density = c·Δt·|X|²/Σw², c = 2 but 1 at frequency 0 and at half the sampling rate (common practice).
pub fn periodogram(signal: &[f64], sample_interval: f64, window: Window) -> Option<Periodogram> {
    let n = signal.len();
    if !(sample_interval > 0.0 && sample_interval.is_finite()) {
        return None;
    }
    let centered = centered(signal)?;
    let weight = |i: usize| match window {
        Window::Rectangular => 1.0,
        Window::Hann => 0.5 - 0.5 * (2.0 * PI * i as f64 / n as f64).cos(),
    };
    let mut buffer: Vec<Complex64> =
        centered.iter().enumerate().map(|(i, x)| Complex64::new(x * weight(i), 0.0)).collect();
    FftPlanner::new().plan_fft_forward(n).process(&mut buffer);
    let scale = sample_interval / (0..n).map(|i| weight(i).powi(2)).sum::<f64>();
    let sides = |k: usize| if k == 0 || 2 * k == n { 1.0 } else { 2.0 };
    let density = buffer.iter().take(n / 2 + 1).enumerate().map(|(k, x)| sides(k) * scale * x.norm_sqr()).collect();
    Some(Periodogram { frequency_step: 1.0 / (n as f64 * sample_interval), density })
}

fn centered(signal: &[f64]) -> Option<Vec<f64>> {
    if signal.len() < 2 {
        return None;
    }
    let mean = super::summary::mean(signal)?;
    Some(signal.iter().map(|x| x - mean).collect())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn wave(n: usize, period: f64) -> Vec<f64> {
        (0..n).map(|i| 5.0 + 2.0 * (2.0 * PI * i as f64 / period).cos()).collect()
    }

    #[test]
    fn autocorrelation_agrees_with_the_sum() {
        let signal = [3.0, 1.0, 4.0, 1.0, 5.0, 9.0, 2.0];
        let mean = signal.iter().sum::<f64>() / 7.0;
        let plain = |lag: usize| (lag..7).map(|i| (signal[i] - mean) * (signal[i - lag] - mean)).sum::<f64>();
        for (lag, value) in autocorrelation(&signal).unwrap().iter().enumerate() {
            assert!((value - plain(lag) / plain(0)).abs() < 1e-13);
        }
    }

    #[test]
    fn the_period_of_a_wave_is_found() {
        let found = dominant_lag(&wave(2000, 37.3), 10, 100).unwrap();
        // The fading with lag pulls the first maximum by about period²/(4π²·n) = 0.02; the parabola adds less.
        assert!((found.lag - 37.3).abs() < 0.05, "{found:?}");
        assert!(found.correlation > 0.97);
        assert_eq!(dominant_lag(&wave(2000, 37.3), 40, 60), None);
    }

    #[test]
    fn a_line_has_its_power_at_its_frequency() {
        // Period 10 samples of 0.1 s: 1 Hz, mean square 2²/2.
        for window in [Window::Rectangular, Window::Hann] {
            let found = periodogram(&wave(1000, 10.0), 0.1, window).unwrap();
            let top = (0..found.density.len()).max_by(|&a, &b| found.density[a].total_cmp(&found.density[b])).unwrap();
            assert!((top as f64 * found.frequency_step - 1.0).abs() < 1e-12);
            assert!((found.rms_between(0.9, 1.1) - 2f64.sqrt()).abs() < 1e-9);
        }
    }

    #[test]
    fn total_power_is_the_mean_square() {
        for n in [8, 9] {
            let signal: Vec<f64> = (0..n).map(|i| ((i * i) as f64 * 0.7).sin()).collect();
            let mean = signal.iter().sum::<f64>() / n as f64;
            let square = signal.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / n as f64;
            let found = periodogram(&signal, 0.25, Window::Rectangular).unwrap();
            assert!((found.rms_between(0.0, f64::INFINITY).powi(2) - square).abs() < 1e-13);
        }
    }

    #[test]
    fn bad_input_is_none() {
        for signal in [&[][..], &[1.0], &[2.0; 5], &[1.0, f64::NAN, 2.0]] {
            assert_eq!(autocorrelation(signal), None);
            assert_eq!(dominant_lag(signal, 0, 10), None);
        }
        assert_eq!(dominant_lag(&[1.0, 2.0], 0, usize::MAX), None);
        assert_eq!(dominant_lag(&wave(50, 7.0), 9, 3), None);
        for interval in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert_eq!(periodogram(&[1.0, 2.0], interval, Window::Hann), None);
        }
        assert_eq!(periodogram(&[1.0], 1.0, Window::Hann), None);
    }
}
