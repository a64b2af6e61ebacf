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
/// Heights between which the crossing of half height is fitted, over the greatest (design choice: wide enough for a
/// dozen points of a short dwell, narrow enough for a parabola).
const ABOUT_HALF: (f64, f64) = (0.3, 0.7);
/// Points that a crossing must hold: three for the parabola, and as many again to show their scatter.
const LEAST_AT_HALF: usize = 6;
/// Neighbouring points through which one parabola of the smoothed curve is laid: it brings the scatter of heights down
/// to two fifths, and is narrow against a dip even on a dwell of a hundred points (design choice).
const SMOOTHED_OVER: usize = 16;
/// Windows of the smoothed curve that the points must fill, or flat parts and flanks run into one another.
const LEAST_WINDOWS: usize = 4;
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

/// The smoothed curve at one place of the line.
#[derive(Debug, Clone, Copy)]
struct Place {
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
/// 1. Mean height in even bins across the line. Nine in ten bins must be filled.
/// 2. Each flank, from 5 to 40 % of the greatest height: least squares of height against detuning by a parabola; its
///    outer zero. What a cubic gives instead is the doubt about the shape.
/// 3. A smoothed curve: at every point a parabola by least squares through its 16 nearest in order of detuning.
///    Uncertainties come from the residuals: besides the noise of a height they hold what moves whole captures.
/// 4. Half height of the curve's greatest: on either side a parabola through the points about the outermost crossing.
///    What a straight line gives instead is the doubt about the shape.
/// 5. Dip: the greatest of the curve on either side of the middle and the least between them. What twice as wide a
///    smoothing gives instead is the doubt about the shape: a kink is rounded in proportion to the width.
///
/// The greatest of noisy heights lies high and the least lies low, by nothing where the curve is sharp and by about two
/// of their uncertainties where it is flat: half of that doubt is in the budgets.
pub fn envelope(points: &[GainPoint]) -> Result<Envelope, String> {
    let usable =
        |p: &&GainPoint| p.detuning.is_finite() && p.height.is_finite() && p.u_height.is_finite() && p.height > 0.0;
    let mut sorted: Vec<GainPoint> = points.iter().filter(usable).copied().collect();
    sorted.sort_by(|a, b| a.detuning.total_cmp(&b.detuning));
    let (bins, count) = binned(&sorted)?;
    let curve = smoothed(&sorted, SMOOTHED_OVER).ok_or("the curve of the envelope could not be smoothed")?;
    let top = *greatest(curve.iter()).ok_or("the envelope has no top")?;
    let (low, u_low, shape_low, dof_low) = zero(&sorted, &bins, top.height, -1.0)?;
    let (high, u_high, shape_high, dof_high) = zero(&sorted, &bins, top.height, 1.0)?;
    let scatter = |u: f64, dof: f64| BudgetLine::direct("scatter", "scatter of heights", Evaluation::TypeA, u, dof);
    let shape =
        |u: f64| BudgetLine::direct("envelope shape", "shape of the curve", Evaluation::TypeB, u, f64::INFINITY);
    let span = Measured {
        value: high - low,
        budget: vec![scatter(u_low.hypot(u_high), dof_low.min(dof_high)), shape(shape_low.hypot(shape_high))],
    };
    let fwhm = width_at_half(&sorted, &curve, &top).ok_or("the envelope's half height could not be found")?;
    let wider = smoothed(&sorted, 2 * SMOOTHED_OVER).unwrap_or_default();
    Ok(Envelope { span, fwhm, dip: dip(&curve, &wider), filled: (bins.len(), count) })
}

/// Filled bins in order as (mean detuning, mean height), and how many there could be.
fn binned(sorted: &[GainPoint]) -> Result<(Vec<(f64, f64)>, usize), String> {
    let least = LEAST_WINDOWS * SMOOTHED_OVER;
    let too_few = format!("{} points along the gain line are too few: at least {least} are needed", sorted.len());
    let (Some(first), Some(last)) = (sorted.first(), sorted.last()) else { return Err(too_few) };
    let count = (sorted.len() / 8).clamp(BINS.0, BINS.1);
    let width = (last.detuning - first.detuning) / count as f64;
    if sorted.len() < least || width <= 0.0 {
        return Err(too_few);
    }
    let place = |p: &GainPoint| (((p.detuning - first.detuning) / width) as usize).min(count - 1);
    let bins: Vec<(f64, f64)> = sorted.chunk_by(|a, b| place(a) == place(b)).filter_map(bin).collect();
    if (bins.len() as f64) < LEAST_FILLED * count as f64 {
        return Err(format!(
            "phase coverage is thin: {} of {count} places under the gain line hold {LEAST_IN_BIN} modes or more",
            bins.len()
        ));
    }
    Ok((bins, count))
}

fn bin(points: &[GainPoint]) -> Option<(f64, f64)> {
    let mean = |of: fn(&GainPoint) -> f64| points.iter().map(of).sum::<f64>() / points.len() as f64;
    (points.len() >= LEAST_IN_BIN).then(|| (mean(|p| p.detuning), mean(|p| p.height)))
}

/// Outer zero of one flank: (Hz, its standard uncertainty from scatter, from the shape, degrees of freedom).
fn zero(sorted: &[GainPoint], bins: &[(f64, f64)], top: f64, side: f64) -> Result<(f64, f64, f64, f64), String> {
    let why =
        || format!("the {} flank of the envelope could not be extrapolated", if side < 0.0 { "low" } else { "high" });
    let outward: Vec<&(f64, f64)> = if side < 0.0 { bins.iter().collect() } else { bins.iter().rev().collect() };
    let first = |level: f64| outward.iter().position(|bin| bin.1 >= level * top);
    let (outermost, innermost) = first(FLANK.0).zip(first(FLANK.1)).ok_or_else(why)?;
    // Where the outermost bin is high enough itself, all of its points are.
    let edge = if side < 0.0 { sorted.first() } else { sorted.last() };
    let edge = edge.filter(|_| outermost == 0).map(|point| side * point.detuning);
    let outer = edge.unwrap_or(side * outward[outermost].0);
    let inner = side * outward[innermost].0;
    // Chosen by place, not by height: else only those that chance made high would count near the floor.
    let on_flank = |p: &&GainPoint| (inner..=outer).contains(&(side * p.detuning));
    let flank: Vec<GainPoint> = sorted.iter().filter(on_flank).copied().collect();
    let scale = outer - inner;
    if flank.len() < LEAST_ON_FLANK || scale <= 0.0 {
        return Err(why());
    }
    let fit = |order: usize| {
        let fit = polynomial(&flank, side * outer, side * scale, order as i32)?;
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

/// The curve at every point; `None` with fewer points than it is smoothed over, or points that coincide.
fn smoothed(sorted: &[GainPoint], over: usize) -> Option<Vec<Place>> {
    let last = sorted.len().checked_sub(over)?;
    let at = |(i, point): (usize, &GainPoint)| {
        let first = i.saturating_sub(over / 2).min(last);
        let near = &sorted[first..first + over];
        let fit = polynomial(near, point.detuning, near[over - 1].detuning - near[0].detuning, 2)?;
        let u_height = (fit.covariance.first()? * fit.reduced_chi_square()?).sqrt();
        Some(Place { detuning: point.detuning, height: *fit.coefficients.first()?, u_height })
    };
    sorted.iter().enumerate().map(at).collect()
}

/// Least squares of height by a polynomial of (detuning − origin) / scale.
fn polynomial(points: &[GainPoint], origin: f64, scale: f64, order: i32) -> Option<linear::LinearFit> {
    let power = |p: &GainPoint, k: i32| ((p.detuning - origin) / scale).powi(k);
    let design: Vec<f64> = points.iter().flat_map(|p| (0..=order).map(move |k| power(p, k))).collect();
    let rhs: Vec<f64> = points.iter().map(|p| p.height).collect();
    linear::weighted(&design, &rhs, &vec![1.0; rhs.len()]).ok()
}

fn greatest<'a>(curve: impl Iterator<Item = &'a Place>) -> Option<&'a Place> {
    curve.max_by(|a, b| a.height.total_cmp(&b.height))
}

/// Full width at half of the top's height.
fn width_at_half(sorted: &[GainPoint], curve: &[Place], top: &Place) -> Option<Measured> {
    let [left, right] = [false, true].map(|from_above| {
        let points = about_half(sorted, curve, top.height, from_above)?;
        let parabola = crossing(points, 0.5 * top.height, 2)?;
        // Where a straight line does not cross at all, the shape is as doubtful as the part fitted is wide.
        let width = points[points.len() - 1].detuning - points[0].detuning;
        let line = crossing(points, 0.5 * top.height, 1);
        Some((parabola, line.map_or(width, |line| line.at - parabola.at)))
    });
    let ((left, line_left), (right, line_right)) = left.zip(right)?;
    let top_moves = 0.5 * top.u_height * (left.per_height + right.per_height);
    let b = |source, words, u: f64| BudgetLine::direct(source, words, Evaluation::TypeB, u, f64::INFINITY);
    let scatter = left.u.hypot(right.u).hypot(top_moves);
    let budget = vec![
        BudgetLine::direct("scatter", "scatter of heights", Evaluation::TypeA, scatter, left.dof.min(right.dof)),
        b("envelope extremes", "greatest of many heights", top_moves),
        b("envelope shape", "shape of the curve", (line_right - line_left).abs()),
    ];
    Some(Measured { value: right.at - left.at, budget })
}

/// The points about the outermost crossing of half height, by place: from where the curve first reaches the lower
/// height to where it first reaches the upper, seen from outside.
fn about_half<'a>(sorted: &'a [GainPoint], curve: &[Place], top: f64, from_above: bool) -> Option<&'a [GainPoint]> {
    let first = |level: f64| {
        let above = |place: &Place| place.height >= level * top;
        if from_above { curve.iter().rposition(above) } else { curve.iter().position(above) }
    };
    let (outer, inner) = first(ABOUT_HALF.0).zip(first(ABOUT_HALF.1))?;
    let points = sorted.get(outer.min(inner)..=outer.max(inner))?;
    (points.len() >= LEAST_AT_HALF).then_some(points)
}

#[derive(Debug, Clone, Copy)]
struct Crossing {
    /// Hz.
    at: f64,
    /// Standard uncertainty from the scatter, Hz.
    u: f64,
    /// Hz per unit of height.
    per_height: f64,
    dof: f64,
}

/// Where a line (`order` 1) or parabola (2) through points crosses a level, within them.
fn crossing(points: &[GainPoint], level: f64, order: i32) -> Option<Crossing> {
    let (first, last) = (points.first()?.detuning, points.last()?.detuning);
    let (middle, scale) = (0.5 * (first + last), 0.5 * (last - first));
    let fit = polynomial(points, middle, scale, order)?;
    let (a, b, c) =
        (fit.coefficients.first()? - level, *fit.coefficients.get(1)?, fit.coefficients.get(2).unwrap_or(&0.0));
    // The root nearest to the middle; not a number where there is none.
    let root = -2.0 * a / (b + (b * b - 4.0 * a * c).sqrt().copysign(b));
    let root = Some(root).filter(|root| root.abs() <= 1.0)?;
    let at = middle + scale * root;
    let per_height = scale / (b + 2.0 * c * root).abs();
    // The same polynomial about the crossing: its first coefficient is the height there.
    let there = polynomial(points, at, scale, order)?;
    let u_height = (there.covariance.first()? * there.reduced_chi_square()?).sqrt();
    let found = Crossing { at, u: per_height * u_height, per_height, dof: fit.degrees_of_freedom as f64 };
    found.u.is_finite().then_some(found)
}

/// Depth of the dip; `wider` is the curve smoothed over twice as many points, empty where there are too few.
fn dip(curve: &[Place], wider: &[Place]) -> Measured {
    let scatter = |u: f64| BudgetLine::direct("scatter", "scatter of heights", Evaluation::TypeA, u, f64::INFINITY);
    // A curve without a minimum between two maxima tells nothing of how deep one might be.
    let Some((depth, u)) = depth(curve) else { return Measured::with_line(0.0, scatter(1.0)) };
    let b = |source, words, u: f64| BudgetLine::direct(source, words, Evaluation::TypeB, u, f64::INFINITY);
    let rounded = self::depth(wider).map_or(depth, |(shallower, _)| depth - shallower).abs();
    let budget = vec![
        scatter(u),
        b("envelope extremes", "greatest and least of many heights", u),
        b("envelope shape", "shape of the curve", rounded),
    ];
    let found = Measured { value: depth, budget };
    // What was not seen may hide as deep as what was found and its uncertainty: that is the expanded uncertainty then.
    let significant = depth > SIGNIFICANT * found.u();
    if significant { found } else { Measured::with_line(0.0, scatter(0.5 * depth.max(0.0) + found.u())) }
}

/// 1 − least over the mean of the two greatest, and its standard uncertainty from scatter.
fn depth(curve: &[Place]) -> Option<(f64, f64)> {
    let middle = 0.5 * (curve.first()?.detuning + curve.last()?.detuning);
    let (low, high) = curve.split_at(curve.partition_point(|place| place.detuning < middle));
    let (left, right) = greatest(low.iter()).zip(greatest(high.iter()))?;
    let between = curve.iter().filter(|p| p.detuning > left.detuning && p.detuning < right.detuning);
    let least = between.min_by(|a, b| a.height.total_cmp(&b.height)).unwrap_or(left);
    let flanks = 0.5 * (left.height + right.height);
    let u = least.u_height.hypot(0.5 * left.u_height.hypot(right.u_height)) / flanks;
    (u > 0.0).then_some((1.0 - least.height / flanks, u))
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
        // A straight line between 0.3 and 0.7 of the height of a parabola is off by 3.4 MHz on either side.
        assert!((found.fwhm.value - fwhm).abs() < 3.0 * found.fwhm.u() && found.fwhm.u() < 8e6, "{found:?}");
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
        assert!((found.dip.value - depth).abs() < 3.0 * found.dip.u() && found.dip.u() < 0.01, "{found:?} {depth}");
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
