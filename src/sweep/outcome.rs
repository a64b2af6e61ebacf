//! From what the lines are to the result: modes, off-axis light, spacing with its budget, warnings, scan axis.
//! Must not decide which line is which.
//! Main entry: [`fill`].

use super::{
    Measurement, Mode, Place, Refusal, ScanAxis, Settings, Warning,
    assign::{Assigned, strongest_only},
    axis::{AxisFit, Choice},
    comb::Class,
    fitted::Fitted,
    lines::{self, LineFit},
    segment::Segment,
};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Allowance for departures of the comb from even spacing, Hz (`measurement.md` §1).
const EVEN_ALLOWANCE: f64 = 100e3;
/// Degrees of freedom of a scatter taken from thousands of samples: as good as infinite, and finite in JSON.
const DOF_OF_SAMPLES: f64 = 1e3;

/// Heights in the two photodiodes apart, with their standard uncertainties, V.
struct Apart {
    main: (Vec<f64>, Vec<f64>),
    crossed: (Vec<f64>, Vec<f64>),
}

/// Gaps that differ by less than this many standard uncertainties of a place are equal.
const EQUAL_SIGMA: f64 = 4.0;

/// One ramp with its axis.
struct Scale<'a> {
    segment: &'a Segment,
    fit: &'a LineFit,
    axis: &'a AxisFit,
    half: f64,
    fsr: f64,
    birge: f64,
    /// +1 on a rising ramp, −1 on a falling one: frequencies ascend with ramp voltage.
    sign: f64,
    /// Detuning at the reference voltage, Hz.
    reference: f64,
}

impl Scale<'_> {
    fn at(&self, x: f64) -> f64 {
        self.axis.at((x - self.half) / self.half)
    }

    /// Hz a sample.
    fn slope(&self, x: f64) -> f64 {
        self.axis.slope((x - self.half) / self.half) / self.half
    }

    /// One class as a mode; offsets and relative height are set later.
    fn mode(&self, class: &Class, fwhm: f64, apart: Option<&Apart>) -> Mode {
        let n = class.members.len() as f64;
        let mean = |value: &dyn Fn(usize) -> f64| class.members.iter().map(|m| value(m.0)).sum::<f64>() / n;
        let folded = |(i, own): &(usize, i32)| self.at(self.fit.centres[*i]) - f64::from(*own) * self.fsr;
        let frequency = class.members.iter().map(folded).sum::<f64>() / n;
        let variance = |i: usize| self.fit.centre_covariance[(i, i)].max(0.0);
        let u_of = |i: usize| variance(i) * self.slope(self.fit.centres[i]).powi(2);
        let all = mean(&|i| self.fit.heights[i]);
        let mean_u = |u: &[f64]| (mean(&|i| u[i].powi(2)) / n).sqrt();
        let (peak_height, u_peak_height) = match apart {
            Some(apart) => (mean(&|i| apart.main.0[i]), mean_u(&apart.main.1)),
            None => (all, mean_u(&self.fit.u_heights)),
        };
        let place = |(i, own): &(usize, i32)| Place {
            ramp: self.segment.ramp_at(self.fit.centres[*i]),
            order: if self.sign > 0.0 { *own } else { -own },
        };
        Mode {
            position: (self.sign * (frequency - self.reference)).rem_euclid(self.fsr),
            u_position: (mean(&u_of) / n).sqrt() * self.birge,
            peak_height,
            u_peak_height,
            area: std::f64::consts::FRAC_PI_2 * all * fwhm,
            fwhm,
            crossed_height: apart.map(|apart| mean(&|i| apart.crossed.0[i])),
            places: class.members.iter().map(place).collect(),
            u_ramp: mean(&variance).sqrt() * self.segment.ramp_slope.abs(),
            ..Mode::default()
        }
    }
}

/// Fills the result.
pub(super) fn fill(
    segment: &Segment,
    fitted: &Fitted,
    assigned: &Assigned,
    settings: &Settings,
    result: &mut Measurement,
) {
    let fit = &fitted.fit;
    let fsr = settings.free_spectral_range;
    let half = segment.signal.len() as f64 / 2.0;
    let sign = if segment.rising { 1.0 } else { -1.0 };
    let choice = &assigned.choice;
    let mut scale =
        Scale { segment, fit, axis: &choice.fit, half, fsr, birge: choice.birge_of_places, sign, reference: 0.0 };
    scale.reference = scale.at(segment.reference);
    // One common width at the middle of the ramp, where the stretch is 1.
    let fwhm = fit.width * scale.slope(half);
    result.order_count = assigned.n_orders as u32;
    result.finesse = Some(fsr / fwhm);
    result.finesse_apparent = Some(fsr / (fitted.apparent_width * scale.slope(half)));
    let teeth: Vec<Option<(i32, i32)>> = match &assigned.comb {
        Ok(comb) => comb.teeth.clone(),
        Err(Refusal::OneMode) => strongest_only(&assigned.classes),
        // No comb could be told: every class is listed as a mode, none as off the comb.
        Err(_) => vec![Some((0, 0)); assigned.classes.len()],
    };
    match &assigned.comb {
        Ok(_) => result.mode_spacing = spacing_with_budget(choice, settings),
        Err(refusal) => result.no_spacing = Some(refusal.clone()),
    }
    let heights = |signal: &[f64]| lines::heights_in(signal, &fitted.samples, fit, &fitted.stretch);
    let apart = segment
        .pair
        .as_ref()
        .and_then(|(main, crossed)| Some(Apart { main: heights(main)?, crossed: heights(crossed)? }));
    let (mut modes, mut off_axis) = (Vec::new(), Vec::new());
    for (class, tooth) in assigned.classes.iter().zip(&teeth) {
        let mode = scale.mode(class, fwhm, apart.as_ref());
        if tooth.is_some() { &mut modes } else { &mut off_axis }.push((mode.position, mode));
    }
    finish_modes(modes, off_axis, fsr, result);
    if let Some(spacing) = choice.fit.spacing {
        // What the axis leaves out grows along the comb.
        for mode in result.modes.iter_mut().chain(&mut result.off_axis) {
            mode.u_offset = mode.u_offset.hypot(choice.truncation * mode.offset / spacing);
        }
    }
    result.mode_count = result.modes.iter().filter(|mode| mode.relative_height >= settings.mode_floor).count();
    warn_of_result(fit, choice, &assigned.classes, settings, segment, result);
    result.ramp_ends = segment.has_ramp.then(|| (segment.ramp_at(0.0), segment.ramp_at(2.0 * half)));
    let shifted = |(i, c): (usize, &f64)| if i == 0 { c - scale.reference } else { *c };
    result.axis = Some(ScanAxis {
        start: segment.start,
        end: segment.end,
        coefficients: choice.fit.coefficients.iter().enumerate().map(shifted).collect(),
        rising: segment.rising,
        inverted: segment.inverted,
        baseline: fit.baseline.0,
    });
}

fn spacing_with_budget(choice: &Choice, settings: &Settings) -> Option<Measured> {
    let spacing = choice.fit.spacing?;
    let scatter = choice.fit.u_spacing * choice.birge;
    // Residuals rule the scatter only where they exceed the noise; else the fit of the samples gave it, with many degrees.
    let dof = if choice.birge > 1.0 && choice.fit.dof > 0 { choice.fit.dof as f64 } else { DOF_OF_SAMPLES };
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
    let top = modes.iter().map(|m| m.1.area).fold(0.0, f64::max);
    let gap_before = |i: usize| {
        let previous = if i == 0 { modes[n - 1].0 - fsr } else { modes[i - 1].0 };
        modes[i].0 - previous
    };
    let u_typical = modes.iter().map(|m| m.1.u_position).fold(0.0, f64::max);
    let mut first = 0;
    for i in 1..n {
        // Gaps equal within what the places are known to count as equal: the lowest ramp voltage wins.
        let known = EQUAL_SIGMA * u_typical + 1e-6 * fsr;
        if gap_before(i) > gap_before(first) + known {
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
        mode.relative_height = if top > 0.0 { mode.area / top } else { 0.0 };
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
    if let (Some(spacing), Some(nominal)) = (&result.mode_spacing, settings.nominal_spacing)
        && (spacing.value / (2.0 * nominal) - 1.0).abs() < 0.1
    {
        result.warnings.push(Warning::TwiceNominal);
    }
    if let Some(ratio) = result.off_axis.iter().map(|m| m.relative_height).max_by(f64::total_cmp) {
        result.warnings.push(Warning::OffAxis { count: result.off_axis.len(), ratio });
    }
    let chi_square = if segment.noise > 0.0 { (fit.residual / segment.noise).powi(2) } else { 1.0 };
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
