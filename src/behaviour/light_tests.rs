//! Tests of one light trace, and of the traces together: made signals whose noise, ripple and lines are known.
//! Must not share maths with what it tests: signals are sums of sines and of independent normal numbers.

#![allow(clippy::unwrap_used)]

use std::f64::consts::TAU;

use super::*;
use crate::behaviour::noise::{LightSet, ToneOrigin, light_noise};
use crate::behaviour::synthetic::Noise;

const SLOW: LightSettings = LightSettings { lit: true, band: (10.0, 2e3), overlap: (2e3, 4e3) };
const FAST: LightSettings = LightSettings { lit: true, band: (2e3, 1e6), overlap: (2e3, 4e3) };

/// Noise of the band V², mean density of the overlap V²/Hz and mean V of the signal below, made with scipy.signal.periodogram.
const NOISE: f64 = 4.999_913_659_453_266e-5;
const OVERLAP: f64 = 1.000_000_703_611_419e-9;
const MEAN: f64 = 0.800_181_817_827_218_1;

/// A made trace: level, white noise (rms), sines (Hz, rms).
#[derive(Clone)]
struct Made {
    level: f64,
    white: f64,
    sines: Vec<(f64, f64)>,
}

impl Made {
    fn trace(&self, n: usize, rate: f64, seed: u64) -> Vec<f64> {
        let mut noise = Noise(seed);
        let sine =
            |t: f64| self.sines.iter().map(|(f, rms)| rms * 2f64.sqrt() * (TAU * f * t + 0.3).sin()).sum::<f64>();
        (0..n).map(|i| self.level + sine(i as f64 / rate) + self.white * noise.normal()).collect()
    }

    fn slow(&self, seed: u64) -> LightMeasurement {
        measure_light(&self.trace(30_000, 20e3, seed), 1.0 / 20e3, &SLOW).unwrap()
    }

    fn fast(&self, seed: u64) -> LightMeasurement {
        measure_light(&self.trace(40_000, 5e6, seed), 1.0 / 5e6, &FAST).unwrap()
    }
}

fn made(white: f64, sines: &[(f64, f64)]) -> Made {
    Made { level: 0.8, white, sines: sines.to_vec() }
}

#[test]
fn band_and_overlap_agree_with_another_library() {
    let signal: Vec<f64> = (0..4000)
        .map(f64::from)
        .map(|i| 0.8 + 0.01 * (TAU * i * i * 0.012_345_678_9 / 1000.0).sin() + 0.002 * (0.9 * i).cos())
        .collect();
    let settings = LightSettings { band: (100.0, 2000.0), ..SLOW };
    let found = measure_light(&signal, 1.0 / 20e3, &settings).unwrap();
    // A periodogram with a Hann window in another library (its mean taken off once), summed over the same bins.
    assert!((found.noise.0 / NOISE - 1.0).abs() < 1e-9, "{found:?}");
    assert!((found.overlap.unwrap() / OVERLAP - 1.0).abs() < 1e-9, "{found:?}");
    assert!((found.mean / MEAN - 1.0).abs() < 1e-12);
}

#[test]
fn white_noise_has_its_share_of_the_band_and_an_honest_uncertainty() {
    // Variance of a band of white noise: σ²·(band/half the rate).
    let truth = 4e-6 * (2000.0 - 10.0) / 10e3;
    let pulls: Vec<f64> =
        (1..=40).map(|seed| made(2e-3, &[]).slow(seed).noise).map(|(value, u, _)| (value - truth) / u).collect();
    let rms = (pulls.iter().map(|p| p * p).sum::<f64>() / 40.0).sqrt();
    // 40 draws of a standard deviation: 11 % of it; three of them.
    assert!((0.66..1.34).contains(&rms), "{rms}");
    // 1,990 Hz hold 2,985 ordinates of two degrees of freedom, correlated by 35/18.
    let dof = made(2e-3, &[]).slow(3).noise.2;
    assert!((dof / (2.0 * 2985.0 / (35.0 / 18.0)) - 1.0).abs() < 0.15, "{dof}");
}

#[test]
fn mains_is_found_where_it_is_and_left_out_of_the_noise() {
    for (name, frequency) in [(50.0, 49.8), (50.0, 50.0), (60.0, 60.03)] {
        let sines = [(2.0 * frequency, 8e-3), (4.0 * frequency, 3e-3), (6.0 * frequency, 1e-3)];
        let found = made(1e-3, &sines).slow(5);
        let mains = found.mains.unwrap();
        assert!(mains.clear && (mains.frequency - frequency).abs() < 2e-3, "{name}: {mains:?}");
        let truth = 64e-6 + 9e-6 + 1e-6;
        // Three stated uncertainties, and the window's own 1e-4.
        assert!((mains.power - truth).abs() < 3.0 * mains.u_power + 1e-4 * truth, "{mains:?}");
        let noise = 1e-6 * 0.199;
        assert!((found.noise.0 - noise).abs() < 4.0 * found.noise.1, "{:?} {noise}", found.noise);
        assert_eq!(found.tone, None, "harmonics are no tone");
    }
}

#[test]
fn no_ripple_is_none_within_its_uncertainty() {
    for seed in 1..=20 {
        let mains = made(2e-3, &[]).slow(seed).mains.unwrap();
        assert!(!mains.clear && MAINS.contains(&mains.frequency), "{mains:?}");
        assert!(mains.power.abs() < 4.0 * mains.u_power, "{mains:?}");
        assert_eq!(mains.n_harmonics, if mains.frequency == 50.0 { 39 } else { 33 });
    }
}

#[test]
fn a_tone_is_found_with_level_and_frequency_and_chance_is_not() {
    let mut pulls = Vec::new();
    for seed in 1..=20 {
        let tone = made(2e-3, &[(43_210.0, 5e-4)]).fast(seed).tone.unwrap();
        pulls.push((tone.frequency - 43_210.0) / tone.u_frequency);
        assert!((tone.power - 25e-8).abs() < 4.0 * tone.u_power, "{tone:?}");
        assert_eq!(made(2e-3, &[]).fast(seed).tone, None, "chance of 20 in 1,000");
    }
    let rms = (pulls.iter().map(|p| p * p).sum::<f64>() / 20.0).sqrt();
    assert!((0.2..1.4).contains(&rms), "the window's factor is an upper bound: {rms}");
}

#[test]
fn together_they_give_noise_over_level_without_dark_and_its_uncertainty_holds() {
    // 0.25 % of white noise over half of 5 MHz, of which the band holds 1 MHz less 10 Hz; slow samples are averages, so
    // that they hold their own 10 kHz only. Level 0.8 V on 0.05 V of dark level.
    let density = (2e-3f64).powi(2) / 2.5e6;
    let slow_white = (density * 10e3).sqrt();
    let ripple = [(100.0, 4e-4)];
    let mut inside = 0;
    for seed in 1..=20 {
        let dark = |white| Made { level: 0.05, white, sines: vec![(100.0, 2e-4)] };
        let lit = |white, extra: f64| Made {
            level: 0.85,
            white: f64::hypot(white, extra),
            sines: vec![(100.0, (ripple[0].1 * ripple[0].1 + 4e-8f64).sqrt())],
        };
        let (slow, slow_dark) = (lit(slow_white, 3e-5).slow(seed), dark(3e-5).slow(seed + 100));
        let (fast, fast_dark) = (lit(2e-3, 8e-4).fast(seed), dark(8e-4).fast(seed + 100));
        let set = LightSet { slow: &slow, slow_dark: &slow_dark, fast: &fast, fast_dark: &fast_dark, fast_later: None };
        let found = light_noise(&set, f64::MAX, 1e6).unwrap();
        let noise = found.noise_rms.clone().unwrap();
        let truth = (density * (1e6 - 10.0)).sqrt() / 0.8;
        inside += u32::from((noise.value - truth).abs() < noise.expanded());
        assert!((found.line_ripple.value - 4e-4 / 0.8).abs() < found.line_ripple.expanded() * 1.5, "{found:?}");
        assert!(found.ripple_floor < 1e-4 && (found.mains.0 - 50.0).abs() < 0.01, "{found:?}");
    }
    // 95 % wanted; the response line of 1 % widens it.
    assert!(inside >= 18, "{inside} of 20");
}

#[test]
fn a_tone_that_moves_is_told_from_one_that_stays() {
    let quiet = made(5e-4, &[]);
    let dark = Made { level: 0.0, ..quiet.clone() };
    let told = |before: f64, after: f64| {
        let (slow, slow_dark, fast_dark) = (quiet.slow(1), dark.slow(2), dark.fast(3));
        let (fast, later) = (made(5e-4, &[(before, 1e-3)]).fast(4), made(5e-4, &[(after, 1e-3)]).fast(5));
        let fast_later = Some(&later);
        let set = LightSet { slow: &slow, slow_dark: &slow_dark, fast: &fast, fast_dark: &fast_dark, fast_later };
        light_noise(&set, 3e6, 1e6).unwrap().tone.map(|tone| tone.origin)
    };
    assert_eq!(told(40e3, 40e3), Some(ToneOrigin::Fixed));
    assert_eq!(told(40e3, 41e3), Some(ToneOrigin::ModeBeat));
    assert_eq!(told(400e3, 402e3), Some(ToneOrigin::Moving));
}

#[test]
fn folded_noise_is_not_given_out_as_noise() {
    // Samples of an instant: a slow trace holds all 2.5 MHz of it.
    let (bright, dark) = (made(2e-3, &[]), Made { level: 0.0, white: 1e-5, sines: vec![] });
    let (slow, slow_dark, fast, fast_dark) = (bright.slow(1), dark.slow(2), bright.fast(3), dark.fast(4));
    let set = LightSet { slow: &slow, slow_dark: &slow_dark, fast: &fast, fast_dark: &fast_dark, fast_later: None };
    assert_eq!(light_noise(&set, 3e6, 1e6).unwrap().noise_rms, None);
}

#[test]
fn what_cannot_be_measured_is_refused_in_words() {
    let refused = |samples: &[f64], interval, settings| measure_light(samples, interval, settings).unwrap_err();
    let trace = made(1e-3, &[]).trace(1000, 20e3, 1);
    assert!(refused(&trace, 1.0 / 20e3, &SLOW).contains("too few"), "1,000 samples in 50 ms");
    assert!(refused(&made(1e-3, &[]).trace(40_000, 5e6, 1), 1e-3, &FAST).contains("too slow"));
    let steps = |v: &f64| (v / 4e-4).round() * 4e-4;
    let clipped: Vec<f64> = made(3e-3, &[]).trace(30_000, 20e3, 1).iter().map(|v| steps(&v.min(0.801))).collect();
    assert!(refused(&clipped, 1.0 / 20e3, &SLOW).contains("saturated"));
    assert!(refused(&[0.8; 30_000], 1.0 / 20e3, &SLOW).contains("does not move"));
    let coarse: Vec<f64> = made(3e-4, &[]).trace(30_000, 20e3, 1).iter().map(steps).collect();
    assert!(measure_light(&coarse, 1.0 / 20e3, &SLOW).is_ok(), "few steps, but none cut off");
    assert!(measure_light(&[f64::NAN; 30_000], 1.0 / 20e3, &SLOW).is_err());
    assert!(measure_light(&[], 1.0, &SLOW).is_err() && measure_light(&trace, f64::NAN, &SLOW).is_err());

    let quiet = made(1e-4, &[]);
    let (slow, fast) = (quiet.slow(1), quiet.fast(2));
    let set = LightSet { slow: &slow, slow_dark: &slow, fast: &fast, fast_dark: &fast, fast_later: None };
    assert!(light_noise(&set, 3e6, 1e6).unwrap_err().contains("beam"), "the beam was not blocked");
}
