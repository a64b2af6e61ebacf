//! A made-up tube for the tests of this module: glimpses of a walking comb under a gain line, with planted events.
//! Must not share code with what it tests.
//! Main type: [`Synthetic`].

use super::glimpse::{Glimpse, GlimpseMode};

/// A tube and its noise. Times in s, frequencies in Hz.
#[derive(Debug, Clone)]
pub(crate) struct Synthetic {
    pub seed: u64,
    pub spacing: f64,
    pub free_spectral_range: f64,
    /// Middle of the line on the scan axis.
    pub line: f64,
    /// Modes lase within this distance of the middle.
    pub half_range: f64,
    pub n_infinity: f64,
    pub tau: f64,
    /// Walk and time constant of a fast part.
    pub fast: Option<(f64, f64)>,
    /// Sense of the walk on the scan axis.
    pub direction: f64,
    pub u_position: f64,
    /// Relative noise of heights.
    pub u_height: f64,
    /// Comb displacements of the tube: (at, size).
    pub hops: Vec<(f64, f64)>,
    /// Displacements of the interferometer: comb and line together.
    pub shifts: Vec<(f64, f64)>,
    pub swaps: Vec<f64>,
    /// Drift of the interferometer, Hz/s: comb and line together.
    pub drift: f64,
    /// (from, to, factor) on every height.
    pub knocks: Vec<(f64, f64, f64)>,
    /// Share of a mode's light in its own photodiode.
    pub polarizer: f64,
}

impl Synthetic {
    /// Four modes under the line.
    pub fn quad(seed: u64) -> Self {
        Self {
            seed,
            spacing: 399.7e6,
            free_spectral_range: 6.4e9,
            line: 2.9e9,
            half_range: 0.78e9,
            n_infinity: 90.0,
            tau: 500.0,
            fast: None,
            direction: -1.0,
            u_position: 0.7e6,
            u_height: 0.01,
            hops: vec![],
            shifts: vec![],
            swaps: vec![],
            drift: 0.0,
            knocks: vec![],
            polarizer: 0.95,
        }
    }

    /// One or two modes under the line.
    pub fn twin(seed: u64) -> Self {
        Self { spacing: 999.3e6, half_range: 0.72e9, n_infinity: 40.0, tau: 380.0, ..Self::quad(seed) }
    }

    pub fn walked(&self, at: f64) -> f64 {
        let fast = self.fast.map_or(0.0, |(n, tau)| n * (1.0 - (-at / tau).exp()));
        self.n_infinity * (1.0 - (-at / self.tau).exp()) + fast
    }

    /// The glimpse at a time; the same time gives the same noise.
    pub fn glimpse(&self, at: f64) -> Glimpse {
        let mut noise = Noise(self.seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) ^ at.to_bits());
        noise.normal();
        let sum = |events: &[(f64, f64)]| events.iter().filter(|e| e.0 <= at).map(|e| e.1).sum::<f64>();
        let line = self.line + sum(&self.shifts) + self.drift * at;
        let comb = line + 0.3e9 + self.direction * self.spacing * self.walked(at) + sum(&self.hops);
        let swapped = self.swaps.iter().filter(|s| **s <= at).count() as i64;
        let knock: f64 = self.knocks.iter().filter(|k| k.0 <= at && at < k.1).map(|k| k.2).product();
        let first = ((line - self.half_range - comb) / self.spacing).ceil() as i64;
        let last = ((line + self.half_range - comb) / self.spacing).floor() as i64;
        let mut modes = Vec::new();
        for k in first..=last {
            let place = comb + k as f64 * self.spacing;
            let detuning = (place - line) / self.half_range;
            let whole = knock * (1.0 - ((detuning.powi(2) - 1.0) * 0.7).exp()) * 2.0;
            let own = if (k + swapped).rem_euclid(2) == 0 { self.polarizer } else { 1.0 - self.polarizer };
            let u_height = 0.002 + self.u_height * whole;
            if whole < 0.02 {
                continue;
            }
            modes.push(GlimpseMode {
                position: (place + self.u_position * noise.normal()).rem_euclid(self.free_spectral_range),
                u_position: self.u_position,
                height: (own * whole + u_height * noise.normal()).max(1e-4),
                u_height,
                crossed: Some((1.0 - own) * whole + u_height * noise.normal()),
            });
        }
        modes.sort_by(|a, b| a.position.total_cmp(&b.position));
        let mode_spacing = (modes.len() > 1).then(|| self.spacing + 1e6 * noise.normal());
        Glimpse { at, modes, free_spectral_range: self.free_spectral_range, mode_spacing, power: None }
    }

    /// Glimpses from `from` to `to`, one every `every`.
    pub fn glimpses(&self, from: f64, to: f64, every: f64) -> Vec<Glimpse> {
        let n = ((to - from) / every).floor() as usize;
        (0..=n).map(|i| self.glimpse(from + i as f64 * every)).collect()
    }
}

/// Linear congruential noise (constants of Knuth's MMIX), seeded.
pub(crate) struct Noise(pub u64);

impl Noise {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Near enough normal: twelve uniform numbers less six.
    pub fn normal(&mut self) -> f64 {
        (0..12).map(|_| self.uniform()).sum::<f64>() - 6.0
    }
}
