//! One tube on one bench: a pure function of seed, time and setting, so that asking twice gives the same bytes.
//! Must not do I/O, read a clock, or keep what was asked before.
//! Main types: [`World`], [`Setting`].

use std::f64::consts::{FRAC_PI_2, TAU};

use super::{
    bench::BenchTruth,
    comb::{Axis, Comb, Mode},
    light::{LightScene, LightTrace},
    noise::{Noise, Purpose},
    trace::{FULL_HEIGHT, Line, RawTrace, Scene},
    tube::{Incident, TubeTruth},
    walk,
};

/// Points over which a meter averages.
const N_AVERAGED: u32 = 8;
/// Noise of the current and voltage readings, relative; an ordinary panel meter, common practice.
const PANEL_NOISE: f64 = 1e-3;

/// How the bench stands while something is read.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Setting {
    /// The discharge burns.
    pub lit: bool,
    /// Azimuth of the polarizer, rad; none if it is out.
    pub polarizer: Option<f64>,
    /// The beam is blocked.
    pub blocked: bool,
}

/// One tube on one bench. Times are integer milliseconds since first light (below zero: before it).
#[derive(Debug, Clone, PartialEq)]
pub struct World {
    tube: TubeTruth,
    bench: BenchTruth,
    seed: u64,
    comb: Comb,
    /// Greatest output while it warms over output when warm.
    highest_output: f64,
    /// Line centre against the interferometer's zero, Hz.
    scan_offset: f64,
}

impl World {
    /// Puts a tube on a bench. What the truth leaves open (place of the cold comb, place of the line in the sweep) is
    /// drawn from the seed; so is the sign of what air does to the voltage.
    pub fn new(tube: &TubeTruth, bench: &BenchTruth, seed: u64) -> Self {
        let mut noise = Noise::new(seed, Purpose::Placement, 0);
        let (phase, offset) = (noise.uniform(), noise.uniform());
        let mut tube = tube.clone();
        if tube.condition.air > 0.0 && tube.condition.air_voltage.is_none() {
            let change = tube.condition.voltage_change(noise.uniform());
            tube.condition.air_voltage = Some(change);
            tube.run_voltage *= 1.0 + change;
        }
        Self {
            comb: Comb::new(&tube, tube.comb_phase.unwrap_or(phase)),
            highest_output: walk::highest_output_share(&tube),
            scan_offset: offset * bench.free_spectral_range,
            tube,
            bench: bench.clone(),
            seed,
        }
    }

    /// The same tube on the same bench, struck once more: what is true of it stays, cold comb and noise are drawn anew.
    ///
    /// * `earlier`: how often it was struck before; 0 changes nothing.
    pub fn again(self, earlier: u64) -> Self {
        match earlier {
            0 => self,
            // An odd factor keeps the seeds of all runs apart.
            _ => Self::new(&self.tube, &self.bench, self.seed ^ earlier.wrapping_mul(0x9e37_79b9_7f4a_7c15)),
        }
    }

    /// The tube.
    pub fn tube(&self) -> &TubeTruth {
        &self.tube
    }

    /// The bench.
    pub fn bench(&self) -> &BenchTruth {
        &self.bench
    }

    /// The comb.
    pub fn comb(&self) -> &Comb {
        &self.comb
    }

    /// The true modes, ascending in frequency. Empty before first light.
    pub fn modes(&self, at_ms: i64) -> Vec<Mode> {
        if at_ms < 0 { Vec::new() } else { self.comb.modes(&self.tube, at_ms as f64 / 1e3) }
    }

    /// How long a capture takes, ms, at least 1.
    pub fn capture_ms(&self) -> u64 {
        (self.bench.ramp_period * 1e3).ceil().max(1.0) as u64
    }

    /// One capture: one period of the ramp, begun at a time.
    ///
    /// Returns none where the capture is lost.
    pub fn capture(&self, at_ms: i64, samples: usize, setting: Setting) -> Option<RawTrace> {
        let t = at_ms as f64 / 1e3;
        let within = |at: f64, lasts: f64| setting.lit && t >= at && t < at + lasts;
        let mut height = 1.0;
        let mut jumped = self.bench.drift * t.max(0.0);
        for incident in &self.tube.incidents {
            match *incident {
                Incident::Lost { at, lasts } if within(at, lasts) => return None,
                Incident::Knock { at, to, lasts } if within(at, lasts) => height *= to,
                Incident::Jump { at, size } if t >= at => jumped += size,
                _ => {}
            }
        }
        let modes = if setting.lit && !setting.blocked { self.modes(at_ms) } else { Vec::new() };
        let lines = modes.iter().flat_map(|mode| self.lines(mode, setting.polarizer, height, jumped)).collect();
        let period = self.bench.ramp_period;
        let walked = walk::cycles(&self.tube, t + period) - walk::cycles(&self.tube, t);
        let scene = Scene {
            bench: &self.bench,
            lines,
            rate: -walked / period * self.comb.mode_spacing(),
            ripple: (self.tube.line_ripple, TAU * (2.0 * self.bench.mains * t).fract()),
        };
        let noise = |purpose| Noise::new(self.seed, purpose, at_ms);
        Some(scene.record(samples, noise(Purpose::Photodiode), noise(Purpose::Crossed)))
    }

    /// One trace of the total light, begun at a time: `samples` means, `rate` of them a second.
    pub fn light(&self, at_ms: i64, samples: usize, rate: f64, setting: Setting) -> LightTrace {
        let lit = setting.lit && !setting.blocked && self.tube.power > 0.0;
        let share = if lit { self.true_power(at_ms as f64, setting.polarizer) / self.tube.power } else { 0.0 };
        let modes = self.modes(at_ms);
        // Three neighbours of uneven spacing beat at the second difference of their frequencies.
        let beat = |three: &[Mode]| (three[0].detuning - 2.0 * three[1].detuning + three[2].detuning).abs();
        let beats = modes.windows(3).map(beat).collect();
        let scene = LightScene { tube: &self.tube, bench: &self.bench, share, beats, at: at_ms as f64 / 1e3 };
        let noise = |purpose| Noise::new(self.seed, purpose, at_ms);
        scene.record(samples, rate, noise(Purpose::Light), noise(Purpose::LightDetector))
    }

    /// The peaks of one mode: its own and that of its transverse companion.
    fn lines(&self, mode: &Mode, polarizer: Option<f64>, height: f64, jumped: f64) -> Vec<Line> {
        let (main, crossed) = self.split(mode.axis, polarizer);
        let rest = self.bench.analyser.map_or(1.0, |angle| angle.cos().powi(2).max(angle.sin().powi(2)));
        // The detectors' gain is set for the brightest moment.
        let highest = self.tube.power * self.comb.highest_share() * self.highest_output;
        let volts = FULL_HEIGHT * height * mode.power / (highest * rest);
        let frequency = self.scan_offset + mode.detuning - jumped;
        let line = |offset: f64, share: f64| Line {
            frequency: frequency + offset,
            main: volts * main * share,
            crossed: volts * crossed * share,
        };
        let mut lines = vec![line(0.0, 1.0)];
        if self.tube.off_axis_share > 0.0 {
            lines.push(line(self.tube.off_axis_offset, self.tube.off_axis_share));
        }
        lines
    }

    /// Shares of one family's light in main and crossed photodiode.
    ///
    /// The splitting polarizer turns with the polarizer's setting; at rest it stands at the bench's angle to the strong
    /// axis, so that the main photodiode sees both families unlike.
    fn split(&self, axis: Axis, polarizer: Option<f64>) -> (f64, f64) {
        match (self.bench.analyser, polarizer) {
            (None, None) => (1.0, 0.0),
            (None, Some(angle)) => (self.passed(axis, angle), 0.0),
            (Some(rest), setting) => {
                let angle = setting.unwrap_or(self.tube.azimuth + rest);
                (self.passed(axis, angle), self.passed(axis, angle + FRAC_PI_2))
            }
        }
    }

    /// Share of one family's light that a polarizer at an azimuth passes: Malus, with both extinctions.
    fn passed(&self, axis: Axis, angle: f64) -> f64 {
        let own = match axis {
            Axis::Strong => self.tube.azimuth,
            Axis::Across => self.tube.azimuth + self.tube.orthogonality,
        };
        let stray = 1.0 / (1.0 + self.tube.extinction);
        let through = |angle: f64| {
            let (sin, cos) = angle.sin_cos();
            cos * cos + sin * sin / self.bench.polarizer_extinction
        };
        (1.0 - stray) * through(angle - own) + stray * through(angle - own - FRAC_PI_2)
    }

    /// True power at the meter at one moment, W.
    fn true_power(&self, at_ms: f64, polarizer: Option<f64>) -> f64 {
        if at_ms < 0.0 {
            return 0.0;
        }
        let modes = self.comb.modes(&self.tube, at_ms / 1e3);
        let passed = |mode: &Mode| mode.power * polarizer.map_or(1.0, |angle| self.passed(mode.axis, angle));
        modes.iter().map(passed).sum::<f64>() * (1.0 + self.tube.off_axis_share)
    }

    /// A power reading, W, averaged over a time that begins at `at_ms`.
    pub fn power(&self, at_ms: i64, average_ms: u32, setting: Setting) -> f64 {
        let step = f64::from(average_ms) / f64::from(N_AVERAGED);
        let moments = (0..N_AVERAGED).map(|k| at_ms as f64 + (f64::from(k) + 0.5) * step);
        let lit = setting.lit && !setting.blocked;
        let power = if lit {
            moments.map(|moment| self.true_power(moment, setting.polarizer)).sum::<f64>() / f64::from(N_AVERAGED)
        } else {
            0.0
        };
        let purpose = if lit { Purpose::Meter } else { Purpose::DarkMeter };
        let mut noise = Noise::new(self.seed, purpose, at_ms);
        // Relative noise is that of one second; a shorter average is noisier.
        let relative = self.bench.meter_noise * (1e3 / f64::from(average_ms.max(1))).sqrt();
        power / self.bench.meter_factor * (1.0 + relative * noise.normal())
            + self.bench.meter_dark * (1.0 + 0.02 * noise.normal())
    }

    /// The meter's reading with the beam blocked, W.
    pub fn dark_power(&self, at_ms: i64) -> f64 {
        self.power(at_ms, 1000, Setting { blocked: true, ..Setting::default() })
    }

    /// Tube current, A; 0 if the discharge is out.
    pub fn run_current(&self, at_ms: i64, setting: Setting) -> f64 {
        let noise = Noise::new(self.seed, Purpose::Current, at_ms).normal();
        if setting.lit { self.tube.run_current * (1.0 + PANEL_NOISE * noise) } else { 0.0 }
    }

    /// True voltage at the tube, V: V ∝ I^−b.
    pub fn tube_voltage(&self, current: f64) -> f64 {
        self.tube.run_voltage * (current / self.tube.run_current).powf(-self.tube.voltage_exponent)
    }

    /// Voltage at the supply at the run current, V: tube and ballast.
    pub fn supply_voltage(&self, at_ms: i64, setting: Setting) -> f64 {
        let current = self.tube.run_current;
        let noise = Noise::new(self.seed, Purpose::Voltage, at_ms).normal();
        let volts = self.tube_voltage(current) + current * self.bench.ballast;
        if setting.lit { volts * (1.0 + PANEL_NOISE * noise) } else { 0.0 }
    }

    /// Current at which the discharge goes out when it is lowered slowly, A.
    pub fn dropout_current(&self, at_ms: i64) -> f64 {
        self.tube.dropout_current * (1.0 + PANEL_NOISE * Noise::new(self.seed, Purpose::Dropout, at_ms).normal())
    }
}
