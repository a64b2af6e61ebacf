//! Captures made by formula, their truth, and the Cramér-Rao bound of the model that made them.
//! Must not use the engine or the simulated bench: it is their judge.
//! Main types: [`Case`], [`Made`].
#![allow(dead_code)]

use tubewright::capture::{Capture, TimeBase};

/// How detuning runs along one ramp; z from −1 to 1, in orders about the middle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Ramp {
    /// Legendre coefficients of degrees 2 and 3 over that of degree 1: what the engine fits.
    Polynomial(f64, f64),
    /// (z + 1 + shift)^power, scaled.
    PowerLaw(f64, f64),
    /// A straight ramp plus a share of the logarithm of time: creep.
    Creep(f64),
    /// A bent ramp plus a wave: (curvature, share of an order, waves on the ramp).
    Wiggle(f64, f64, f64),
}

impl Ramp {
    fn at(self, z: f64) -> f64 {
        match self {
            Self::Polynomial(two, three) => z + two * (1.5 * z * z - 0.5) + three * (2.5 * z * z * z - 1.5 * z),
            Self::PowerLaw(power, shift) => {
                let f = |z: f64| (z + 1.0 + shift).powf(power);
                2.0 * (f(z) - f(0.0)) / (f(1.0) - f(-1.0))
            }
            Self::Creep(share) => z + share * (1.0 + 5.0 * (z + 1.0)).ln(),
            Self::Wiggle(two, share, waves) => {
                z + two * (1.5 * z * z - 0.5) + share * (std::f64::consts::PI * waves * z).sin()
            }
        }
    }

    /// Axis terms of the bound's model.
    fn terms(self) -> usize {
        match self {
            Self::Polynomial(_, 0.0) => 2,
            _ => 3,
        }
    }
}

/// One line of the table.
#[derive(Debug, Clone, PartialEq)]
pub struct Case {
    /// What it is.
    pub name: &'static str,
    /// Hz.
    pub fsr: f64,
    /// Hz.
    pub spacing: f64,
    /// Heights of the modes, ascending in frequency, V.
    pub heights: &'static [f64],
    /// FSR over FWHM.
    pub finesse: f64,
    /// Standard deviation of the noise, V.
    pub noise: f64,
    /// Samples of the capture.
    pub samples: usize,
    /// Orders on the rising ramp.
    pub orders: f64,
    /// Rising ramp.
    pub up: Ramp,
    /// Falling ramp; none: the capture is one rising ramp.
    pub down: Option<Ramp>,
    /// Time constant of the detector, samples; 0: none.
    pub pole: f64,
}

/// A capture with its truth.
pub struct Made {
    /// What the engine sees.
    pub capture: Capture,
    /// Cramér-Rao bound of the spacing for these samples, Hz.
    pub bound: f64,
}

/// Seeded chance: splitmix64 and Box-Muller.
pub struct Chance(u64);

impl Chance {
    /// Seed.
    pub fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) ^ 0x5851_F42D_4C95_7F2D)
    }

    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    fn normal(&mut self) -> f64 {
        let (a, b) = (self.uniform().max(1e-300), self.uniform());
        (-2.0 * a.ln()).sqrt() * (std::f64::consts::TAU * b).cos()
    }
}

/// One ramp of a capture: z of each of its samples, rising (+1) or falling (−1).
struct Stroke {
    n: usize,
    ramp: Ramp,
    way: f64,
}

impl Case {
    fn strokes(&self) -> Vec<Stroke> {
        match self.down {
            None => vec![Stroke { n: self.samples, ramp: self.up, way: 1.0 }],
            Some(down) => {
                let n = self.samples / 2;
                vec![Stroke { n, ramp: self.up, way: 1.0 }, Stroke { n: self.samples - n, ramp: down, way: -1.0 }]
            }
        }
    }

    /// Makes one capture: the comb stands anywhere in the order.
    pub fn make(&self, seed: u64, with_bound: bool) -> Made {
        let mut chance = Chance::new(seed);
        let place = chance.uniform() * self.fsr;
        let strokes = self.strokes();
        let k = {
            let s = (std::f64::consts::FRAC_PI_2 / self.finesse).sin();
            1.0 / (s * s)
        };
        let slope = self.spacing; // Step of the difference that stands for ∂/∂ν is a share of this.
        let _ = slope;
        let n_heights = self.heights.len();
        // Columns: (c0..cT) of each stroke, spacing, finesse's K, (pole), heights, baseline and slope.
        let axis: Vec<usize> = strokes.iter().map(|s| s.ramp.terms() + 1).collect();
        let n_axis: usize = axis.iter().sum();
        let n_pole = usize::from(self.pole > 0.0);
        let n_columns = n_axis + 2 + n_pole + n_heights + 2;
        let mut normal = vec![0.0; n_columns * n_columns];
        let mut photodiode = Vec::with_capacity(self.samples);
        let mut volts = Vec::with_capacity(self.samples);
        // The detector's state runs through the turn of the ramp; its columns too.
        let (mut state, mut before): (Vec<f64>, Vec<f64>) = (Vec::new(), Vec::new());
        let (a, alpha, beta) = lag(self.pole);
        let mut first_column = 0;
        for (index, stroke) in strokes.iter().enumerate() {
            for i in 0..stroke.n {
                let z = stroke.way * ((i as f64 + 0.5) / stroke.n as f64 * 2.0 - 1.0);
                let nu = self.orders / 2.0 * self.fsr * stroke.ramp.at(z) - place;
                let (mut sum, mut by_nu, mut by_spacing, mut by_k) = (0.0, 0.0, 0.0, 0.0);
                let mut row = vec![0.0; n_columns + 1];
                for (tooth, height) in self.heights.iter().enumerate() {
                    let half = std::f64::consts::PI * (nu - tooth as f64 * self.spacing) / self.fsr;
                    let (sin, cos) = half.sin_cos();
                    let airy = 1.0 / (1.0 + k * sin * sin);
                    let slope = -height * airy * airy * k * 2.0 * sin * cos * std::f64::consts::PI / self.fsr;
                    sum += height * airy;
                    by_nu += slope;
                    by_spacing -= tooth as f64 * slope;
                    by_k -= height * airy * airy * sin * sin;
                    row[n_axis + 2 + n_pole + tooth] = airy;
                }
                let (mut p0, mut p1) = (1.0, z);
                for degree in 0..axis[index] {
                    row[first_column + degree] = by_nu * p0 * self.fsr;
                    let p2 =
                        ((2.0 * degree as f64 + 3.0) * z * p1 - (degree as f64 + 1.0) * p0) / (degree as f64 + 2.0);
                    (p0, p1) = (p1, p2);
                }
                row[n_axis] = by_spacing * self.fsr;
                row[n_axis + 1] = by_k * k;
                row[n_columns] = sum;
                if self.pole > 0.0 {
                    if state.is_empty() {
                        (state, before) = (row.clone(), row.clone());
                    }
                    // ∂y/∂τ filters −y': the derivative of the output by time.
                    let y = state[n_columns];
                    let next = a * y + alpha * before[n_columns] + beta * row[n_columns];
                    row[n_axis + 2] = -(next - y);
                    before[n_axis + 2] = if i == 0 && index == 0 { 0.0 } else { before[n_axis + 2] };
                    for c in 0..=n_columns {
                        let value = a * state[c] + alpha * before[c] + beta * row[c];
                        before[c] = row[c];
                        state[c] = value;
                    }
                    row.copy_from_slice(&state);
                }
                let t = photodiode.len() as f64 / self.samples as f64 * 2.0 - 1.0;
                row[n_columns - 2] = 1.0;
                row[n_columns - 1] = t;
                photodiode.push(row[n_columns] + 0.05 + 0.01 * t + self.noise * chance.normal());
                volts.push(5.0 + 4.0 * z);
                if with_bound {
                    for c in 0..n_columns {
                        if row[c] != 0.0 {
                            for d in 0..=c {
                                normal[c * n_columns + d] += row[c] * row[d];
                            }
                        }
                    }
                }
            }
            first_column += axis[index];
        }
        let bound =
            if with_bound { self.noise * self.fsr * inverse_at(&normal, n_columns, n_axis).sqrt() } else { 0.0 };
        let capture = Capture {
            time: TimeBase { start: 0.0, step: 1e-6, n: photodiode.len() },
            ramp: Some(volts),
            photodiode,
            crossed: None,
            head: Default::default(),
            remarks: Vec::new(),
        };
        Made { capture, bound }
    }
}

/// One-pole low pass of unit steps: y ← a y + α f₋₁ + β f, exact for f straight between samples.
fn lag(pole: f64) -> (f64, f64, f64) {
    if pole <= 0.0 {
        return (0.0, 0.0, 1.0);
    }
    let t = 1.0 / pole;
    let a = (-t).exp();
    let g = (1.0 - a) / t;
    (a, g - a, 1.0 - g)
}

/// One diagonal element of the inverse of a symmetric matrix (lower triangle given), by Cholesky on unit diagonals.
fn inverse_at(lower: &[f64], n: usize, which: usize) -> f64 {
    let scale: Vec<f64> = (0..n).map(|i| lower[i * n + i].sqrt()).collect();
    let mut l = vec![0.0; n * n];
    for i in 0..n {
        for j in 0..=i {
            let mut sum = lower[i * n + j] / (scale[i] * scale[j]);
            for k in 0..j {
                sum -= l[i * n + k] * l[j * n + k];
            }
            l[i * n + j] = if i == j { sum.max(1e-300).sqrt() } else { sum / l[j * n + j] };
        }
    }
    // ‖L⁻¹ e‖² is the diagonal element.
    let mut y = vec![0.0; n];
    for i in 0..n {
        let mut sum = f64::from(u8::from(i == which));
        for k in 0..i {
            sum -= l[i * n + k] * y[k];
        }
        y[i] = sum / l[i * n + i];
    }
    y.iter().map(|v| v * v).sum::<f64>() / (scale[which] * scale[which])
}

/// What many captures of a case say.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Score {
    /// Captures with a spacing.
    pub n: usize,
    /// Captures without.
    pub none: usize,
    /// Root mean square error over root mean square bound.
    pub rms: f64,
    /// Mean error over the bound.
    pub bias: f64,
    /// Its standard deviation.
    pub u_bias: f64,
    /// Share covered by k = 1.96.
    pub covered: f64,
    /// Median of stated uncertainty over bound.
    pub stated: f64,
    /// Root mean square bound, Hz.
    pub bound: f64,
    /// Mean time to measure, s.
    pub time: f64,
}
