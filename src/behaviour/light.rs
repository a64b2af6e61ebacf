//! One fast trace of the total light: level, mains harmonics, noise in a band, strongest line.
//! Must not compare traces: `noise` does.
//! Main types: [`LightSettings`], [`LightMeasurement`]; main function: [`measure_light`].

use crate::numerics::spectra::{Periodogram, Window, periodogram};
use crate::numerics::summary::{mean, median};
use crate::numerics::tones::{HANN_NOISE_WIDTH, Tone, hann_line, hann_power, highest, whitened};

/// Version of this engine, stored beside every finding.
pub const LIGHT_ENGINE: &str = "light-1";

/// Mains frequencies of the world, Hz.
const MAINS: [f64; 2] = [50.0, 60.0];
/// Farthest that a mains frequency is sought from its name, Hz (normal operation of large grids stays within 0.5 Hz;
/// common practice).
const MAINS_WITHIN: f64 = 1.5;
/// Harmonics among which the mains is sought.
const SOUGHT_HARMONICS: usize = 6;
/// A harmonic this many times above its floor fixes the mains frequency: chance does so once in e²⁰.
const CLEAR: f64 = 20.0;
/// Bins on either side of a harmonic that hold its light: the main lobe of a Hann window has two; four leave 1e-4.
const LINE_BINS: usize = 4;
/// Bins on either side over which the floor under a line runs.
const FLOOR_BINS: usize = 24;
/// Bins on either side over which a spectrum is whitened.
const WHITE_BINS: usize = 60;
/// Cycles of the lowest frequency that a trace must hold.
const LEAST_CYCLES: f64 = 5.0;
/// Samples a cycle of the highest frequency.
const LEAST_SAMPLES: f64 = 2.2;
/// Chance below which a line counts as found.
const CHANCE: f64 = 1e-3;
/// Share of samples at the top step, and its ratio to the step below, at which a trace counts as clipped: noise alone
/// has fewer samples on its last step than on the one before.
const CLIPPED: (f64, f64) = (0.005, 3.0);
/// Variance of a band of Hann ordinates over that of independent ones: neighbours are correlated (Σ ρ² = 35/18, exact
/// for white noise).
const HANN_CORRELATION: f64 = 35.0 / 18.0;

/// How a trace is to be measured.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LightSettings {
    /// The light is let through; else the beam is blocked.
    pub lit: bool,
    /// Band over which noise is summed, Hz.
    pub band: (f64, f64),
    /// Band in which a slow and a fast trace are compared, Hz.
    pub overlap: (f64, f64),
}

/// Mains harmonics of one trace.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MainsRipple {
    /// Mains frequency, Hz.
    pub frequency: f64,
    /// It stood clear of the floor; else it is the nearest grid's name.
    pub clear: bool,
    /// Sum of mean squares of all harmonics in the band, floor taken off, V²; may be below 0 by chance.
    pub power: f64,
    /// Its standard uncertainty from the floor, V².
    pub u_power: f64,
    /// Harmonics summed.
    pub n_harmonics: u32,
}

/// The strongest line of one trace.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LightTone {
    /// Hz.
    pub frequency: f64,
    /// Standard uncertainty from the noise, Hz.
    pub u_frequency: f64,
    /// Mean square, V².
    pub power: f64,
    /// Standard uncertainty from the noise, V².
    pub u_power: f64,
    /// Probability that noise alone shows as much (Fisher).
    pub probability: f64,
}

/// What one trace says.
#[derive(Debug, Clone, PartialEq)]
pub struct LightMeasurement {
    /// Mean level, V.
    pub mean: f64,
    /// Time it lasts, s.
    pub duration: f64,
    /// Samples a second.
    pub sample_rate: f64,
    /// Noise in the band without mains harmonics: (mean square V², its standard uncertainty, degrees of freedom).
    pub noise: (f64, f64, f64),
    /// Mean density in the overlap, V²/Hz; none where the trace does not reach it.
    pub overlap: Option<f64>,
    /// Mains harmonics; none where the band lies above them or the trace is too short.
    pub mains: Option<MainsRipple>,
    /// Strongest line in the band, mains harmonics left out.
    pub tone: Option<LightTone>,
}

/// Measures one trace.
///
/// * `samples`: volts at equal times, `interval` s apart.
///
/// Errors: why it cannot be measured, as a fragment.
///
/// # Method
/// 1. Refuse what is too short, too slow, constant or clipped. 2. One-sided Hann periodogram about the mean.
/// 3. Mains: of 50 and 60 Hz the one whose first six harmonics stand higher; the strongest of them gives the frequency;
///    each harmonic is a Fourier sum at that frequency less what the floor beside it adds.
/// 4. Noise: sum of the density over the band; within each stretch of one mains frequency the bins of the harmonic count
///    as the others do. Variance of a sum of exponential ordinates: Σ S²/2 estimates Σ ⟨S⟩², times 35/18 for a Hann
///    window.
/// 5. Strongest line: Fisher's g on the density whitened by its running median.
pub fn measure_light(samples: &[f64], interval: f64, settings: &LightSettings) -> Result<LightMeasurement, String> {
    let n = samples.len();
    let duration = n as f64 * interval;
    let (lowest, highest_hz) = settings.band;
    if !(interval > 0.0 && duration * lowest >= LEAST_CYCLES) {
        return Err(format!(
            "{n} samples in {duration:.4} s are too few for noise from {lowest} Hz; expected {} s or more",
            LEAST_CYCLES / lowest
        ));
    }
    if interval * highest_hz * LEAST_SAMPLES > 1.0 {
        return Err(format!(
            "{:.0} samples a second are too slow for noise to {highest_hz} Hz; expected {:.0} or more",
            1.0 / interval,
            LEAST_SAMPLES * highest_hz
        ));
    }
    if settings.lit {
        saturated(samples)?;
    }
    let unusable = || "the samples hold no finite noise".to_owned();
    let level = mean(samples).filter(|level| level.is_finite()).ok_or_else(unusable)?;
    let spectrum = periodogram(samples, interval, Window::Hann).ok_or_else(unusable)?;
    let mains = (lowest < MAINS[0] - MAINS_WITHIN).then(|| mains(samples, level, interval, &spectrum, highest_hz));
    let spacing = mains.map(|mains| mains.frequency);
    Ok(LightMeasurement {
        mean: level,
        duration,
        sample_rate: 1.0 / interval,
        noise: noise(&spectrum, settings.band, spacing),
        overlap: mean_density(&spectrum, settings.overlap),
        mains,
        tone: tone(&spectrum, settings.band, spacing),
    })
}

/// Errors: the trace stands at one step, or is cut off at its highest.
fn saturated(samples: &[f64]) -> Result<(), String> {
    let top = samples.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let below = samples.iter().copied().filter(|v| *v < top).fold(f64::NEG_INFINITY, f64::max);
    if !below.is_finite() {
        return Err("the light does not move by one step: the light detector is saturated or not connected".to_owned());
    }
    let third = samples.iter().any(|v| *v < below);
    let count = |level: f64| samples.iter().filter(|v| **v == level).count() as f64;
    let (at_top, before) = (count(top), count(below));
    if third && at_top > CLIPPED.0 * samples.len() as f64 && at_top > CLIPPED.1 * before {
        let share = 100.0 * at_top / samples.len() as f64;
        return Err(format!(
            "{share:.1} % of the samples stand at {top:.4} V, the top: the light detector is saturated; weaken the light"
        ));
    }
    Ok(())
}

/// Bins of a band, ends within the spectrum; frequency 0 left out.
fn bins(spectrum: &Periodogram, (from, to): (f64, f64)) -> std::ops::Range<usize> {
    let step = spectrum.frequency_step;
    // A cast saturates.
    let first = ((from / step).ceil() as usize).max(1);
    let end = ((to / step).ceil() as usize).min(spectrum.density.len());
    first.min(end)..end
}

fn mean_density(spectrum: &Periodogram, band: (f64, f64)) -> Option<f64> {
    let reach = spectrum.frequency_step * spectrum.density.len() as f64;
    if band.1 > reach {
        return None;
    }
    mean(spectrum.density.get(bins(spectrum, band))?)
}

/// Floor about a place of the spectrum, the line itself left out, V²/Hz.
fn floor(spectrum: &Periodogram, middle: usize) -> f64 {
    let near = |k: &usize| k.abs_diff(middle) > LINE_BINS && *k > 0;
    let end = (middle + FLOOR_BINS + 1).min(spectrum.density.len());
    let beside: Vec<f64> = (middle.saturating_sub(FLOOR_BINS)..end).filter(near).map(|k| spectrum.density[k]).collect();
    median(&beside).unwrap_or(0.0) / std::f64::consts::LN_2
}

fn mains(samples: &[f64], level: f64, interval: f64, spectrum: &Periodogram, highest: f64) -> MainsRipple {
    let step = spectrum.frequency_step;
    let sought = MAINS.map(|name| {
        let mut excess = 0.0;
        let mut best = (0.0, name);
        for h in 1..=SOUGHT_HARMONICS {
            let reach = MAINS_WITHIN * h as f64;
            let window = bins(spectrum, (h as f64 * name - reach, h as f64 * name + reach));
            let Some(top) = window.max_by(|&a, &b| spectrum.density[a].total_cmp(&spectrum.density[b])) else { break };
            let under = floor(spectrum, top) * HANN_NOISE_WIDTH * step;
            let Some(line) = hann_line(spectrum, top) else { continue };
            excess += (line.power - CLEAR * under).max(0.0);
            if line.power > CLEAR * under && line.power > best.0 {
                best = (line.power, line.frequency / h as f64);
            }
        }
        (excess, best)
    });
    let (_, (strongest, frequency)) = if sought[1].0 > sought[0].0 { sought[1] } else { sought[0] };
    let (mut power, mut variance, mut n_harmonics) = (0.0, 0.0, 0);
    let mut h = 1.0;
    while h * frequency < highest {
        let raw = hann_power(samples, level, h * frequency * interval);
        // The nearest bin; within the spectrum as `highest` is.
        let under = floor(spectrum, (h * frequency / step).round() as usize) * HANN_NOISE_WIDTH * step;
        power += raw - under;
        // Var(P) of a sine in noise: 2P·F + F², F what the floor adds.
        variance += 2.0 * (raw - under).max(0.0) * under + under * under;
        n_harmonics += 1;
        h += 1.0;
    }
    MainsRipple { frequency, clear: strongest > 0.0, power, u_power: variance.sqrt(), n_harmonics }
}

/// Whether a bin holds light of a mains harmonic.
fn of_mains(spectrum: &Periodogram, k: usize, spacing: Option<f64>) -> bool {
    let Some(spacing) = spacing else { return false };
    let place = k as f64 * spectrum.frequency_step;
    let harmonic = (place / spacing).round();
    harmonic >= 1.0 && (place - harmonic * spacing).abs() <= LINE_BINS as f64 * spectrum.frequency_step
}

fn noise(spectrum: &Periodogram, band: (f64, f64), spacing: Option<f64>) -> (f64, f64, f64) {
    let step = spectrum.frequency_step;
    let stretch = |k: usize| spacing.map_or(0, |spacing| (k as f64 * step / spacing).round() as usize);
    let (mut sum, mut variance) = (0.0, 0.0);
    let all: Vec<usize> = bins(spectrum, band).collect();
    for part in all.chunk_by(|a, b| stretch(*a) == stretch(*b)) {
        let free: Vec<f64> =
            part.iter().filter(|k| !of_mains(spectrum, **k, spacing)).map(|k| spectrum.density[*k]).collect();
        // A stretch cut short by the band's end may hold nothing but the line.
        let Some(density) = mean(&free) else { continue };
        let scale = part.len() as f64 / free.len() as f64;
        sum += density * part.len() as f64 * step;
        variance += free.iter().map(|s| (s * step * scale).powi(2) / 2.0).sum::<f64>() * HANN_CORRELATION;
    }
    let dof = if variance > 0.0 { 2.0 * sum * sum / variance } else { 1.0 };
    (sum, variance.sqrt(), dof)
}

fn tone(spectrum: &Periodogram, band: (f64, f64), spacing: Option<f64>) -> Option<LightTone> {
    let range = bins(spectrum, band);
    let white = whitened(&spectrum.density, WHITE_BINS);
    let keep: Vec<usize> = range.filter(|k| !of_mains(spectrum, *k, spacing)).collect();
    let ordinates: Vec<f64> = keep.iter().map(|k| white[*k]).collect();
    let found = highest(&ordinates).filter(|found| found.probability < CHANCE)?;
    let index = *keep.get(found.index)?;
    let Tone { frequency, power } = hann_line(spectrum, index)?;
    let step = spectrum.frequency_step;
    let density = floor(spectrum, index);
    let under = HANN_NOISE_WIDTH * step * density;
    // Bound for a sine in white noise, var f = 1.5·S/(π²·P·T³), doubled for the window (Rife and Boorstyn, IEEE Trans.
    // Inf. Theory 20, 591, 1974; the factor found by trial).
    let bound = (1.5 * density * step.powi(3) / (std::f64::consts::PI.powi(2) * power)).sqrt();
    Some(LightTone {
        frequency,
        u_frequency: 2.0 * bound,
        power,
        u_power: (2.0 * power * under + under * under).sqrt(),
        probability: found.probability,
    })
}

#[cfg(test)]
#[path = "light_tests.rs"]
mod tests;
