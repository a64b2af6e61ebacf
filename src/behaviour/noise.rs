//! Noise, mains ripple and the strongest tone of a tube's light, from lit and dark traces at two sample rates.
//! Must not look at samples: `light` measures each trace.
//! Main types: [`LightSet`], [`NoiseFound`]; main function: [`light_noise`].

use super::light::{LightMeasurement, LightTone};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Relative standard uncertainty of the response of detector and digitizer within their bandwidth (from memory).
const U_RESPONSE: f64 = 0.01;
/// Relative standard uncertainty of a digitizer's clock (from memory; seldom worse than 1e-4).
const U_CLOCK: f64 = 1e-4;
/// Density of the slow trace over that of the fast one, where both reach, above which the slow one folds noise: chance
/// alone stays under 2 for the 20 or more degrees of freedom that the fast one has there.
const FOLDED: f64 = 2.5;
/// Beats of axial modes lie below this, Hz (common practice).
const HIGHEST_BEAT: f64 = 100e3;

/// The traces of one noise measurement.
#[derive(Debug, Clone, Copy)]
pub struct LightSet<'a> {
    /// Long and slow, light let through.
    pub slow: &'a LightMeasurement,
    /// The same with the beam blocked.
    pub slow_dark: &'a LightMeasurement,
    /// Short and fast, light let through.
    pub fast: &'a LightMeasurement,
    /// The same with the beam blocked.
    pub fast_dark: &'a LightMeasurement,
    /// Fast and lit once more, some time later.
    pub fast_later: Option<&'a LightMeasurement>,
}

/// What they say together.
#[derive(Debug, Clone, PartialEq)]
pub struct NoiseFound {
    /// Noise over mean level; none where the slow trace folds noise from above its band.
    pub noise_rms: Option<Measured>,
    /// Dark noise over mean level, in the same band: taken off.
    pub dark_rms: f64,
    /// Mains harmonics over mean level.
    pub line_ripple: Measured,
    /// The ripple that could hide in the noise, over mean level.
    pub ripple_floor: f64,
    /// (mains frequency Hz, it stood clear of the floor, harmonics summed).
    pub mains: (f64, bool, u32),
    /// Strongest tone.
    pub tone: Option<ToneFound>,
}

/// The strongest tone.
#[derive(Debug, Clone, PartialEq)]
pub struct ToneFound {
    /// rms over mean level.
    pub level: Measured,
    /// Hz.
    pub frequency: Measured,
    /// What it is, as far as can be told.
    pub origin: ToneOrigin,
}

/// Where a tone comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ToneOrigin {
    /// It moved between two traces and lies among the beats of modes: no fault.
    ModeBeat,
    /// It moved, above the beats of modes: with the discharge.
    Moving,
    /// It stayed: supply or discharge.
    Fixed,
    /// Seen once only.
    Unknown,
}

/// Puts the traces together.
///
/// * `bandwidth`: where the light detector's response has fallen by 3 dB, Hz.
/// * `highest`: end of the band, Hz.
///
/// Errors: why nothing can be said, as a fragment.
///
/// Formulas: noise² = Σ over both bands of (V_lit − V_dark)/(mean_lit − mean_dark)²; ripple likewise from the slow
/// traces. The detector's pole takes between nothing and (1 − (b/f)·arctan(f/b)) of the mean square, f the end of the band
/// and b the bandwidth (white noise); half of it is put back, and a rectangular distribution covers the rest.
pub fn light_noise(set: &LightSet<'_>, bandwidth: f64, highest: f64) -> Result<NoiseFound, String> {
    let slow_level = level(set.slow, set.slow_dark)?;
    let fast_level = level(set.fast, set.fast_dark)?;
    let Some((lit, dark)) = set.slow.mains.zip(set.slow_dark.mains) else {
        return Err("the slow traces are too short to show the mains".to_owned());
    };
    let ripple_power = (lit.power - dark.power) / slow_level.powi(2);
    let u_ripple = lit.u_power.hypot(dark.u_power) / slow_level.powi(2);
    let line_ripple = root(ripple_power, u_ripple, "noise under the mains lines", f64::INFINITY);
    Ok(NoiseFound {
        noise_rms: (!folded(set)).then(|| noise_rms(set, (slow_level, fast_level), bandwidth, highest)),
        dark_rms: (set.slow_dark.noise.0 / slow_level.powi(2) + set.fast_dark.noise.0 / fast_level.powi(2)).sqrt(),
        line_ripple: with_response(line_ripple),
        ripple_floor: u_ripple.sqrt(),
        mains: (lit.frequency, lit.clear, lit.n_harmonics),
        tone: tone(set, slow_level, fast_level),
    })
}

/// Mean level less the dark level, V.
fn level(lit: &LightMeasurement, dark: &LightMeasurement) -> Result<f64, String> {
    let level = lit.mean - dark.mean;
    if level > 3.0 * dark.noise.0.max(0.0).sqrt() && level > 0.0 {
        return Ok(level);
    }
    Err(format!(
        "the light detector reads {:.4} V with the beam open and {:.4} V with it blocked: no light in it, or the beam \
         was not blocked",
        lit.mean, dark.mean
    ))
}

/// √power with its uncertainty; by √(P + u) − √P, which holds down to no power at all.
fn root(power: f64, u_power: f64, words: &str, dof: f64) -> Measured {
    let power = power.max(0.0);
    let u = (power + u_power).sqrt() - power.sqrt();
    Measured::with_line(power.sqrt(), BudgetLine::direct("light noise", words, Evaluation::TypeA, u, dof))
}

fn with_response(mut measured: Measured) -> Measured {
    let words = "response of detector and digitizer";
    let mut line = BudgetLine::direct("light detector", words, Evaluation::TypeB, U_RESPONSE, f64::INFINITY);
    line.sensitivity = measured.value;
    measured.budget.push(line);
    measured
}

fn folded(set: &LightSet<'_>) -> bool {
    let over_dark = |lit: &LightMeasurement, dark: &LightMeasurement| {
        let level = lit.mean - dark.mean;
        Some((lit.overlap?, dark.overlap? / level.powi(2), level.powi(2)))
    };
    let (Some(slow), Some(fast)) = (over_dark(set.slow, set.slow_dark), over_dark(set.fast, set.fast_dark)) else {
        return false;
    };
    slow.0 / slow.2 > FOLDED * (fast.0 / fast.2).max(slow.1)
}

fn noise_rms(set: &LightSet<'_>, levels: (f64, f64), bandwidth: f64, highest: f64) -> Measured {
    let (mut power, mut variance, mut fourth) = (0.0, 0.0, 0.0);
    for (lit, dark, level) in [(set.slow, set.slow_dark, levels.0), (set.fast, set.fast_dark, levels.1)] {
        power += (lit.noise.0 - dark.noise.0) / level.powi(2);
        for (_, u, dof) in [lit.noise, dark.noise] {
            let share = (u / level.powi(2)).powi(2);
            variance += share;
            fourth += share * share / dof.max(1.0);
        }
    }
    let dof = if fourth > 0.0 { variance * variance / fourth } else { f64::INFINITY };
    let ratio = highest / bandwidth;
    let lost = 1.0 - ratio.atan() / ratio;
    let measured = root(power, variance.sqrt(), "spectra of lit and dark traces", dof);
    // Half of a mean square is a quarter of its root.
    let mut measured = with_response(measured.scaled(1.0 + lost / 4.0));
    let words = "light detector at the end of the band";
    let half_width = lost / 4.0;
    let u = half_width / 3f64.sqrt();
    let mut line = BudgetLine::direct("light detector bandwidth", words, Evaluation::TypeB, u, f64::INFINITY);
    line.sensitivity = measured.value;
    measured.budget.push(line);
    measured
}

/// The strongest tone of the lit traces that is not in the dark as well.
fn tone(set: &LightSet<'_>, slow_level: f64, fast_level: f64) -> Option<ToneFound> {
    let of = |lit: &LightMeasurement, dark: &LightMeasurement, level: f64| {
        let found = lit.tone?;
        let step = 1.0 / lit.duration;
        let in_dark = |dark: LightTone| (dark.frequency - found.frequency).abs() < 2.0 * step;
        let pickup = dark.tone.filter(|dark| in_dark(*dark) && dark.power > 0.25 * found.power);
        pickup.is_none().then_some((found, level, step))
    };
    let slow = of(set.slow, set.slow_dark, slow_level);
    let fast = of(set.fast, set.fast_dark, fast_level);
    let strength = |(found, level, _): &(LightTone, f64, f64)| found.power / level.powi(2);
    let is_fast = match (&slow, &fast) {
        (Some(slow), Some(fast)) => strength(fast) >= strength(slow),
        (slow, _) => slow.is_none(),
    };
    let (found, level, step) = if is_fast { fast? } else { slow? };
    let line = BudgetLine::direct(
        "light noise",
        "noise under the line",
        Evaluation::TypeA,
        (found.power + found.u_power).sqrt() / level - found.power.sqrt() / level,
        f64::INFINITY,
    );
    let mut clock = BudgetLine::direct("digitizer", "clock", Evaluation::TypeB, U_CLOCK, f64::INFINITY);
    clock.sensitivity = found.frequency;
    let words = "noise under the line";
    let own = BudgetLine::direct("light noise", words, Evaluation::TypeA, found.u_frequency, f64::INFINITY);
    let later = set.fast_later.and_then(|later| later.tone).filter(|_| is_fast);
    Some(ToneFound {
        level: with_response(Measured::with_line(found.power.sqrt() / level, line)),
        frequency: Measured { value: found.frequency, budget: vec![own, clock] },
        origin: later.map_or(ToneOrigin::Unknown, |later| origin(&found, &later, step)),
    })
}

/// A line moves if it went farther than one step of frequency and five times what the noise allows.
fn origin(before: &LightTone, later: &LightTone, step: f64) -> ToneOrigin {
    let moved = (later.frequency - before.frequency).abs();
    match moved > step.max(5.0 * before.u_frequency.hypot(later.u_frequency)) {
        false => ToneOrigin::Fixed,
        true if before.frequency.max(later.frequency) < HIGHEST_BEAT => ToneOrigin::ModeBeat,
        true => ToneOrigin::Moving,
    }
}
