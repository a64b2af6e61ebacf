//! What goes wrong on real benches, done to simulated captures: each defect is one function on a capture.
//! Must not measure, nor know what is expected.
//! Main types: [`Bench`], [`Case`].

#![allow(dead_code, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::f64::consts::TAU;

use tubewright::capture::{Capture, TimeBase};
use tubewright::phantom::{BenchTruth, Incident, RawTrace, Scenario, Setting, TubeTruth, World};

/// Free spectral range of the simulated bench, Hz.
pub const FSR: f64 = 6.4e9;
/// Samples of one ramp where a case does not say otherwise.
pub const SAMPLES: usize = 8_000;
/// When the hop of [`Bench::hopping`] comes, ms: the tube is warm and hardly walks.
const HOP_AT: i64 = 2_400_000;

/// One capture and what is true of it.
#[derive(Clone)]
pub struct Case {
    pub capture: Capture,
    /// Hz.
    pub mode_spacing: f64,
    /// Height of the highest peak, V.
    pub top: f64,
}

/// A tube on a bench, to be changed before captures are taken.
#[derive(Clone)]
pub struct Bench {
    pub tube: TubeTruth,
    pub bench: BenchTruth,
    pub seed: u64,
    pub samples: usize,
    /// Steps of the digitizer, applied after the defects.
    pub bits: u32,
}

impl Bench {
    /// A four-mode tube on an ordinary bench with one photodiode; a digitizer of 12 bits comes last.
    pub fn new(seed: u64) -> Self {
        let scenario = Scenario::demo();
        let world = scenario.world("DEMO-0003", None).expect("in the demo scenario");
        let bench = BenchTruth { analyser: None, bits: 24, ..world.bench().clone() };
        Self { tube: world.tube().clone(), bench, seed, samples: SAMPLES, bits: 12 }
    }

    pub fn world(&self) -> World {
        World::new(&self.tube, &self.bench, self.seed)
    }

    /// Differs from seed to seed, so that the comb stands everywhere.
    fn at_ms(&self) -> i64 {
        1_200_000 + 1_733 * (self.seed as i64 % 211)
    }

    /// One ramp.
    pub fn one(&self) -> Case {
        self.case(self.trace(self.at_ms()))
    }

    /// Several ramps in one record.
    pub fn several(&self, ramps: usize) -> Case {
        let period = (self.bench.ramp_period * 1e3).round() as i64;
        let mut all = self.trace(self.at_ms());
        for k in 1..ramps as i64 {
            let next = self.trace(self.at_ms() + k * period);
            all.ramp.extend(next.ramp);
            all.photodiode.extend(next.photodiode);
        }
        self.case(all)
    }

    /// One ramp: the first `share` of it before, the rest after the comb hopped by `size`, Hz.
    pub fn hopping(&self, share: f64, size: f64) -> Case {
        let mut hopping = self.clone();
        hopping.tube.incidents = vec![Incident::Hop { at: HOP_AT as f64 / 1e3, size }];
        let (before, after) = (hopping.trace(HOP_AT - 1_000), hopping.trace(HOP_AT + 1_000));
        self.case(spliced(&before, &after, share))
    }

    /// One ramp whose two parts were taken minutes apart.
    pub fn spliced(&self, share: f64) -> Case {
        let (before, after) = (self.trace(120_000), self.trace(self.at_ms()));
        self.case(spliced(&before, &after, share))
    }

    /// One photodiode behind a polarizer sees the two families exchange axes after `share` of the ramp.
    pub fn swapping(&self, share: f64) -> Case {
        let polarized =
            Self { bench: BenchTruth { analyser: Some(30_f64.to_radians()), ..self.bench.clone() }, ..self.clone() };
        let trace = polarized.trace(self.at_ms());
        let cut = (share * self.samples as f64) as usize;
        let mut swapped = trace.clone();
        swapped.photodiode[cut..].copy_from_slice(&trace.crossed.as_ref().expect("two photodiodes")[cut..]);
        swapped.crossed = None;
        self.case(swapped)
    }

    fn trace(&self, at_ms: i64) -> RawTrace {
        let setting = Setting { lit: true, ..Setting::default() };
        self.world().capture(at_ms, self.samples, setting).expect("not lost")
    }

    fn case(&self, trace: RawTrace) -> Case {
        let top = trace.photodiode.iter().copied().fold(f64::MIN, f64::max);
        let capture = Capture {
            time: TimeBase { start: 0.0, step: trace.time_step, n: trace.photodiode.len() },
            ramp: Some(trace.ramp),
            photodiode: trace.photodiode,
            crossed: trace.crossed,
            head: Default::default(),
            remarks: Vec::new(),
        };
        Case { capture, mode_spacing: self.world().comb().mode_spacing(), top }
    }
}

fn spliced(before: &RawTrace, after: &RawTrace, share: f64) -> RawTrace {
    let cut = (share * before.photodiode.len() as f64) as usize;
    let mut both = before.clone();
    both.photodiode[cut..].copy_from_slice(&after.photodiode[cut..]);
    both
}

impl Case {
    /// Changes every photodiode sample: (place from 0 to 1, seconds, ramp volts, volts) → volts.
    pub fn light(mut self, change: impl Fn(f64, f64, f64, f64) -> f64) -> Self {
        let n = self.capture.photodiode.len();
        let ramp = self.capture.ramp.clone().unwrap_or_else(|| vec![0.0; n]);
        for (i, v) in self.capture.photodiode.iter_mut().enumerate() {
            *v = change(i as f64 / n as f64, i as f64 * self.capture.time.step, ramp[i], *v);
        }
        self
    }

    /// Changes every ramp sample: (place from 0 to 1, volts) → volts.
    pub fn ramp(mut self, change: impl Fn(f64, f64) -> f64) -> Self {
        let n = self.capture.photodiode.len() as f64;
        for (i, v) in self.capture.ramp.iter_mut().flatten().enumerate() {
            *v = change(i as f64 / n, *v);
        }
        self
    }

    pub fn without_ramp(mut self) -> Self {
        self.capture.ramp = None;
        self
    }

    /// A part of the record, as shares of it.
    pub fn part(mut self, from: f64, to: f64) -> Self {
        let n = self.capture.photodiode.len() as f64;
        let range = (from * n) as usize..(to * n) as usize;
        self.capture.photodiode = self.capture.photodiode[range.clone()].to_vec();
        self.capture.ramp = self.capture.ramp.map(|ramp| ramp[range.clone()].to_vec());
        self.capture.time.n = range.len();
        self
    }

    /// Flat tops at a share of the highest peak.
    pub fn clipped(self, share: f64) -> Self {
        let level = share * self.top;
        self.light(|_, _, _, v| v.min(level))
    }

    /// Tops that flatten without a flat part: v → S·tanh(v/S), S a multiple of the highest peak.
    pub fn saturated(self, multiple: f64) -> Self {
        let level = multiple * self.top;
        self.light(|_, _, _, v| level * (v / level).tanh())
    }

    /// Mains hum of an amplitude over the highest peak.
    pub fn hum(self, share: f64, hertz: f64) -> Self {
        let amplitude = share * self.top;
        self.light(|_, t, _, v| v + amplitude * (TAU * hertz * t + 0.7).sin())
    }

    /// Ambient light switched on at a place.
    pub fn lamp(self, at: f64, share: f64) -> Self {
        let step = share * self.top;
        self.light(|place, _, _, v| if place > at { v + step } else { v })
    }

    pub fn inverted(self) -> Self {
        self.light(|_, _, _, v| 0.3 - v)
    }

    /// A share of the ramp on the photodiode, over the highest peak at the ramp's full height.
    pub fn crosstalk(self, share: f64) -> Self {
        let amplitude = share * self.top / 8.0;
        self.light(|_, _, ramp, v| v + amplitude * ramp)
    }

    /// A detector slower by a single pole, s.
    pub fn slowed(mut self, time_constant: f64) -> Self {
        let decay = (-self.capture.time.step / time_constant).exp();
        let mut state = self.capture.photodiode.first().copied().unwrap_or(0.0);
        for v in &mut self.capture.photodiode {
            state = decay * state + (1.0 - decay) * *v;
            *v = state;
        }
        self
    }

    /// A coupling capacitor: high pass of a time constant, s.
    pub fn coupled(mut self, time_constant: f64) -> Self {
        let decay = (-self.capture.time.step / time_constant).exp();
        let mean = self.capture.photodiode.iter().sum::<f64>() / self.capture.photodiode.len() as f64;
        let mut state = mean;
        for v in &mut self.capture.photodiode {
            state = decay * state + (1.0 - decay) * *v;
            *v -= state;
        }
        self
    }

    /// The digitizer: steps of a span of 1.5 times the highest peak.
    pub fn digitized(self, bits: u32) -> Self {
        let step = 1.5 * self.top / 2_f64.powi(bits as i32);
        self.light(|_, _, _, v| (v / step).round() * step)
    }

    /// The ramp monitor in a number of levels.
    pub fn ramp_levels(self, levels: f64) -> Self {
        self.ramp(|_, v| (v / 8.0 * levels).round() / levels * 8.0)
    }
}
