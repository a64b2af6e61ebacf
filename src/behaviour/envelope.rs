//! The envelope of mode heights along the gain line: where it ends, how wide it is, how deep its central dip.
//! Must not know what line a tube should have: it describes the curve that was seen.
//! Main type: [`Envelope`]; main function: [`envelope`].

use super::counts::GainPoint;
use crate::numerics::linear;
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Bins across the line: as many as leave eight points in each, within these bounds.
const BINS: (usize, usize) = (16, 50);
/// Points that a bin must hold.
const LEAST_IN_BIN: usize = 2;
/// Share of the bins that must be filled.
const LEAST_FILLED: f64 = 0.9;
/// Heights between which a flank is fitted, over the greatest: below, peaks drown in noise or in the floor of what
/// counts as a mode; above, the curve turns over (design choice).
const FLANK: (f64, f64) = (0.05, 0.4);
/// Points that a flank must hold.
const LEAST_ON_FLANK: usize = 6;
/// Bins on either side of a half-height crossing through which a parabola is laid.
const ABOUT_HALF: usize = 3;
/// A dip of this many standard uncertainties or fewer is none.
const SIGNIFICANT: f64 = 3.0;

/// What the envelope shows; the frequency scale's own uncertainty is not in it.
#[derive(Debug, Clone, PartialEq)]
pub struct Envelope {
    /// Distance of the two extrapolated zeros, Hz.
    pub span: Measured,
    /// Distance of the outermost crossings of half the greatest height, Hz.
    pub fwhm: Measured,
    /// 1 − central minimum over the mean of the two flanking maxima; 0 where none is significant.
    pub dip: Measured,
    /// Bins filled, of how many.
    pub filled: (usize, usize),
}

#[derive(Debug, Clone, Copy)]
struct Bin {
    detuning: f64,
    height: f64,
    u_height: f64,
}

/// Describes the envelope.
///
/// * `points`: of whole walk cycles.
///
/// Errors: why it cannot be described, as a fragment.
///
/// # Method
/// 1. Mean height in even bins across the line, with the scatter within each. Nine in ten bins must be filled.
/// 2. Each flank, from 5 to 40 % of the greatest height: least squares of height against detuning by a parabola; its
///    outer zero. What a cubic gives instead is the doubt about the shape.
/// 3. Half height: a parabola through the bins about the outermost crossing.
/// 4. Dip: greatest bins on either side of the middle and the least bin between them. The greatest of noisy bins lies
///    high and the least lies low by about two of their uncertainties: half of that doubt is in the budget.
pub fn envelope(points: &[GainPoint]) -> Result<Envelope, String> {
    let usable =
        |p: &&GainPoint| p.detuning.is_finite() && p.height.is_finite() && p.u_height.is_finite() && p.height > 0.0;
    let mut sorted: Vec<GainPoint> = points.iter().filter(usable).copied().collect();
    sorted.sort_by(|a, b| a.detuning.total_cmp(&b.detuning));
    let (bins, count) = binned(&sorted)?;
    let top = bins.iter().map(|bin| bin.height).fold(0.0, f64::max);
    let (low, u_low, shape_low, dof_low) = zero(&sorted, &bins, top, -1.0)?;
    let (high, u_high, shape_high, dof_high) = zero(&sorted, &bins, top, 1.0)?;
    let scatter = |u: f64, dof: f64| BudgetLine::direct("scatter", "scatter of heights", Evaluation::TypeA, u, dof);
    let shape =
        |u: f64| BudgetLine::direct("envelope shape", "shape of the curve", Evaluation::TypeB, u, f64::INFINITY);
    let span = Measured {
        value: high - low,
        budget: vec![scatter(u_low.hypot(u_high), dof_low.min(dof_high)), shape(shape_low.hypot(shape_high))],
    };
    let half = 0.5 * top;
    let (left, right) = (crossing(&bins, half, false)?, crossing(&bins, half, true)?);
    // The top's own doubt moves both crossings: half of it, by the slope.
    let u_top = bins.iter().filter(|bin| bin.height == top).map(|bin| bin.u_height).fold(0.0, f64::max);
    let width = (sorted.last().map_or(0.0, |p| p.detuning) - sorted.first().map_or(0.0, |p| p.detuning)) / count as f64;
    let by_bins = "width of the bins at both crossings";
    // Half a bin either way, rectangular, at each crossing.
    let bins_line = BudgetLine::direct("envelope bins", by_bins, Evaluation::TypeB, width / 6f64.sqrt(), f64::INFINITY);
    let fwhm = Measured {
        value: right.0 - left.0,
        budget: vec![scatter(left.1.hypot(right.1), f64::INFINITY), shape(0.5 * u_top * (left.2 + right.2)), bins_line],
    };
    Ok(Envelope { span, fwhm, dip: dip(&bins, &sorted), filled: (bins.len(), count) })
}

/// Filled bins in order, and how many there could be.
fn binned(sorted: &[GainPoint]) -> Result<(Vec<Bin>, usize), String> {
    let too_few = format!("{} points along the gain line are too few", sorted.len());
    let (Some(first), Some(last)) = (sorted.first(), sorted.last()) else { return Err(too_few) };
    let count = (sorted.len() / 8).clamp(BINS.0, BINS.1);
    let width = (last.detuning - first.detuning) / count as f64;
    if sorted.len() < LEAST_IN_BIN * BINS.0 || width <= 0.0 {
        return Err(too_few);
    }
    let place = |p: &GainPoint| (((p.detuning - first.detuning) / width) as usize).min(count - 1);
    let bins: Vec<Bin> = sorted.chunk_by(|a, b| place(a) == place(b)).filter_map(bin).collect();
    if (bins.len() as f64) < LEAST_FILLED * count as f64 {
        return Err(format!(
            "phase coverage is thin: {} of {count} places under the gain line hold {LEAST_IN_BIN} modes or more",
            bins.len()
        ));
    }
    Ok((bins, count))
}

fn bin(points: &[GainPoint]) -> Option<Bin> {
    let n = points.len() as f64;
    if points.len() < LEAST_IN_BIN {
        return None;
    }
    let mean = |of: fn(&GainPoint) -> f64| points.iter().map(of).sum::<f64>() / n;
    let (detuning, height) = (mean(|p| p.detuning), mean(|p| p.height));
    // From the stated uncertainties: the scatter within a bin holds the slope as well.
    let stated = points.iter().map(|p| p.u_height.powi(2)).sum::<f64>().sqrt() / n;
    Some(Bin { detuning, height, u_height: stated })
}

/// Outer zero of one flank: (Hz, its standard uncertainty from scatter, from the shape, degrees of freedom).
fn zero(sorted: &[GainPoint], bins: &[Bin], top: f64, side: f64) -> Result<(f64, f64, f64, f64), String> {
    let why =
        || format!("the {} flank of the envelope could not be extrapolated", if side < 0.0 { "low" } else { "high" });
    let outward: Vec<&Bin> = if side < 0.0 { bins.iter().collect() } else { bins.iter().rev().collect() };
    let first = |level: f64| outward.iter().position(|bin| bin.height >= level * top);
    let (outermost, innermost) = first(FLANK.0).zip(first(FLANK.1)).ok_or_else(why)?;
    // Where the outermost bin is high enough itself, all of its points are.
    let edge = if side < 0.0 { sorted.first() } else { sorted.last() };
    let edge = edge.filter(|_| outermost == 0).map(|point| side * point.detuning);
    let outer = edge.unwrap_or(side * outward[outermost].detuning);
    let inner = side * outward[innermost].detuning;
    // Chosen by place, not by height: else only those that chance made high would count near the floor.
    let on_flank = |p: &&GainPoint| (inner..=outer).contains(&(side * p.detuning));
    let flank: Vec<&GainPoint> = sorted.iter().filter(on_flank).collect();
    let scale = outer - inner;
    if flank.len() < LEAST_ON_FLANK || scale <= 0.0 {
        return Err(why());
    }
    let fit = |order: usize| {
        let x = |p: &GainPoint| (side * p.detuning - outer) / scale;
        let design: Vec<f64> = flank.iter().flat_map(|p| (0..=order as i32).map(move |k| x(p).powi(k))).collect();
        let rhs: Vec<f64> = flank.iter().map(|p| p.height).collect();
        let fit = linear::weighted(&design, &rhs, &vec![1.0; rhs.len()]).ok()?;
        let root = root(&fit.coefficients)?;
        let n = order + 1;
        let powers: Vec<f64> = (0..n).map(|k| root.powi(k as i32)).collect();
        let slope: f64 =
            (1..n).map(|k| k as f64 * fit.coefficients.get(k).unwrap_or(&0.0) * root.powi(k as i32 - 1)).sum();
        let mut variance = 0.0;
        for (i, a) in powers.iter().enumerate() {
            for (j, b) in powers.iter().enumerate() {
                variance += a * b * fit.covariance.get(i * n + j)?;
            }
        }
        let u = (variance * fit.reduced_chi_square()?).sqrt() / slope.abs();
        u.is_finite().then_some((root, u, fit.degrees_of_freedom as f64))
    };
    let (parabola, u, dof) = fit(2).ok_or_else(why)?;
    // A cubic that has no zero there says that nothing is known to better than the part extrapolated over.
    let shape = fit(3).map_or(parabola.abs(), |(cubic, ..)| (cubic - parabola).abs());
    Ok((side * (outer + parabola * scale), u * scale, shape * scale, dof))
}

/// The first zero outward of a falling curve of scaled detuning: by Newton's steps from its outer end.
fn root(coefficients: &[f64]) -> Option<f64> {
    let value = |x: f64| coefficients.iter().rev().fold(0.0, |sum, c| sum * x + c);
    let slope =
        |x: f64| coefficients.iter().enumerate().skip(1).map(|(k, c)| k as f64 * c * x.powi(k as i32 - 1)).sum::<f64>();
    let mut x = 0.0;
    for _ in 0..20 {
        let down = slope(x);
        if down >= 0.0 {
            return None;
        }
        x -= value(x) / down;
    }
    // Farther out than the flank is long it is a guess.
    ((-0.5..=1.0).contains(&x) && value(x).abs() < 1e-9).then_some(x)
}

/// Outermost crossing of a level: (Hz, its standard uncertainty Hz, Hz per unit of height).
fn crossing(bins: &[Bin], level: f64, from_above: bool) -> Result<(f64, f64, f64), String> {
    let above = |bin: &Bin| bin.height >= level;
    let at = if from_above { bins.iter().rposition(above) } else { bins.iter().position(above) };
    let at = at.ok_or("the envelope does not cross half its height")?;
    let (first, end) = (at.saturating_sub(ABOUT_HALF), (at + ABOUT_HALF + 1).min(bins.len()));
    let near = &bins[first..end];
    let scale = (near.last().map_or(0.0, |bin| bin.detuning) - near[0].detuning).max(1.0);
    let x = |bin: &Bin| (bin.detuning - bins[at].detuning) / scale;
    let design: Vec<f64> = near.iter().flat_map(|bin| [1.0, x(bin), x(bin).powi(2)]).collect();
    let rhs: Vec<f64> = near.iter().map(|bin| bin.height - level).collect();
    let weights: Vec<f64> = near.iter().map(|bin| 1.0 / bin.u_height.max(1e-6).powi(2)).collect();
    let none = "the envelope's half height could not be found";
    let fit = linear::weighted(&design, &rhs, &weights).map_err(|_| none)?;
    let [a, b, c] = fit.coefficients[..] else { return Err(none.to_owned()) };
    // The root nearest to the bin that crosses.
    let discriminant = b * b - 4.0 * a * c;
    let root =
        if discriminant >= 0.0 && b != 0.0 { -2.0 * a / (b + b.signum() * discriminant.sqrt()) } else { f64::NAN };
    let slope = (b + 2.0 * c * root).abs();
    if !(root.abs() <= 1.0 && slope > 0.0) {
        return Err(none.to_owned());
    }
    let variance =
        fit.covariance.first().copied().unwrap_or(f64::NAN) * fit.reduced_chi_square().unwrap_or(1.0).max(1.0);
    Ok((bins[at].detuning + root * scale, scale * variance.sqrt() / slope, scale / slope))
}

fn dip(bins: &[Bin], sorted: &[GainPoint]) -> Measured {
    let middle = sorted.first().zip(sorted.last()).map_or(0.0, |(a, b)| 0.5 * (a.detuning + b.detuning));
    let best = |side: f64| {
        let on_side = bins.iter().enumerate().filter(|(_, bin)| side * (bin.detuning - middle) > 0.0);
        on_side.max_by(|a, b| a.1.height.total_cmp(&b.1.height)).map(|(index, bin)| (index, *bin))
    };
    let none = |u: f64| {
        let line = BudgetLine::direct("scatter", "scatter of heights", Evaluation::TypeA, u, f64::INFINITY);
        Measured::with_line(0.0, line)
    };
    let (Some((left, low)), Some((right, high))) = (best(-1.0), best(1.0)) else { return none(1.0) };
    let between = bins.get(left + 1..right).unwrap_or(&[]);
    let Some(least) = between.iter().min_by(|a, b| a.height.total_cmp(&b.height)) else { return none(low.u_height) };
    let flanks = 0.5 * (low.height + high.height);
    let depth = 1.0 - least.height / flanks;
    let scatter = least.u_height.hypot(0.5 * low.u_height.hypot(high.u_height)) / flanks;
    // Noise of a bin as its neighbours show it: what the stated uncertainties leave out (competition, alignment).
    let rough = roughness(between) / flanks;
    let chosen = scatter.max(rough);
    let a = BudgetLine::direct("scatter", "scatter of heights", Evaluation::TypeA, chosen, f64::INFINITY);
    let words = "greatest and least of many bins";
    let b = BudgetLine::direct("envelope bins", words, Evaluation::TypeB, chosen, f64::INFINITY);
    let found = Measured { value: depth, budget: vec![a, b] };
    // What was not seen may hide as deep as what was found and its uncertainty: that is the expanded uncertainty then.
    if depth > SIGNIFICANT * found.u() { found } else { none(0.5 * depth.max(0.0) + found.u()) }
}

/// Standard deviation of a bin about the line through its neighbours.
fn roughness(bins: &[Bin]) -> f64 {
    let off = bins.windows(3).map(|w| (w[1].height - 0.5 * (w[0].height + w[2].height)).powi(2) / 1.5);
    let n = bins.len().saturating_sub(2).max(1) as f64;
    (off.sum::<f64>() / n).sqrt()
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::behaviour::synthetic::Noise;

    /// Points of a curve over ± 0.7 GHz, evenly placed, with noise.
    fn points(n: usize, u: f64, curve: impl Fn(f64) -> f64) -> Vec<GainPoint> {
        let mut noise = Noise(n as u64);
        let place = |i: usize| -0.7e9 + 1.4e9 * ((i * 7919 % n) as f64 + 0.5) / n as f64;
        let point =
            |i| GainPoint { detuning: place(i), height: curve(place(i) / 0.7e9) + u * noise.normal(), u_height: u };
        (0..n).map(point).filter(|p| p.height > 0.02).collect()
    }

    #[test]
    fn a_parabola_has_its_span_width_and_no_dip() {
        let found = envelope(&points(800, 0.005, |x| 1.0 - x * x)).unwrap();
        // Zeros at ± 0.7 GHz, half height at ± 0.7/√2.
        assert!((found.span.value - 1.4e9).abs() < 3.0 * found.span.u() && found.span.u() < 5e6, "{found:?}");
        let fwhm = 1.4e9 / 2f64.sqrt();
        assert!((found.fwhm.value - fwhm).abs() < 3.0 * found.fwhm.u() && found.fwhm.u() < 15e6, "{found:?}");
        assert_eq!(found.dip.value, 0.0);
        assert!(found.dip.u() > 0.0);
    }

    #[test]
    fn a_dip_has_its_depth() {
        // 1 − x² less a narrow dip: maxima of 0.93 at ± 0.26, middle 0.8 (by hand: 0.2·e^(−(x/0.15)²)).
        let curve = |x: f64| 1.0 - x * x - 0.2 * (-(x / 0.15) * (x / 0.15)).exp();
        let top = (0..1000).map(|i| curve(f64::from(i) / 1000.0)).fold(0.0, f64::max);
        let found = envelope(&points(1600, 0.004, curve)).unwrap();
        let depth = 1.0 - 0.8 / top;
        assert!(
            (found.dip.value - depth).abs() < 3.0 * found.dip.u() + 0.01,
            "a bin is 28 MHz wide: {found:?} {depth}"
        );
    }

    #[test]
    fn a_walking_comb_shows_the_line_it_walks_under() {
        use crate::behaviour::{gain_points, synthetic::Synthetic};
        for tube in [Synthetic::quad(2), Synthetic::twin(2)] {
            let points = gain_points(&tube.glimpses(300.0, 700.0, 0.5), tube.spacing);
            let found = envelope(&points).unwrap();
            // The made line is 1 − x² over its half range; a mode's place is known to 0.7 MHz.
            let off = found.span.value - 2.0 * tube.half_range;
            assert!(off.abs() < 3.0 * found.span.u() + 3e6, "{found:?} {off}");
        }
    }

    #[test]
    fn thin_coverage_is_refused() {
        let thin: Vec<GainPoint> = points(800, 0.005, |x| 1.0 - x * x)
            .into_iter()
            .filter(|p| (p.detuning / 0.1e9).rem_euclid(1.0) < 0.5)
            .collect();
        assert!(envelope(&thin).unwrap_err().contains("thin"));
        assert!(envelope(&[]).unwrap_err().contains("too few"));
        let flat = points(800, 0.001, |_| 1.0);
        assert!(envelope(&flat).is_err(), "no flank");
    }
}
