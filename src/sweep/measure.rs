//! The engine's one path: ramp → peaks → orders → lines → comb → axis → result.
//! Must not hide a doubt: what cannot be measured is refused in words, what is odd is a warning.
//! Main entry: [`measure`].

use super::{
    Measurement, Refusal, Settings, Warning, assign,
    detect::{self, Look},
    fitted, orders,
    orders::Orders,
    outcome,
    refine::{self, Swept},
    segment::{self, Segment},
};
use crate::capture::{Capture, TimeBase};

/// Fewest samples on a ramp that can be measured.
const FEWEST_SAMPLES: usize = 100;
/// An apparent finesse below this is fringes, not peaks.
const LEAST_FINESSE: f64 = 6.0;
/// Share of the peaks' height that must be found again one order on.
const LEAST_REPEAT: f64 = 0.55;

/// Measures one capture.
///
/// Total: every input gives a result, if only a refusal in words.
///
/// 1. The longest one-way ramp is cut out, the signal turned upward, flat tops are masked.
/// 2. Peaks are found; the order repeat is found among them.
/// 3. All lines are fitted at once (Lorentzian, one width, detector pole where the data ask for it).
/// 4. Peaks are gathered into classes (one light, seen in every order), the comb is laid over the classes.
/// 5. Σ cᵢ Pᵢ(x) − m·Δν = k·FSR is solved for axis and spacing, weighted by the centres' covariance.
pub fn measure(capture: &Capture, settings: &Settings) -> Measurement {
    let mut result = Measurement { free_spectral_range: settings.free_spectral_range, ..Measurement::default() };
    if let Err(refusal) = run(capture, settings, &mut result) {
        result.refused = Some(refusal);
    }
    result
}

fn run(capture: &Capture, settings: &Settings, result: &mut Measurement) -> Result<(), Refusal> {
    check(settings)?;
    if settings.u_free_spectral_range == 0.0 {
        result.warnings.push(Warning::NoFsrUncertainty);
    }
    if let Some(sample) = first_not_finite(capture) {
        return Err(Refusal::NotFinite { sample });
    }
    if capture.photodiode.len() < FEWEST_SAMPLES {
        return Err(Refusal::TooShort { samples: capture.photodiode.len() });
    }
    let segment = segment::find(capture);
    result.noise = Some(segment.noise);
    if segment.signal.len() < FEWEST_SAMPLES {
        return Err(Refusal::TooShort { samples: segment.signal.len() });
    }
    warn_of_segment(&segment, result);
    let look = detect::detect(&segment);
    let mean = segment.signal.iter().sum::<f64>() / segment.signal.len() as f64;
    result.mean_level = Some(mean - look.baseline);
    if look.peaks.is_empty() {
        result.dark = true;
        return Err(Refusal::Dark);
    }
    if look.peaks.len() > MOST_LINES {
        return Err(Refusal::Clutter { count: look.peaks.len() });
    }
    let mut main = sweep(segment, &look, settings)?;
    let fit = &main.fitted.fit;
    if let Some(pole) = fit.pole.filter(|pole| *pole > 0.3 * fit.width) {
        result.warnings.push(Warning::SlowDetector { time_constant: pole * main.segment.dt });
    }
    if main.assigned.n_stray > 0 {
        result.warnings.push(Warning::Stray { count: main.assigned.n_stray });
    }
    let other = other_ramp(capture, &main.segment).and_then(|other| {
        let look = detect::detect(&other);
        sweep(other, &look, settings).ok()
    });
    refine::sharpen(&mut main, other, settings.free_spectral_range);
    outcome::fill(&main.segment, &main.fitted, &main.assigned, settings, result);
    Ok(())
}

/// Fits the lines of one ramp and says which is which.
fn sweep(segment: Segment, look: &Look, settings: &Settings) -> Result<Swept, Refusal> {
    let orders = repeat(look, &segment, settings)?;
    let fitted = fitted::fit_lines(&segment, look, &orders).ok_or(Refusal::NoFit)?;
    let assigned = assign::assign(segment.signal.len(), &orders, &fitted, settings)?;
    Ok(Swept { segment, fitted, assigned })
}

/// A ramp that adds less than this to what the longest says, as its share in samples, is left alone: a flyback.
const LEAST_OTHER: f64 = 0.3;

/// The longest ramp of what the main one leaves of a capture, if it is as good a ramp.
fn other_ramp(capture: &Capture, main: &Segment) -> Option<Segment> {
    let n = capture.photodiode.len();
    let (from, to) = if main.start > n - main.end { (0, main.start) } else { (main.end, n) };
    if ((to - from) as f64) < LEAST_OTHER * (main.end - main.start) as f64 || to - from < FEWEST_SAMPLES {
        return None;
    }
    let cut =
        |channel: &Option<Vec<f64>>| channel.as_ref().and_then(|channel| channel.get(from..to)).map(<[f64]>::to_vec);
    let rest = Capture {
        time: TimeBase { n: to - from, ..capture.time },
        ramp: cut(&capture.ramp),
        photodiode: capture.photodiode[from..to].to_vec(),
        crossed: cut(&capture.crossed),
        head: Default::default(),
        remarks: Vec::new(),
    };
    let other = segment::find(&rest);
    let long =
        other.signal.len() as f64 >= LEAST_OTHER * main.signal.len() as f64 && other.signal.len() >= FEWEST_SAMPLES;
    (other.has_ramp && long && other.inverted == main.inverted).then_some(other)
}

fn check(settings: &Settings) -> Result<(), Refusal> {
    let fsr = settings.free_spectral_range;
    if !(fsr.is_finite() && fsr > 0.0) {
        return Err(Refusal::Setting(format!("a free spectral range of {fsr} Hz is not usable; expected more than 0")));
    }
    Ok(())
}

/// First sample that is not finite in any channel.
fn first_not_finite(capture: &Capture) -> Option<usize> {
    let channels = [Some(&capture.photodiode), capture.ramp.as_ref(), capture.crossed.as_ref()];
    channels.into_iter().flatten().filter_map(|channel| channel.iter().position(|v| !v.is_finite())).min()
}

fn warn_of_segment(segment: &Segment, result: &mut Measurement) {
    if !segment.has_ramp {
        result.warnings.push(Warning::NoRamp);
    }
    if segment.inverted {
        result.warnings.push(Warning::Inverted);
    }
    if segment.n_clipped > 0 {
        result.warnings.push(Warning::Clipped { samples: segment.n_clipped });
    }
    if segment.step > 1.5 * segment.noise {
        result.warnings.push(Warning::CoarseSteps);
    }
}

/// The order repeat, or why there is none.
fn repeat(look: &Look, segment: &Segment, settings: &Settings) -> Result<Orders, Refusal> {
    let ratio = settings.nominal_spacing.map(|s| s / settings.free_spectral_range).filter(|r| *r > 0.0 && *r < 1.0);
    let orders = orders::find(&look.peaks, segment.signal.len(), look.width, ratio).ok_or(Refusal::OneOrder)?;
    let finesse = orders.period / look.width;
    if finesse < LEAST_FINESSE {
        return Err(Refusal::Fringes { share: 1.0 / finesse });
    }
    if orders.score < LEAST_REPEAT {
        return Err(Refusal::NoRepeat { share: orders.score });
    }
    Ok(orders)
}

/// More lines than this on one ramp are clutter: no comb is that dense.
const MOST_LINES: usize = 90;
