//! The engine's one path: ramp → peaks → orders → lines → comb → axis → result.
//! Must not hide a doubt: what cannot be measured is refused in words, what is odd is a warning.
//! Main entry: [`measure`].

use nalgebra::DMatrix;

use super::{
    Measurement, Mode, Refusal, ScanAxis, Settings, Warning,
    axis::{self, AxisFit, Choice, Offsets, Placed},
    comb::{self, Class, Comb, Phased},
    detect::{self, Look, Seen},
    lines::{self, LineFit, Samples, Start},
    orders::{self, Orders},
    segment::{self, Segment},
};
use crate::{
    capture::Capture,
    numerics::smoothing,
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Fewest samples on a ramp that can be measured.
const FEWEST_SAMPLES: usize = 100;
/// An apparent finesse below this is fringes, not peaks.
const LEAST_FINESSE: f64 = 6.0;
/// Share of the peaks' height that must be found again one order on.
const LEAST_REPEAT: f64 = 0.55;
/// Share of all fitted height that must stand on the comb; off-axis light up to half of every axial mode passes.
const LEAST_COMB_SHARE: f64 = 0.64;
/// A fitted line counts if its height exceeds this many of its own standard uncertainties (`measurement.md`: 5 σ).
const LEAST_HEIGHT_SIGMA: f64 = 5.0;
/// The pole must improve the sum of squares by this chi-square (1 parameter at far below 0.1 %) to be believed.
const POLE_CHI_SQUARE: f64 = 30.0;
/// Allowance for departures of the comb from even spacing, Hz (`measurement.md` §1).
const EVEN_ALLOWANCE: f64 = 100e3;

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
    let orders = repeat(&look, &segment, settings)?;
    let fitted = fit_lines(&segment, &look, &orders).ok_or(Refusal::NoFit)?;
    if let Some(pole) = fitted.fit.pole {
        let time_constant = pole * segment.dt;
        if pole > 0.3 * fitted.fit.width {
            result.warnings.push(Warning::SlowDetector { time_constant });
        }
    }
    assemble(&segment, &orders, &fitted, settings, result)
}

fn check(settings: &Settings) -> Result<(), Refusal> {
    let fsr = settings.free_spectral_range;
    if !(fsr.is_finite() && fsr > 0.0) {
        return Err(Refusal::Setting(format!("a free spectral range of {fsr} Hz is not usable; expected more than 0")));
    }
    Ok(())
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

/// Lines as fitted, with and without the detector's pole.
struct Fitted {
    fit: LineFit,
    apparent_width: f64,
    stretch: Vec<f64>,
}

fn fit_lines(segment: &Segment, look: &Look, orders: &Orders) -> Option<Fitted> {
    let samples = Samples::new(&segment.signal, &segment.usable, look.width);
    let stretch_of = |x: f64| (orders.local_period(x) / orders.period).clamp(0.2, 5.0);
    let mut seen: Vec<Seen> = look.peaks.clone();
    let mut start = Start {
        centres: seen.iter().map(|p| p.x).collect(),
        heights: seen.iter().map(|p| p.height).collect(),
        stretch: seen.iter().map(|p| stretch_of(p.x)).collect(),
        width: look.width,
        pole: None,
        baseline: look.baseline,
    };
    let mut plain = lines::fit(&samples, &start)?;
    let mut fit = plain.clone();
    for round in 0..3 {
        let noise = segment.noise / (samples.bin as f64).sqrt();
        // Where the plain lines leave nothing but noise there is no pole to be found.
        let clean = plain.residual < 1.03 * noise;
        fit = if clean { None } else { with_pole(&samples, &start, &plain) }.unwrap_or_else(|| plain.clone());
        if round == 2 {
            break;
        }
        let more = hidden(&samples, &fit, look);
        if more.is_empty() {
            break;
        }
        seen =
            fit.centres.iter().zip(&fit.heights).map(|(x, h)| Seen { x: *x, height: *h, width: fit.width }).collect();
        seen.extend(more);
        seen.retain(|p| {
            p.height > 0.0 && p.x > -0.5 * fit.width && p.x < segment.signal.len() as f64 + 0.5 * fit.width
        });
        seen.sort_by(|a, b| a.x.total_cmp(&b.x));
        let next = Start {
            centres: seen.iter().map(|p| p.x).collect(),
            heights: seen.iter().map(|p| p.height).collect(),
            stretch: seen.iter().map(|p| stretch_of(p.x)).collect(),
            width: fit.width,
            pole: None,
            baseline: fit.baseline.0,
        };
        let Some(better) = lines::fit(&samples, &next) else { break };
        start = next;
        plain = better;
    }
    Some(Fitted { apparent_width: plain.width, fit, stretch: start.stretch })
}

/// The fit with the detector's pole, if the data ask for it.
fn with_pole(samples: &Samples, start: &Start, plain: &LineFit) -> Option<LineFit> {
    let mut best: Option<LineFit> = None;
    for share in [0.15, 0.6] {
        let pole = share * plain.width;
        let trial = Start {
            centres: plain.centres.iter().map(|x| x - pole.min(plain.width)).collect(),
            heights: plain.heights.clone(),
            width: plain.width / (1.0 + share),
            pole: Some(pole),
            baseline: plain.baseline.0,
            stretch: start.stretch.clone(),
        };
        if let Some(fit) = lines::fit(samples, &trial) {
            if best.as_ref().is_none_or(|b| fit.sum_of_squares < b.sum_of_squares) {
                best = Some(fit);
            }
        }
    }
    let best = best?;
    let gain = (plain.sum_of_squares - best.sum_of_squares) / (best.sum_of_squares / best.dof);
    (gain > POLE_CHI_SQUARE).then_some(best)
}

/// Lines that the first look missed: what stands out of the residuals.
fn hidden(samples: &Samples, fit: &LineFit, look: &Look) -> Vec<Seen> {
    let bin = samples.bin as f64;
    let half = (fit.width / bin / 6.0).round().max(0.0) as usize;
    let smoothed = smoothing::moving_mean(&fit.residuals, half);
    let top = look.peaks.iter().map(|p| p.height).fold(0.0, f64::max);
    let threshold = (6.0 * fit.residual / (2.0 * half as f64 + 1.0).sqrt()).max(0.01 * top);
    let options = crate::numerics::peaks::Options {
        min_height: Some(threshold),
        min_prominence: Some(threshold),
        min_distance: (fit.width / bin).ceil().max(1.0) as usize,
    };
    let found = crate::numerics::peaks::find(&smoothed, &options);
    // A misfit top leaves residuals on the line itself: only what stands clear of every line is new.
    let clear = |x: f64| fit.centres.iter().all(|c| (c - x).abs() > 0.7 * fit.width);
    found
        .into_iter()
        .map(|p| Seen { x: p.index as f64 * bin + (bin - 1.0) / 2.0, height: p.height, width: fit.width })
        .filter(|p| clear(p.x))
        .take(12)
        .collect()
}

/// Share of all fitted height, strays included, that stands on the comb.
fn comb_share(classes: &[Class], comb: &Comb, good: &[usize], fit: &LineFit) -> f64 {
    let all: f64 = good.iter().map(|i| fit.heights[*i]).sum();
    let on: f64 = classes
        .iter()
        .zip(&comb.teeth)
        .filter(|(_, tooth)| tooth.is_some())
        .flat_map(|(class, _)| &class.members)
        .map(|m| fit.heights[m.0])
        .sum();
    if all > 0.0 { on / all } else { 0.0 }
}

/// Median standard uncertainty of the centres, orders.
fn typical_u(fit: &LineFit, peaks: &[usize], slope: impl Fn(f64) -> f64) -> f64 {
    let mut all: Vec<f64> =
        peaks.iter().map(|i| fit.centre_covariance[(*i, *i)].max(0.0).sqrt() * slope(fit.centres[*i])).collect();
    all.sort_by(f64::total_cmp);
    all.get(all.len() / 2).copied().unwrap_or(0.0)
}

/// Scan detuning against sample position, as far as it is known.
enum Map {
    Smooth(Orders),
    Fitted(AxisFit),
}

impl Map {
    fn detuning(&self, x: f64, half: f64, fsr: f64) -> f64 {
        match self {
            Self::Smooth(orders) => orders.phase(x) * fsr,
            Self::Fitted(axis) => axis.at((x - half) / half),
        }
    }

    /// Root mean square misfit of the map, Hz; 0 where it was not fitted.
    fn rms(&self) -> f64 {
        match self {
            Self::Smooth(_) => 0.0,
            Self::Fitted(axis) => axis.rms(),
        }
    }

    /// Hz a sample.
    fn slope(&self, x: f64, half: f64, fsr: f64) -> f64 {
        match self {
            Self::Smooth(orders) => fsr / orders.local_period(x),
            Self::Fitted(axis) => axis.slope((x - half) / half) / half,
        }
    }
}

/// From fitted lines to classes, comb, axis and the result.
fn assemble(
    segment: &Segment,
    orders: &Orders,
    fitted: &Fitted,
    settings: &Settings,
    result: &mut Measurement,
) -> Result<(), Refusal> {
    let fit = &fitted.fit;
    let fsr = settings.free_spectral_range;
    let length = segment.signal.len() as f64;
    let u_of = |x: f64| (x - length / 2.0) / (length / 2.0);
    let good: Vec<usize> = (0..fit.centres.len())
        .filter(|i| {
            let (x, h) = (fit.centres[*i], fit.heights[*i]);
            h > LEAST_HEIGHT_SIGMA * fit.u_heights[*i] && x > 0.0 && x < length
        })
        .collect();
    let covariance_of = |peaks: &[usize], slope: &dyn Fn(f64) -> f64| {
        DMatrix::from_fn(peaks.len(), peaks.len(), |a, b| {
            let (i, j) = (peaks[a], peaks[b]);
            fit.centre_covariance[(i, j)] * slope(fit.centres[i]) * slope(fit.centres[j])
        })
    };
    let half = length / 2.0;
    let apparent = fitted.apparent_width / orders.period;
    let mut map = Map::Smooth(*orders);
    let mut outcome = None;
    let mut best_share = 0.0;
    // Each round sharpens the axis: the smooth order map, then free offsets, then the comb.
    for round in 0..4 {
        let u_phase = typical_u(fit, &good, |x| map.slope(x, half, fsr) / fsr);
        let tolerance = match round {
            0 => (0.6 * apparent).clamp(0.015, 0.06),
            _ => (0.4 * apparent).clamp(0.006, 0.04),
        }
        .hypot((4.0 * u_phase).min(0.02))
        .hypot((3.0 * map.rms() / fsr).min(0.02));
        let phased: Vec<Phased> = good
            .iter()
            .map(|i| Phased {
                peak: *i,
                phase: map.detuning(fit.centres[*i], half, fsr) / fsr,
                height: fit.heights[*i],
            })
            .collect();
        let range = (map.detuning(0.0, half, fsr) / fsr, map.detuning(length, half, fsr) / fsr);
        let classes = comb::classes(&phased, tolerance, range);
        // What shows in one order but should in several does not repeat: it is left out, and said.
        let (kept, stray): (Vec<Class>, Vec<Class>) =
            classes.into_iter().partition(|c| c.members.len() >= 2 || c.expected < 2);
        let slope = |x: f64| map.slope(x, half, fsr);
        if round == 0 {
            let alone: Vec<Option<(i32, i32)>> = vec![Some((0, 0)); kept.len()];
            let placed = place(&kept, &alone, fit, &u_of);
            let peaks: Vec<usize> = placed.iter().map(|p| p.peak).collect();
            let free = axis::choose(&placed, &covariance_of(&peaks, &slope), fsr, Offsets::Classes(kept.len()));
            if let Some(choice) = free {
                map = Map::Fitted(choice.fit);
            }
            continue;
        }
        // A tooth may be off by a part of the line's width and by what noise did to it.
        let reach = (0.35 * apparent).clamp(0.006, 0.04).hypot((4.0 * u_phase).min(0.03));
        let found = comb::find(&kept, reach, fsr, settings.nominal_spacing);
        let Ok(comb) = &found else {
            if outcome.is_some() {
                break;
            }
            // Without a comb the free axis stands.
            let placed = place(&kept, &vec![Some((0, 0)); kept.len()], fit, &u_of);
            let peaks: Vec<usize> = placed.iter().map(|p| p.peak).collect();
            let free = axis::choose(&placed, &covariance_of(&peaks, &slope), fsr, Offsets::Classes(kept.len()));
            outcome = Some((kept, stray.len(), found, free.map(|choice| (placed, choice))));
            break;
        };
        // A sharper axis must not lose light from the comb: if it does, what was found before stands.
        let share = comb_share(&kept, comb, &good, fit);
        if share < best_share - 0.02 {
            break;
        }
        best_share = share;
        let placed = place(&kept, &comb.teeth, fit, &u_of);
        let peaks: Vec<usize> = placed.iter().map(|p| p.peak).collect();
        let choice = axis::choose(&placed, &covariance_of(&peaks, &slope), fsr, Offsets::Comb);
        let next = choice.as_ref().map(|c| c.fit.clone());
        outcome = Some((kept, stray.len(), found, choice.map(|c| (placed, c))));
        match next {
            Some(axis) => map = Map::Fitted(axis),
            None => break,
        }
    }
    let (classes, n_stray, found, solved) = outcome.ok_or(Refusal::WeakScale)?;
    if n_stray > 0 {
        result.warnings.push(Warning::Stray { count: n_stray });
    }
    let Some((placed, choice)) = solved else {
        return Err(match found {
            Err(refusal @ (Refusal::Ambiguous { .. } | Refusal::NoComb { .. })) => refusal,
            _ => Refusal::WeakScale,
        });
    };
    if let Ok(comb) = &found {
        let share = comb_share(&classes, comb, &good, fit);
        let n_on = comb.teeth.iter().flatten().count();
        if share < LEAST_COMB_SHARE || classes.len() > 2 * n_on + 1 {
            return Err(Refusal::NoComb { share });
        }
    }
    let seen_orders: std::collections::BTreeSet<i32> =
        classes.iter().flat_map(|c| c.members.iter().map(|m| m.1)).collect();
    result.order_count = seen_orders.len() as u32;
    fill(segment, fitted, &classes, &found, &placed, &choice, settings, result);
    Ok(())
}

fn strongest_only(classes: &[Class]) -> Vec<Option<(i32, i32)>> {
    let strongest = classes
        .iter()
        .enumerate()
        .max_by(|a, b| {
            (a.1.members.len(), a.1.height)
                .partial_cmp(&(b.1.members.len(), b.1.height))
                .unwrap_or(std::cmp::Ordering::Equal)
        })
        .map(|(i, _)| i);
    (0..classes.len()).map(|i| (Some(i) == strongest).then_some((0, 0))).collect()
}

fn place(classes: &[Class], teeth: &[Option<(i32, i32)>], fit: &LineFit, u_of: &dyn Fn(f64) -> f64) -> Vec<Placed> {
    let mut placed = Vec::new();
    for (index, (class, tooth)) in classes.iter().zip(teeth).enumerate() {
        let Some((order, tooth)) = tooth else { continue };
        for (peak, own) in &class.members {
            // ν = own·FSR + class phase; class phase + order·FSR = tooth·Δν + const.
            placed.push(Placed {
                peak: *peak,
                u: u_of(fit.centres[*peak]),
                order: own - order,
                tooth: *tooth,
                class: index,
            });
        }
    }
    placed.sort_by(|a, b| a.u.total_cmp(&b.u));
    placed
}

#[allow(clippy::too_many_arguments)] // One call, from the function above; a struct would only rename the list.
fn fill(
    segment: &Segment,
    fitted: &Fitted,
    classes: &[Class],
    found: &Result<Comb, Refusal>,
    placed: &[Placed],
    choice: &Choice,
    settings: &Settings,
    result: &mut Measurement,
) {
    let fit = &fitted.fit;
    let fsr = settings.free_spectral_range;
    let length = segment.signal.len() as f64;
    let half = length / 2.0;
    let sign = if segment.rising { 1.0 } else { -1.0 };
    let axis = &choice.fit;
    let at = |x: f64| axis.at((x - half) / half);
    let slope = |x: f64| axis.slope((x - half) / half) / half;
    let reference = at(segment.reference);
    // One common width at the middle of the ramp, where the stretch is 1.
    let fwhm = fit.width * slope(half);
    result.finesse = Some(fsr / fwhm);
    result.finesse_apparent = Some(fsr / (fitted.apparent_width * slope(half)));
    match found {
        Ok(_) => result.mode_spacing = spacing_with_budget(choice, placed.len(), settings),
        Err(refusal) => result.no_spacing = Some(refusal.clone()),
    }
    let crossed =
        segment.crossed.as_ref().and_then(|signal| lines::heights_in(signal, &segment.usable, fit, &fitted.stretch));
    let mut modes: Vec<(f64, Mode)> = Vec::new();
    let mut off_axis: Vec<(f64, Mode)> = Vec::new();
    let teeth: Vec<Option<(i32, i32)>> = match found {
        Ok(comb) => comb.teeth.clone(),
        Err(Refusal::OneMode) => strongest_only(classes),
        // No comb could be told: every class is listed as a mode, none as off the comb.
        Err(_) => vec![Some((0, 0)); classes.len()],
    };
    for (class, tooth) in classes.iter().zip(&teeth) {
        let n = class.members.len() as f64;
        let mean = |value: &dyn Fn(usize) -> f64| class.members.iter().map(|m| value(m.0)).sum::<f64>() / n;
        let folded = |i: usize, own: i32| at(fit.centres[i]) - f64::from(own) * fsr;
        let frequency = class.members.iter().map(|(i, own)| folded(*i, *own)).sum::<f64>() / n;
        let u_frequency = (class
            .members
            .iter()
            .map(|(i, _)| fit.centre_covariance[(*i, *i)] * slope(fit.centres[*i]).powi(2))
            .sum::<f64>()
            / (n * n))
            .sqrt()
            * choice.birge;
        let peak_height = mean(&|i| fit.heights[i]);
        let mode = Mode {
            position: (sign * (frequency - reference)).rem_euclid(fsr),
            u_position: u_frequency,
            offset: 0.0,
            u_offset: 0.0,
            peak_height,
            u_peak_height: (class.members.iter().map(|m| fit.u_heights[m.0].powi(2)).sum::<f64>()).sqrt() / n,
            relative_height: 0.0,
            area: std::f64::consts::FRAC_PI_2 * peak_height * fwhm,
            fwhm,
            crossed_height: crossed.as_ref().map(|c| mean(&|i| c[i])),
        };
        match tooth {
            Some(_) => modes.push((mode.position, mode)),
            None => off_axis.push((mode.position, mode)),
        }
    }
    finish_modes(modes, off_axis, fsr, result);
    warn_of_result(fit, choice, classes, settings, segment, result);
    result.axis = Some(ScanAxis {
        start: segment.start,
        end: segment.end,
        coefficients: axis
            .coefficients
            .iter()
            .enumerate()
            .map(|(i, c)| if i == 0 { c - reference } else { *c })
            .collect(),
        rising: segment.rising,
        inverted: segment.inverted,
        baseline: fit.baseline.0,
    });
}

fn spacing_with_budget(choice: &Choice, n_peaks: usize, settings: &Settings) -> Option<Measured> {
    let spacing = choice.fit.spacing?;
    let scatter = choice.fit.u_spacing * choice.birge;
    // Residuals rule the scatter only where they exceed the noise; else the fit of the samples gave it, with many degrees.
    let dof =
        if choice.birge > 1.0 && choice.fit.dof > 0 { (choice.fit.dof as f64 + n_peaks as f64).max(1.0) } else { 1e3 };
    let direct = BudgetLine::direct;
    let mut budget = vec![direct("scatter", "scatter of the fitted peaks", Evaluation::TypeA, scatter, dof)];
    budget.push(direct(
        "axis-truncation",
        &format!("axis truncation: change with one term more than {}", choice.terms),
        Evaluation::TypeB,
        choice.truncation,
        f64::INFINITY,
    ));
    budget.push(BudgetLine {
        source_id: settings.fsr_source_id.clone(),
        line: "free spectral range".to_owned(),
        evaluation: Evaluation::TypeB,
        standard_uncertainty: settings.u_free_spectral_range * settings.free_spectral_range,
        dof: f64::INFINITY,
        sensitivity: spacing / settings.free_spectral_range,
        note: String::new(),
    });
    Some(Measured { value: spacing, budget })
}

/// Sorts modes from the first after the largest gap, sets offsets and relative heights.
fn finish_modes(mut modes: Vec<(f64, Mode)>, mut off_axis: Vec<(f64, Mode)>, fsr: f64, result: &mut Measurement) {
    modes.sort_by(|a, b| a.0.total_cmp(&b.0));
    let n = modes.len();
    let top = modes.iter().map(|m| m.1.peak_height).fold(0.0, f64::max);
    let gap_before = |i: usize| {
        let previous = if i == 0 { modes[n - 1].0 - fsr } else { modes[i - 1].0 };
        modes[i].0 - previous
    };
    let mut first = 0;
    for i in 1..n {
        // Gaps equal within a part in a million count as equal: the lowest ramp voltage wins.
        if gap_before(i) > gap_before(first) * (1.0 + 1e-6) {
            first = i;
        }
    }
    modes.rotate_left(first);
    let origin = modes.first().map(|m| (m.1.position, m.1.u_position));
    for (i, (position, mode)) in modes.iter_mut().chain(off_axis.iter_mut()).enumerate() {
        if let Some((from, u_from)) = origin {
            mode.offset = (*position - from).rem_euclid(fsr);
            mode.u_offset = if i == 0 && n > 0 { 0.0 } else { mode.u_position.hypot(u_from) };
        }
        mode.relative_height = if top > 0.0 { mode.peak_height / top } else { 0.0 };
    }
    // An off-axis peak just below the first mode reads as a small negative offset, not almost a whole order.
    let span = modes.last().map_or(0.0, |m| m.1.offset);
    for (_, mode) in &mut off_axis {
        if mode.offset > (fsr + span) / 2.0 {
            mode.offset -= fsr;
        }
    }
    off_axis.sort_by(|a, b| a.1.offset.total_cmp(&b.1.offset));
    result.modes = modes.into_iter().map(|m| m.1).collect();
    result.off_axis = off_axis.into_iter().map(|m| m.1).collect();
}

fn warn_of_result(
    fit: &LineFit,
    choice: &Choice,
    classes: &[Class],
    settings: &Settings,
    segment: &Segment,
    result: &mut Measurement,
) {
    if let (Some(spacing), Some(nominal)) = (&result.mode_spacing, settings.nominal_spacing) {
        if (spacing.value / (2.0 * nominal) - 1.0).abs() < 0.1 {
            result.warnings.push(Warning::TwiceNominal);
        }
    }
    if let Some(ratio) = result.off_axis.iter().map(|m| m.relative_height).max_by(f64::total_cmp) {
        result.warnings.push(Warning::OffAxis { count: result.off_axis.len(), ratio });
    }
    let noise = segment.noise / ((fit.width / 12.0).floor().max(1.0)).sqrt();
    let chi_square = if noise > 0.0 { (fit.residual / noise).powi(2) } else { 1.0 };
    if chi_square > 4.0 {
        result.warnings.push(Warning::Misfit { chi_square });
    }
    if result.order_count < 3 {
        result.warnings.push(Warning::FewOrders);
    }
    let rms = choice.fit.rms();
    if choice.fit.dof > 1 && choice.birge > 3.0 && rms > EVEN_ALLOWANCE {
        result.warnings.push(Warning::UnevenComb { rms });
    }
    let top = classes.iter().map(|c| c.height).fold(0.0, f64::max);
    let unequal = classes.iter().filter(|c| c.height > 0.5 * top && c.members.len() >= 3).any(|c| {
        let parity = |odd: i32| {
            let of: Vec<f64> =
                c.members.iter().filter(|m| m.1.rem_euclid(2) == odd).map(|m| fit.heights[m.0]).collect();
            of.iter().sum::<f64>() / of.len().max(1) as f64
        };
        let (even, odd) = (parity(0), parity(1));
        even.min(odd) < 0.6 * even.max(odd)
    });
    if unequal {
        result.warnings.push(Warning::UnequalOrders);
    }
}
