//! Seeded random numbers, each drawn from a place that depends on seed, purpose and time alone.
//! Must not carry state from one capture or reading to the next: asking twice gives the same numbers.
//! Main type: [`Noise`].

use rand_chacha::ChaCha8Rng;
use rand_core::{RngCore, SeedableRng};

/// What random numbers are drawn for: each purpose has its own place, so that none disturbs another.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Purpose {
    Placement = 1,
    Photodiode = 2,
    Crossed = 3,
    Meter = 4,
    DarkMeter = 5,
    Current = 6,
    Voltage = 7,
    Dropout = 8,
    Light = 20,
    LightDetector = 21,
}

/// A stream of random numbers.
pub(super) struct Noise {
    generator: ChaCha8Rng,
    spare: Option<f64>,
}

impl Noise {
    /// The stream of one purpose at one time.
    pub fn new(seed: u64, purpose: Purpose, at_ms: i64) -> Self {
        let mut key = [0_u8; 32];
        key[..8].copy_from_slice(&seed.to_le_bytes());
        key[8] = purpose as u8;
        key[16..24].copy_from_slice(&at_ms.to_le_bytes());
        Self { generator: ChaCha8Rng::from_seed(key), spare: None }
    }

    /// Uniform in [0, 1), 53 bits.
    pub fn uniform(&mut self) -> f64 {
        (self.generator.next_u64() >> 11) as f64 / (1_u64 << 53) as f64
    }

    /// Normal, mean 0 and standard deviation 1, by the polar form of Box and Muller (Ann. Math. Stat. 29, 610, 1958).
    pub fn normal(&mut self) -> f64 {
        if let Some(spare) = self.spare.take() {
            return spare;
        }
        loop {
            let x = 2.0 * self.uniform() - 1.0;
            let y = 2.0 * self.uniform() - 1.0;
            let square = x * x + y * y;
            // The square with the corners and the origin left out; four in five draws pass.
            if square > 0.0 && square < 1.0 {
                let factor = (-2.0 * square.ln() / square).sqrt();
                self.spare = Some(y * factor);
                return x * factor;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn normal_numbers_have_the_moments_of_a_normal_distribution() {
        let mut noise = Noise::new(7, Purpose::Photodiode, 0);
        let n = 200_000;
        let values: Vec<f64> = (0..n).map(|_| noise.normal()).collect();
        let moment = |power: i32| values.iter().map(|v| v.powi(power)).sum::<f64>() / f64::from(n);
        // Five standard errors of each moment: sqrt(1, 2, 15, 96 over n).
        assert!(moment(1).abs() < 5.0 * (1.0 / f64::from(n)).sqrt());
        assert!((moment(2) - 1.0).abs() < 5.0 * (2.0 / f64::from(n)).sqrt());
        assert!(moment(3).abs() < 5.0 * (15.0 / f64::from(n)).sqrt());
        assert!((moment(4) - 3.0).abs() < 5.0 * (96.0 / f64::from(n)).sqrt());
    }

    #[test]
    fn seed_purpose_and_time_each_change_the_stream() {
        let first = |seed, purpose, at| Noise::new(seed, purpose, at).uniform();
        let base = first(1, Purpose::Photodiode, 0);
        assert_eq!(base.to_bits(), first(1, Purpose::Photodiode, 0).to_bits());
        assert_ne!(base.to_bits(), first(2, Purpose::Photodiode, 0).to_bits());
        assert_ne!(base.to_bits(), first(1, Purpose::Crossed, 0).to_bits());
        assert_ne!(base.to_bits(), first(1, Purpose::Photodiode, -1).to_bits());
    }
}
