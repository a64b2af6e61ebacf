//! A fast trace of the total light from a photodiode on the output beam: ripple, discharge noise, tones, detector.
//! Must not know how any of it is measured.
//! Main types: [`LightTrace`], [`LightScene`].

use std::f64::consts::{FRAC_2_PI, PI, SQRT_2, TAU};

use super::{bench::BenchTruth, noise::Noise, trace::Steps, tube::TubeTruth};

/// Level of the light detector at the tube's warm output, V.
const FULL_LEVEL: f64 = 0.8;
/// Input range of the digitizer, V.
const RANGE: (f64, f64) = (-0.1, 1.4);
/// Discharge noise as a sum of relaxing fluctuations: (corner Hz, share of the mean square). Noise of such tubes falls off
/// above some 100 kHz (common practice; shares from memory).
const CORNERS: [(f64, f64); 3] = [(300.0, 0.2), (8e3, 0.4), (80e3, 0.4)];
/// Band in which [`TubeTruth::discharge_noise`] is stated, Hz.
const NOISE_BAND: (f64, f64) = (10.0, 1e6);
/// Mains ripple: (harmonic, relative rms). A bridge rectifier ripples at twice the mains and its multiples; a little of
/// the mains itself gets in (common practice; sizes from memory).
const HARMONICS: [(f64, f64); 4] = [(1.0, 0.1), (2.0, 1.0), (4.0, 0.3), (6.0, 0.1)];
/// Detector noise is stated in this width, Hz.
const DETECTOR_BAND: f64 = 1e6;

/// What a digitizer recorded of the light.
#[derive(Debug, Clone, PartialEq)]
pub struct LightTrace {
    /// Time between samples, s.
    pub time_step: f64,
    /// Volts, each the mean over its interval.
    pub volts: Vec<f64>,
}

/// What stands before the light detector.
pub(super) struct LightScene<'a> {
    pub tube: &'a TubeTruth,
    pub bench: &'a BenchTruth,
    /// Light over the tube's warm output; 0 where the beam is blocked.
    pub share: f64,
    /// Beats of axial modes, Hz.
    pub beats: Vec<f64>,
    /// Time at the begin, s.
    pub at: f64,
}

impl LightScene<'_> {
    /// Records `samples` means of the light, `rate` of them a second.
    ///
    /// 1. Relative light: 1 + mains harmonics + tones + three fluctuations that relax exponentially (Ornstein and
    ///    Uhlenbeck, Phys. Rev. 36, 823, 1930), each drawn exactly with its mean over the interval.
    /// 2. The detector's single pole. 3. Dark level and white noise; the digitizer rounds and clips.
    pub fn record(&self, samples: usize, rate: f64, mut discharge: Noise, mut detector: Noise) -> LightTrace {
        let step = 1.0 / rate;
        let whole: f64 = CORNERS.iter().map(|(corner, share)| share * in_band(*corner)).sum();
        let scale = self.tube.discharge_noise / whole.sqrt();
        let mut relaxing =
            CORNERS.map(|(corner, share)| Relaxing::new(corner, scale * share.sqrt(), step, &mut discharge));
        let lines = self.lines(step);
        let steps = Steps::new(RANGE, self.bench.bits);
        let sigma = self.bench.light_noise * FULL_LEVEL * (0.5 * rate / DETECTOR_BAND).sqrt();
        let pole = 1.0 / (TAU * self.bench.light_bandwidth);
        let decay = (-step / pole).exp();
        let mut passed = None;
        let volts = (0..samples)
            .map(|k| {
                let t = (k as f64 + 0.5) * step;
                let sines: f64 = lines.iter().map(|(f, peak, phase)| peak * (TAU * f * t + phase).sin()).sum();
                let noise: f64 = relaxing.iter_mut().map(|part| part.mean(&mut discharge)).sum();
                let light = self.share * (1.0 + sines + noise);
                let before = *passed.get_or_insert(light);
                let out = light + decay * (before - light);
                passed = Some(out);
                steps.round(FULL_LEVEL * out + self.bench.dark_level + sigma * detector.normal())
            })
            .collect();
        LightTrace { time_step: step, volts }
    }

    /// (frequency Hz, peak over mean, phase at the begin rad) of every line, averaged over a sample.
    fn lines(&self, step: f64) -> Vec<(f64, f64, f64)> {
        // The supply's own ripple and what the tube's truth adds are independent.
        let ripple = self.tube.line_ripple.hypot(self.bench.supply_ripple);
        let whole = HARMONICS.iter().map(|(_, rms)| rms * rms).sum::<f64>().sqrt();
        let mains = HARMONICS.iter().map(|(n, rms)| (n * self.bench.mains, ripple * rms / whole));
        let tone = (self.tube.tone_frequency, self.tube.tone_level);
        let beats = self.beats.iter().map(|beat| (*beat, self.tube.beat_level));
        let averaged = |(f, rms): (f64, f64)| {
            let x = PI * f * step;
            let kept = if x > 1e-9 { x.sin() / x } else { 1.0 };
            (f, rms * SQRT_2 * kept, TAU * (f * self.at).fract())
        };
        mains.chain([tone]).chain(beats).filter(|(_, rms)| *rms > 0.0).map(averaged).collect()
    }
}

/// Share of a relaxing fluctuation's mean square inside [`NOISE_BAND`]: (2/π)[arctan(f₂/c) − arctan(f₁/c)].
fn in_band(corner: f64) -> f64 {
    FRAC_2_PI * ((NOISE_BAND.1 / corner).atan() - (NOISE_BAND.0 / corner).atan())
}

/// A fluctuation that relaxes exponentially.
struct Relaxing {
    value: f64,
    decay: f64,
    /// Standard deviation of the next value about `decay`·value.
    kick: f64,
    /// Mean over an interval: weight of both ends, and its standard deviation about that.
    weight: f64,
    spread: f64,
}

impl Relaxing {
    /// * `corner`: Hz. `rms`: its standard deviation. `step`: interval, s.
    ///
    /// Given both ends the integral over the interval is normal, of mean (x₀ + x₁)·tanh(θΔ/2)/θ and variance
    /// (2s²/θ)(Δ − (2/θ)tanh(θΔ/2)), θ = 2π·corner (bridge of the process; any text on stochastic processes).
    fn new(corner: f64, rms: f64, step: f64, noise: &mut Noise) -> Self {
        let theta = TAU * corner;
        let half = (0.5 * theta * step).tanh();
        let decay = (-theta * step).exp();
        let variance = 2.0 * rms * rms / theta * (step - 2.0 / theta * half);
        Self {
            value: rms * noise.normal(),
            decay,
            kick: rms * (1.0 - decay * decay).sqrt(),
            weight: half / (theta * step),
            spread: variance.max(0.0).sqrt() / step,
        }
    }

    fn mean(&mut self, noise: &mut Noise) -> f64 {
        let before = self.value;
        self.value = self.decay * before + self.kick * noise.normal();
        self.weight * (before + self.value) + self.spread * noise.normal()
    }
}

#[cfg(test)]
mod tests {
    use super::super::noise::Purpose;
    use super::*;

    fn scene<'a>(tube: &'a TubeTruth, bench: &'a BenchTruth, share: f64) -> LightScene<'a> {
        LightScene { tube, bench, share, beats: Vec::new(), at: 0.0 }
    }

    fn moments(values: &[f64]) -> (f64, f64) {
        let n = values.len() as f64;
        let mean = values.iter().sum::<f64>() / n;
        (mean, (values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / n).sqrt())
    }

    #[test]
    fn level_noise_and_dark_are_as_stated() {
        let tube = TubeTruth { discharge_noise: 0.01, ..TubeTruth::default() };
        let bench = BenchTruth { supply_ripple: 0.0, ..BenchTruth::default() };
        let stream = |purpose| Noise::new(3, purpose, 7);
        let (discharge, detector) = (stream(Purpose::Light), stream(Purpose::LightDetector));
        let trace = scene(&tube, &bench, 1.0).record(400_000, 5e6, discharge, detector);
        let (mean, rms) = moments(&trace.volts);
        assert!((mean - bench.dark_level - FULL_LEVEL).abs() < 0.01, "80 ms hold 24 turns of the slowest: {mean}");
        // All of the noise, of which the band holds most: 0.8 V × 1 % / √share, share between 0.93 and 1; the slowest
        // fluctuation makes this uncertain by 5 %.
        assert!((rms / 8.2e-3 - 1.0).abs() < 0.12, "{rms}");
        let (discharge, detector) = (stream(Purpose::Light), stream(Purpose::LightDetector));
        let dark = scene(&tube, &bench, 0.0).record(40_000, 5e6, discharge, detector);
        let (mean, rms) = moments(&dark.volts);
        let sigma = bench.light_noise * FULL_LEVEL * 2.5f64.sqrt();
        // Steps of 0.37 mV add their own 1/√12.
        assert!((mean - bench.dark_level).abs() < 1e-4, "{mean}");
        assert!((rms / sigma.hypot(1.5 / 4096.0 / 12f64.sqrt()) - 1.0).abs() < 0.03, "{rms}");
    }

    #[test]
    fn means_over_long_samples_keep_the_variance_that_theory_gives() {
        // Var of a mean over Δ: s²·(2/x²)(x − 1 + e^(−x)), x = θΔ; here x = 3.
        let mut noise = Noise::new(1, Purpose::Light, 0);
        let corner = 3.0 / TAU;
        let mut part = Relaxing::new(corner, 1.0, 1.0, &mut noise);
        let means: Vec<f64> = (0..40_000).map(|_| part.mean(&mut noise)).collect();
        let (_, rms) = moments(&means);
        let theory = (2.0f64 / 9.0 * (2.0 + (-3f64).exp())).sqrt();
        // 40,000 nearly independent means: 0.4 % of a standard deviation; three of them.
        assert!((rms / theory - 1.0).abs() < 0.012, "{rms} {theory}");
    }
}
