//! Line shapes: value, derivatives, first guess and valid range together.
//! Must not fit anything or know what the axis means.
//! Main types: [`Shape`], [`Lorentzian`], [`Gaussian`], [`AiryTransmission`].

use std::f64::consts::{LN_2, PI};

use super::peaks;

/// A shape with three parameters on an axis x. Position parameters are in units of x, heights in units of y.
pub trait Shape: Sized {
    /// Names of the parameters in order.
    const PARAMETER_NAMES: [&'static str; 3];

    /// From parameters in the order of [`Shape::PARAMETER_NAMES`]; not checked, see [`Shape::is_valid`].
    fn from_parameters(parameters: [f64; 3]) -> Self;

    /// Parameters in order.
    fn parameters(&self) -> [f64; 3];

    /// Value at `x`. Not finite outside the valid range.
    fn value(&self, x: f64) -> f64;

    /// Derivatives of the value by each parameter, in order.
    fn derivatives(&self, x: f64) -> [f64; 3];

    /// True if all parameters are finite and in the range in which the formula means something.
    fn is_valid(&self) -> bool;

    /// A start for a fit, from samples `y` at `x` (monotonic, at least three, equal lengths, finite) without a
    /// background. `None` if that is not given or no such shape is seen.
    fn first_guess(x: &[f64], y: &[f64]) -> Option<Self>;
}

/// `peak_height / (1 + t²)`, t = 2·(x − center)/fwhm. Valid for fwhm > 0. Area π/2 · peak_height · fwhm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Lorentzian {
    /// Value at the center.
    pub peak_height: f64,
    /// Position of the peak.
    pub center: f64,
    /// Full width at half of the peak height.
    pub fwhm: f64,
}

impl Lorentzian {
    /// Integral over the whole axis.
    pub fn area(&self) -> f64 {
        0.5 * PI * self.peak_height * self.fwhm
    }
}

impl Shape for Lorentzian {
    const PARAMETER_NAMES: [&'static str; 3] = ["peak_height", "center", "fwhm"];

    fn from_parameters([peak_height, center, fwhm]: [f64; 3]) -> Self {
        Self { peak_height, center, fwhm }
    }

    fn parameters(&self) -> [f64; 3] {
        [self.peak_height, self.center, self.fwhm]
    }

    fn value(&self, x: f64) -> f64 {
        let t = 2.0 * (x - self.center) / self.fwhm;
        self.peak_height / (1.0 + t * t)
    }

    fn derivatives(&self, x: f64) -> [f64; 3] {
        let t = 2.0 * (x - self.center) / self.fwhm;
        let unit = 1.0 / (1.0 + t * t);
        let by_t = -2.0 * self.peak_height * t * unit * unit;
        [unit, -2.0 * by_t / self.fwhm, -by_t * t / self.fwhm]
    }

    fn is_valid(&self) -> bool {
        bell_is_valid(self.parameters())
    }

    fn first_guess(x: &[f64], y: &[f64]) -> Option<Self> {
        highest_bell(x, y).map(Self::from_parameters)
    }
}

/// `peak_height · exp(−4·ln2·(x − center)²/fwhm²)`. Valid for fwhm > 0. Area √(π/(4·ln2)) · peak_height · fwhm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Gaussian {
    /// Value at the center.
    pub peak_height: f64,
    /// Position of the peak.
    pub center: f64,
    /// Full width at half of the peak height; 2·√(2·ln2) = 2.3548 standard deviations.
    pub fwhm: f64,
}

impl Gaussian {
    /// Integral over the whole axis.
    pub fn area(&self) -> f64 {
        (PI / (4.0 * LN_2)).sqrt() * self.peak_height * self.fwhm
    }
}

impl Shape for Gaussian {
    const PARAMETER_NAMES: [&'static str; 3] = ["peak_height", "center", "fwhm"];

    fn from_parameters([peak_height, center, fwhm]: [f64; 3]) -> Self {
        Self { peak_height, center, fwhm }
    }

    fn parameters(&self) -> [f64; 3] {
        [self.peak_height, self.center, self.fwhm]
    }

    fn value(&self, x: f64) -> f64 {
        let t = (x - self.center) / self.fwhm;
        self.peak_height * (-4.0 * LN_2 * t * t).exp()
    }

    fn derivatives(&self, x: f64) -> [f64; 3] {
        let t = (x - self.center) / self.fwhm;
        let unit = (-4.0 * LN_2 * t * t).exp();
        let by_t = -8.0 * LN_2 * t * self.peak_height * unit;
        [unit, -by_t / self.fwhm, -by_t * t / self.fwhm]
    }

    fn is_valid(&self) -> bool {
        bell_is_valid(self.parameters())
    }

    fn first_guess(x: &[f64], y: &[f64]) -> Option<Self> {
        highest_bell(x, y).map(Self::from_parameters)
    }
}

/// Transmission of a plane-mirror interferometer, `1 / (1 + (2F/π)²·sin²(π·(x − center)/free_spectral_range))`, 1 at
/// the peaks. Valid for finesse > 0 and free spectral range > 0. Formula: published source, any optics text (Airy
/// 1833).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AiryTransmission {
    /// Position of one of the peaks.
    pub center: f64,
    /// Finesse F: free spectral range over full width at half height, in the limit of narrow lines.
    pub finesse: f64,
    /// Distance of neighbouring peaks.
    pub free_spectral_range: f64,
}

impl AiryTransmission {
    /// Exact full width at half height, 2·FSR/π · asin(π/(2F)); `None` for a finesse below π/2, where the valleys lie
    /// above half.
    pub fn fwhm(&self) -> Option<f64> {
        let sine = PI / (2.0 * self.finesse);
        (self.is_valid() && sine <= 1.0).then(|| 2.0 * self.free_spectral_range / PI * sine.asin())
    }
}

impl Shape for AiryTransmission {
    const PARAMETER_NAMES: [&'static str; 3] = ["center", "finesse", "free_spectral_range"];

    fn from_parameters([center, finesse, free_spectral_range]: [f64; 3]) -> Self {
        Self { center, finesse, free_spectral_range }
    }

    fn parameters(&self) -> [f64; 3] {
        [self.center, self.finesse, self.free_spectral_range]
    }

    fn value(&self, x: f64) -> f64 {
        let sine = (PI * (x - self.center) / self.free_spectral_range).sin();
        1.0 / (1.0 + (2.0 * self.finesse / PI * sine).powi(2))
    }

    fn derivatives(&self, x: f64) -> [f64; 3] {
        let phase = PI * (x - self.center) / self.free_spectral_range;
        let coefficient = (2.0 * self.finesse / PI).powi(2);
        let value = 1.0 / (1.0 + coefficient * phase.sin().powi(2));
        let by_phase = -value * value * coefficient * (2.0 * phase).sin();
        [
            -by_phase * PI / self.free_spectral_range,
            -value * value * 2.0 * coefficient / self.finesse * phase.sin().powi(2),
            -by_phase * phase / self.free_spectral_range,
        ]
    }

    fn is_valid(&self) -> bool {
        self.parameters().iter().all(|p| p.is_finite()) && self.finesse > 0.0 && self.free_spectral_range > 0.0
    }

    /// From the highest peak, its half width, and its nearest neighbour above half of the range; `None` with fewer
    /// than two peaks.
    fn first_guess(x: &[f64], y: &[f64]) -> Option<Self> {
        if !usable(x, y) {
            return None;
        }
        let (low, high) = y.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| (a.min(*v), b.max(*v)));
        let half = 0.5 * (high - low);
        let options = peaks::Options { min_prominence: Some(half), ..peaks::Options::default() };
        let found = peaks::find(y, &options);
        let best = found.iter().max_by(|a, b| a.height.total_cmp(&b.height))?;
        let others = found.iter().filter(|p| p.index != best.index);
        let free_spectral_range = others.map(|p| (x[p.index] - x[best.index]).abs()).min_by(f64::total_cmp)?;
        let [_, center, fwhm] = highest_bell(x, y)?;
        let guess = Self { center, finesse: free_spectral_range / fwhm, free_spectral_range };
        guess.is_valid().then_some(guess)
    }
}

fn bell_is_valid(parameters: [f64; 3]) -> bool {
    parameters.iter().all(|p| p.is_finite()) && parameters[2] > 0.0
}

fn usable(x: &[f64], y: &[f64]) -> bool {
    x.len() == y.len() && x.len() >= 3 && x.iter().chain(y).all(|v| v.is_finite())
}

/// Height, position and full width at half height of the highest sample, walking down both sides; a side cut off by
/// the edge counts as the other.
fn highest_bell(x: &[f64], y: &[f64]) -> Option<[f64; 3]> {
    if !usable(x, y) {
        return None;
    }
    let (top, &peak_height) = y.iter().enumerate().max_by(|a, b| a.1.total_cmp(b.1))?;
    if peak_height <= 0.0 {
        return None;
    }
    let half = 0.5 * peak_height;
    let cross = |inner: usize, outer: usize| {
        let part = (y[inner] - half) / (y[inner] - y[outer]);
        (x[inner] + part * (x[outer] - x[inner]) - x[top]).abs()
    };
    let left = (0..top).rev().find(|&i| y[i] <= half).map(|i| cross(i + 1, i));
    let right = (top + 1..y.len()).find(|&i| y[i] <= half).map(|i| cross(i - 1, i));
    let fwhm = match (left, right) {
        (Some(a), Some(b)) => a + b,
        (Some(a), None) | (None, Some(a)) => 2.0 * a,
        (None, None) => (x[x.len() - 1] - x[0]).abs(),
    };
    (fwhm > 0.0).then_some([peak_height, x[top], fwhm])
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// Central differences with h = 1e-5 of parameters of order one leave h² = 1e-10 times third derivatives of up to
    /// 1e4 (finesse 20).
    const DERIVATIVE_TOLERANCE: f64 = 1e-5;

    fn derivatives_agree<S: Shape>(parameters: [f64; 3]) {
        for k in -40..=40 {
            let x = f64::from(k) * 0.0937;
            let formulas = S::from_parameters(parameters).derivatives(x);
            for j in 0..3 {
                let h = 1e-5;
                let moved = |by: f64| {
                    let mut p = parameters;
                    p[j] += by;
                    S::from_parameters(p).value(x)
                };
                let difference = (moved(h) - moved(-h)) / (2.0 * h);
                let error = (difference - formulas[j]).abs();
                let name = S::PARAMETER_NAMES[j];
                assert!(error <= DERIVATIVE_TOLERANCE * (1.0 + difference.abs()), "{name} at {x}: {error}");
            }
        }
    }

    #[test]
    fn derivatives_agree_with_differences() {
        derivatives_agree::<Lorentzian>([2.0, 0.3, 0.9]);
        derivatives_agree::<Gaussian>([2.0, 0.3, 0.9]);
        derivatives_agree::<AiryTransmission>([0.3, 20.0, 1.7]);
        derivatives_agree::<AiryTransmission>([-0.1, 2.0, 3.0]);
    }

    #[test]
    fn half_height_at_half_width() {
        for value in [
            Lorentzian::from_parameters([3.0, 1.0, 0.5]).value(1.25),
            Gaussian::from_parameters([3.0, 1.0, 0.5]).value(0.75),
        ] {
            assert!((value - 1.5).abs() < 1e-12);
        }
        let airy = AiryTransmission { center: 0.2, finesse: 12.0, free_spectral_range: 3.0 };
        assert!((airy.value(0.2 + 0.5 * airy.fwhm().unwrap()) - 0.5).abs() < 1e-12);
        assert!((airy.value(0.2 + 3.0) - 1.0).abs() < 1e-12);
        assert_eq!(AiryTransmission { finesse: 1.5, ..airy }.fwhm(), None);
    }

    #[test]
    fn areas_agree_with_sums() {
        let (l, g) = (Lorentzian::from_parameters([2.0, 0.0, 1.0]), Gaussian::from_parameters([2.0, 0.0, 1.0]));
        let sum = |f: &dyn Fn(f64) -> f64| (-100_000..=100_000).map(|i| f(f64::from(i) * 0.01) * 0.01).sum::<f64>();
        assert!((sum(&|x| g.value(x)) - g.area()).abs() < 1e-9);
        // The tails of the Lorentzian beyond ±1000 widths hold 2·(2·0.25/1000) = 0.001.
        assert!((sum(&|x| l.value(x)) + 0.001 - l.area()).abs() < 1e-5);
    }

    #[test]
    fn guesses_are_near() {
        let x: Vec<f64> = (0..400).map(|i| f64::from(i) * 0.01).collect();
        let sampled = |f: &dyn Fn(f64) -> f64| x.iter().map(|x| f(*x)).collect::<Vec<f64>>();
        let line = Lorentzian { peak_height: 2.0, center: 1.5, fwhm: 0.2 };
        let guess = Lorentzian::first_guess(&x, &sampled(&|x| line.value(x))).unwrap();
        // Within the sample distance.
        assert!((guess.center - 1.5).abs() < 0.011 && (guess.fwhm - 0.2).abs() < 0.011);
        let airy = AiryTransmission { center: 1.003, finesse: 15.0, free_spectral_range: 1.4 };
        let guess = AiryTransmission::first_guess(&x, &sampled(&|x| airy.value(x))).unwrap();
        let nearest = ((guess.center - 1.003) / 1.4).round() * 1.4 + 1.003;
        assert!((guess.center - nearest).abs() < 0.011 && (guess.free_spectral_range - 1.4).abs() < 0.021);
        assert!((guess.finesse - 15.0).abs() < 2.5, "{guess:?}");
    }

    #[test]
    fn no_guess_without_a_shape() {
        assert_eq!(Gaussian::first_guess(&[], &[]), None);
        assert_eq!(Gaussian::first_guess(&[0.0, 1.0, 2.0], &[0.0, 1.0]), None);
        assert_eq!(Gaussian::first_guess(&[0.0, 1.0, 2.0], &[0.0, f64::NAN, 0.0]), None);
        assert_eq!(Gaussian::first_guess(&[0.0, 1.0, 2.0], &[0.0; 3]), None);
        assert_eq!(Gaussian::first_guess(&[1.0; 3], &[1.0; 3]), None);
        assert_eq!(AiryTransmission::first_guess(&[0.0, 1.0, 2.0], &[0.0, 1.0, 0.0]), None);
        assert!(!Lorentzian::from_parameters([1.0, 0.0, 0.0]).is_valid());
        assert!(!AiryTransmission::from_parameters([f64::NAN, 1.0, 1.0]).is_valid());
    }
}
