//! The engine's one path: ramp → peaks → orders → lines → comb → axis → result.
//! Must not hide a doubt: what cannot be measured is refused in words, what is odd is a warning.
//! Main entry: [`measure`].

use super::{
    Measurement, Refusal, Settings, Warning,
    assign::{self, Assigned},
    comb::Class,
    detect::{self, Look},
    fitted::{self, Fitted},
    flatten, orders,
    orders::Orders,
    outcome,
    refine::{self, Swept},
    repeat as own_repeat,
    segment::{self, Segment},
    steady,
};
use crate::capture::Capture;
use crate::uncertainty::{BudgetLine, Evaluation};

/// Fewest samples on a ramp that can be measured.
const FEWEST_SAMPLES: usize = 100;
/// An apparent finesse below this is fringes, not peaks.
const LEAST_FINESSE: f64 = 6.0;
/// Share of the peaks' height that must be found again one order on.
const LEAST_REPEAT: f64 = 0.55;
/// Fewest steps of the digitizer from the baseline to the highest peak: below that single steps look like peaks (found).
const FEWEST_LEVELS: f64 = 12.0;
/// A detector whose time constant is more line widths than this has run the lines together (found).
const FAR_TOO_SLOW: f64 = 6.0;
/// A spacing this near to a whole part of the nominal one is that.
const NEAR_PART: f64 = 0.02;
/// Change of one mode's height against the others' that no sound sweep has, and that which is worth a warning.
const UNSTEADY: f64 = 0.25;
const UNEVEN_HEIGHTS: f64 = 0.06;
/// What a hop that changes heights by a share does to the spacing, of the spacing and that share (found: up to 0.06).
const BY_A_HOP: f64 = 0.05;
/// Reduced chi-square from which the baseline is looked at.
const BAD_FIT: f64 = 8.0;
/// A baseline that moves by this share of the highest peak is worth taking out.
const MOVING: f64 = 0.015;
/// Departure from even spacing, over the spacing, that says the ramp turned in the record.
const UNEVEN: f64 = 0.01;
/// A nominal spacing this near confirms one found without a ramp channel.
const CONFIRMED: f64 = 0.05;
/// Combined standard uncertainties by which two ramps of one record may differ.
const AGREE: f64 = 4.0;

/// Measures one capture.
///
/// Total: every input gives a result, if only a refusal in words.
///
/// 1. The longest one-way ramp is cut out, the signal turned upward, flat tops are masked.
/// 2. Peaks are found; the order repeat is found among them.
/// 3. All lines are fitted at once (Lorentzian, one width, detector pole where the data ask for it).
/// 4. Peaks are gathered into classes (one light, seen in every order), the comb is laid over the classes.
/// 5. Σ cᵢ Pᵢ(x) − m·Δν = k·FSR is solved for axis and spacing, weighted by the centres' covariance.
/// 6. From there one model of all samples (Airy lines, both ramps) is fitted; where it does not fit, step 5 stands.
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
    if segment.signal.len() < FEWEST_SAMPLES {
        result.noise = Some(segment.noise);
        return Err(Refusal::TooShort { samples: segment.signal.len() });
    }
    let before = result.clone();
    // Only a record of several ramps repeats as a whole: then one of them is measured, and the next must say the same.
    if !segment.has_ramp
        && let Some(found) = by_own_repeat(capture, &segment, settings, &before)
    {
        *result = found;
        return Ok(());
    }
    let first = attempt(&segment, Some(capture).filter(|_| segment.has_ramp), settings, result);
    match doubtful(&first, result).then(|| without_baseline(&segment, settings, &before, result)).flatten() {
        Some(better) => *result = better,
        None => first?,
    }
    if !segment.has_ramp && turns(result, settings) {
        result.mode_spacing = None;
        return Err(Refusal::NoTurn);
    }
    Ok(())
}

/// Measures one ramp; `back`: the capture, where its other ramp may help.
fn attempt(
    segment: &Segment,
    back: Option<&Capture>,
    settings: &Settings,
    result: &mut Measurement,
) -> Result<(), Refusal> {
    result.noise = Some(segment.noise);
    warn_of_segment(segment, result);
    let look = detect::detect(segment);
    let mean = segment.signal.iter().sum::<f64>() / segment.signal.len() as f64;
    result.mean_level = Some(mean - look.baseline);
    if look.only_noise {
        result.dark = true;
        return Err(Refusal::Dark);
    }
    let levels = look.peaks.iter().map(|peak| peak.height).fold(0.0, f64::max) / segment.step;
    if levels < FEWEST_LEVELS {
        return Err(Refusal::FewLevels { levels });
    }
    if look.peaks.len() > MOST_LINES {
        return Err(Refusal::Clutter { count: look.peaks.len() });
    }
    let mut main = sweep(segment, &look, settings)?;
    if let Some(pole) = main.fitted.fit.pole {
        let time_constant = pole * segment.dt;
        let ratio = pole / main.fitted.fit.width;
        if ratio > FAR_TOO_SLOW {
            return Err(Refusal::FarTooSlow { ratio });
        }
        if ratio > 0.3 {
            result.warnings.push(Warning::SlowDetector { time_constant });
        }
    }
    if main.assigned.n_stray > 0 {
        result.warnings.push(Warning::Stray { count: main.assigned.n_stray });
    }
    let second = back.and_then(|capture| segment::other(capture, segment));
    let other = second.as_ref().and_then(|second| sweep(second, &detect::detect(second), settings).ok());
    refine::sharpen(&mut main, other, settings.free_spectral_range);
    outcome::fill(main.segment, &main.fitted, &main.assigned, settings, result);
    doubt(&main.assigned, &main.fitted, main.segment, settings, result);
    Ok(())
}

/// Fits the lines of one ramp and says which is which.
fn sweep<'a>(segment: &'a Segment, look: &Look, settings: &Settings) -> Result<Swept<'a>, Refusal> {
    let orders = repeat(look, segment, settings)?;
    let fitted = fitted::fit_lines(segment, look, &orders).ok_or(Refusal::NoFit)?;
    let assigned = assign::assign(segment.signal.len(), &orders, &fitted, settings)?;
    Ok(Swept { segment, fitted, assigned })
}

/// Withdraws a spacing that looks sound and is not.
fn doubt(assigned: &Assigned, fitted: &Fitted, segment: &Segment, settings: &Settings, result: &mut Measurement) {
    let Some(spacing) = result.mode_spacing.as_ref().map(|spacing| spacing.value) else { return };
    let withdraw = |refusal: Refusal, result: &mut Measurement| {
        result.mode_spacing = None;
        result.no_spacing = Some(refusal);
    };
    let near = |parts: &[f64]| {
        let near_one = |nominal: f64| parts.iter().any(|part| (spacing / nominal / part - 1.0).abs() < NEAR_PART);
        settings.nominal_spacing.is_some_and(near_one)
    };
    // Twice nominal is a polarizing element in the way, warned of by name, unless the lines do not even fit.
    if let Some(nominal) = settings.nominal_spacing
        && (near(&[1.0 / 4.0, 1.0 / 3.0, 1.0 / 2.0, 3.0, 4.0]) || (near(&[2.0]) && misfits(result)))
    {
        return withdraw(Refusal::FalseComb { spacing, nominal }, result);
    }
    if segment.n_clipped > 0 {
        // Heights of clipped lines are guesses from their flanks.
        return;
    }
    let on: Vec<&Class> = match &assigned.comb {
        Ok(comb) => assigned.classes.iter().zip(&comb.teeth).filter(|(_, t)| t.is_some()).map(|(c, _)| c).collect(),
        Err(_) => return,
    };
    let change = steady::height_change(&on, &fitted.fit);
    if change > UNSTEADY {
        withdraw(Refusal::Unsteady { change }, result);
    } else if change > UNEVEN_HEIGHTS {
        result.warnings.push(Warning::HeightsChange { change });
        let by_a_hop = BY_A_HOP * change * spacing;
        let line = "heights that change in mid-sweep: what a hop of that size does to the spacing";
        if let Some(spacing) = &mut result.mode_spacing {
            let line = BudgetLine::direct("unsteady-sweep", line, Evaluation::TypeB, by_a_hop, f64::INFINITY);
            spacing.budget.push(line);
        }
    }
}

/// Whether another way to read the capture should be tried.
fn doubtful(first: &Result<(), Refusal>, result: &Measurement) -> bool {
    match first {
        Err(Refusal::Dark | Refusal::FewLevels { .. } | Refusal::FarTooSlow { .. } | Refusal::Fringes { .. }) => false,
        Err(_) => true,
        // A tube that did not hold still did not, whatever the baseline.
        Ok(()) => match result.no_spacing {
            Some(Refusal::Unsteady { .. }) => false,
            Some(_) => true,
            None => misfits(result),
        },
    }
}

/// The ramp once more without a baseline that moves; none if it does not move, or if that is no surer.
///
/// * `before`: the result before any attempt. `first`: what the plain attempt made of it.
fn without_baseline(
    segment: &Segment,
    settings: &Settings,
    before: &Measurement,
    first: &Measurement,
) -> Option<Measurement> {
    let look = detect::detect(segment);
    let top = look.peaks.iter().map(|peak| peak.height).fold(0.0, f64::max);
    let (flat, moved) = flatten::flattened(segment, look.width)?;
    let share = moved / top;
    if share < MOVING {
        return None;
    }
    // On the flat baseline the lines' width is better known: once more with that.
    let look = detect::detect(&flat);
    let (flat, _) = flatten::flattened(segment, look.width).unwrap_or((flat, moved));
    let mut result = before.clone();
    attempt(&flat, None, settings, &mut result).ok()?;
    let surer = u_spacing(&result) < u_spacing(first);
    result.warnings.push(Warning::Baseline { share });
    surer.then_some(result)
}

/// A result from one ramp of a record without a ramp channel; the next ramp must say the same.
fn by_own_repeat(
    capture: &Capture,
    segment: &Segment,
    settings: &Settings,
    before: &Measurement,
) -> Option<Measurement> {
    let (period, stretches) = own_repeat::stretches(segment)?;
    let of = |range: (usize, usize)| {
        let mut result = before.clone();
        attempt(&segment::cut(capture, range, false), None, settings, &mut result).ok()?;
        let spacing = result.mode_spacing.as_ref()?.value;
        let against = settings.nominal_spacing.is_some_and(|_| !confirmed(spacing, settings));
        (!against && !turns(&result, settings) && !misfits(&result)).then_some(result)
    };
    let mut best: Option<Measurement> = None;
    for stretch in stretches {
        let (Some(mut result), Some(again)) = (of(stretch.range), of(stretch.again)) else { continue };
        let (Some(a), Some(b)) = (&result.mode_spacing, &again.mode_spacing) else { continue };
        let agree = (a.value - b.value).abs() <= AGREE * a.u().hypot(b.u());
        if agree && u_spacing(&result) < best.as_ref().map_or(f64::INFINITY, u_spacing) {
            result.warnings.push(Warning::OwnRepeat { period });
            best = Some(result);
        }
    }
    best
}

fn u_spacing(result: &Measurement) -> f64 {
    result.mode_spacing.as_ref().map_or(f64::INFINITY, |spacing| spacing.u())
}

/// Residuals far beyond the noise.
fn misfits(result: &Measurement) -> bool {
    result.warnings.iter().any(|w| matches!(w, Warning::Misfit { chi_square } if *chi_square > BAD_FIT))
}

/// Whether a record without a ramp channel looks as if the ramp turned within it: modes less even than a ramp without a turn
/// leaves them, or lines that do not fit and a spacing that nothing confirms.
fn turns(result: &Measurement, settings: &Settings) -> bool {
    let Some(spacing) = result.mode_spacing.as_ref().map(|spacing| spacing.value) else { return false };
    let odd = |w: &Warning| match w {
        Warning::UnevenComb { rms } => *rms > UNEVEN * spacing,
        Warning::Misfit { .. } => true,
        _ => false,
    };
    result.warnings.iter().any(odd) && !confirmed(spacing, settings)
}

/// Whether a nominal spacing was given and is near, as far as the free spectral range is known.
fn confirmed(spacing: f64, settings: &Settings) -> bool {
    let near = |nominal: f64| (spacing / nominal - 1.0).abs() < CONFIRMED.hypot(2.0 * settings.u_free_spectral_range);
    settings.nominal_spacing.is_some_and(near)
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
