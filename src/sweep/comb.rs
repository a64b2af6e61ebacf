//! Which peaks are one mode, which modes form the comb, and what stands off it.
//! Must not fit an axis: it works on order phases of whatever axis it is given.
//! Main entries: [`classes`], [`find`]; main types: [`Class`], [`Comb`].

use super::remarks::Refusal;

/// A peak as seen by its order phase.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Phased {
    /// Index of the peak in the line fit.
    pub peak: usize,
    /// Order phase: one more is one order on.
    pub phase: f64,
    /// Height, V.
    pub height: f64,
}

/// One peak an order: the same light in every order it shows in.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Class {
    /// Phase folded into [0, 1).
    pub phase: f64,
    /// (peak, order).
    pub members: Vec<(usize, i32)>,
    /// Mean height, V.
    pub height: f64,
    /// Orders in which it should show, by the range of phases seen.
    pub expected: usize,
}

/// Gathers peaks into classes by their folded phase.
///
/// * `tolerance`: largest distance in phase from a class, orders.
/// * `range`: phases of the first and the last sample.
///
/// The strongest peak that is left founds the next class; each order gives it its nearest peak.
pub(super) fn classes(peaks: &[Phased], tolerance: f64, range: (f64, f64)) -> Vec<Class> {
    let mut left: Vec<Phased> = peaks.to_vec();
    let mut found = Vec::new();
    while let Some(founder) = left.iter().max_by(|a, b| a.height.total_cmp(&b.height)).copied() {
        let mut members: Vec<Phased> = Vec::new();
        let lowest = (range.0 - founder.phase).floor() as i32 - 1;
        let highest = (range.1 - founder.phase).ceil() as i32 + 1;
        for order in lowest..=highest {
            let wanted = founder.phase + f64::from(order);
            let nearest = left
                .iter()
                .filter(|p| (p.phase - wanted).abs() < tolerance)
                // Of two in reach the one of like height is the same mode.
                .min_by(|a, b| {
                    let cost = |p: &Phased| {
                        (p.phase - wanted).abs() / tolerance + (p.height / founder.height).ln().abs().min(3.0)
                    };
                    cost(a).total_cmp(&cost(b))
                });
            members.extend(nearest.copied());
        }
        left.retain(|p| members.iter().all(|m| m.peak != p.peak));
        let weight: f64 = members.iter().map(|m| m.height).sum();
        // Mean of the distances from the founder's grid, weighted by height.
        let shift = members
            .iter()
            .map(|m| {
                let d = m.phase - founder.phase;
                (d - d.round()) * m.height
            })
            .sum::<f64>()
            / weight;
        let centre = founder.phase + shift;
        let folded = centre.rem_euclid(1.0);
        let base = centre - folded;
        let orders_of = |m: &Phased| (m.phase - folded).round() as i32;
        let margin = tolerance;
        let expected = (lowest..=highest)
            .filter(|k| {
                let at = founder.phase + shift + f64::from(*k);
                at > range.0 + margin && at < range.1 - margin
            })
            .count();
        let _ = base;
        found.push(Class {
            phase: folded,
            height: weight / members.len() as f64,
            members: members.iter().map(|m| (m.peak, orders_of(m))).collect(),
            expected,
        });
    }
    found.sort_by(|a, b| a.phase.total_cmp(&b.phase));
    found
}

/// A comb laid over classes.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Comb {
    /// Spacing, orders.
    pub spacing: f64,
    /// For each class: (order to add, tooth), or none if it is off the comb. Teeth run from 0.
    pub teeth: Vec<Option<(i32, i32)>>,
    /// Share of height on the comb, less a penalty for teeth missing between.
    pub score: f64,
}

/// Widest lasing span believed, Hz: twice the Doppler width leaves room for hot and highly pumped tubes.
const WIDEST_SPAN: f64 = 3.2e9;
/// Narrowest spacing believed, Hz: a cavity of 3 m.
const NARROWEST: f64 = 50e6;
/// A comb must hold this share of the height.
const LEAST_SHARE: f64 = 0.6;
/// Combs whose scores are nearer than this fit equally well.
const EQUAL: f64 = 0.03;
/// A tooth within this of half an order may be the interferometer's own, orders.
const HALF_WAY: f64 = 0.02;
/// A comb within this of nominal is settled by it.
const NEAR_NOMINAL: f64 = 0.12;

/// Finds the comb among the classes.
///
/// * `tolerance`: largest departure of a tooth, orders. * `fsr`: Hz. * `nominal`: Hz, settles combs that fit alike.
///
/// 1. Every pair of strong classes proposes spacings: their distance, and that around the end of the order, over 1, 2, 3.
/// 2. A comb's score is the share of height on its teeth, less what is missing between its first and last tooth.
/// 3. The best is taken; another that fits as well and is not the same spacing makes the capture ambiguous.
pub(super) fn find(classes: &[Class], tolerance: f64, fsr: f64, nominal: Option<f64>) -> Result<Comb, Refusal> {
    if classes.len() < 2 {
        return Err(Refusal::OneMode);
    }
    let top = classes.iter().map(|c| c.height).fold(0.0, f64::max);
    let strong: Vec<usize> = (0..classes.len()).filter(|i| classes[*i].height > 0.15 * top).collect();
    let pool: Vec<usize> = if strong.len() >= 2 { strong } else { (0..classes.len()).collect() };
    let mut candidates: Vec<f64> = Vec::new();
    for (n, i) in pool.iter().enumerate() {
        for j in &pool[n + 1..] {
            let d = classes[*j].phase - classes[*i].phase;
            for distance in [d, 1.0 - d, 1.0 + d, 2.0 - d] {
                for parts in 1..=3 {
                    let spacing = distance / f64::from(parts);
                    if spacing * fsr >= NARROWEST && spacing * fsr <= WIDEST_SPAN && spacing > 2.0 * tolerance {
                        candidates.push(spacing);
                    }
                }
            }
        }
    }
    let mut combs: Vec<Comb> = candidates.into_iter().filter_map(|s| lay(classes, s, tolerance, fsr)).collect();
    combs.sort_by(|a, b| b.score.total_cmp(&a.score).then(b.spacing.total_cmp(&a.spacing)));
    let Some(best) = combs.first().cloned() else {
        return Err(Refusal::OneMode);
    };
    let on_teeth = |comb: &Comb| comb.teeth.iter().flatten().count();
    if on_teeth(&best) < 2 {
        return Err(Refusal::OneMode);
    }
    if best.score < LEAST_SHARE {
        return Err(Refusal::NoComb { share: best.score.max(0.0) });
    }
    // A confocal interferometer matched on axis shows one mode again, weakly, half-way: no second tooth.
    let heights: Vec<f64> =
        classes.iter().zip(&best.teeth).filter(|(_, t)| t.is_some()).map(|(c, _)| c.height).collect();
    let (low, high) = heights.iter().fold((f64::MAX, 0.0f64), |(a, b), h| (a.min(*h), b.max(*h)));
    if heights.len() == 2 && (best.spacing - 0.5).abs() < HALF_WAY && low < 0.4 * high {
        return Err(Refusal::OneMode);
    }
    let rivals: Vec<&Comb> = combs
        .iter()
        .filter(|c| best.score - c.score < EQUAL && (c.spacing / best.spacing - 1.0).abs() > 0.12 && on_teeth(c) >= 2)
        .collect();
    if rivals.is_empty() {
        return Ok(best);
    }
    let mut equal: Vec<&Comb> = vec![&best];
    equal.extend(rivals);
    if let Some(nominal) = nominal {
        // Half the modes may be hidden by a polarizing element: then twice nominal is what there is to see, and is warned of.
        for wanted in [nominal, 2.0 * nominal] {
            let off = |c: &Comb| (c.spacing * fsr / wanted - 1.0).abs();
            let near = equal.iter().filter(|c| off(c) < NEAR_NOMINAL).min_by(|a, b| off(a).total_cmp(&off(b)));
            if let Some(near) = near {
                return Ok((*near).clone());
            }
        }
    }
    // Folded by the order, any comb has aliases; those wider than a gain line is are not believed while a plain one fits.
    let simple = equal.iter().filter(|c| span(c) * fsr <= PLAIN_SPAN).collect::<Vec<_>>();
    if simple.len() == 1 {
        return Ok((**simple[0]).clone());
    }
    Err(Refusal::Ambiguous { first: best.spacing * fsr, second: equal[1].spacing * fsr, nominal })
}

/// A span that asks for no belief, Hz: lasing spans are 1000–2200 MHz by type (common practice), the comb is narrower.
const PLAIN_SPAN: f64 = 1.9e9;

fn span(comb: &Comb) -> f64 {
    let teeth = comb.teeth.iter().flatten().map(|t| t.1);
    f64::from(teeth.clone().max().unwrap_or(0) - teeth.min().unwrap_or(0)) * comb.spacing
}

/// Lays a comb of a spacing through the strongest class and scores it; place and spacing are improved on the way.
fn lay(classes: &[Class], spacing: f64, tolerance: f64, fsr: f64) -> Option<Comb> {
    let strongest = classes.iter().max_by(|a, b| a.height.total_cmp(&b.height))?;
    let mut line = Line { origin: strongest.phase, spacing };
    let mut teeth = Vec::new();
    // The first look is wide: one uneven tooth must not hide the others.
    for widening in [1.8, 1.3, 1.0] {
        let most = (WIDEST_SPAN / (line.spacing * fsr)).floor() as i32;
        teeth = assign(classes, line, tolerance * widening, most);
        line = improve(classes, &teeth, line);
    }
    let spacing = line.spacing;
    // Teeth that fold onto each other are one line and its shadow, not a comb.
    let beside = spacing - spacing.round();
    if spacing > 0.5 && beside.abs() < LEAST_FOLDED {
        return None;
    }
    let all: f64 = classes.iter().map(|c| c.height).sum();
    let on: f64 = classes.iter().zip(&teeth).filter(|(_, t)| t.is_some()).map(|(c, _)| c.height).sum();
    let used: Vec<i32> = teeth.iter().flatten().map(|t: &(i32, i32)| t.1).collect();
    let (first, last) = (*used.iter().min()?, *used.iter().max()?);
    let missing = f64::from(last - first + 1) - used.len() as f64;
    // Two teeth with a gap between are twice or half of something else.
    if missing > used.len() as f64 - 2.0 {
        return None;
    }
    for tooth in teeth.iter_mut().flatten() {
        tooth.1 -= first;
    }
    let wide = f64::from(last - first) * spacing * fsr / WIDEST_SPAN;
    Some(Comb { spacing, teeth, score: on / all - 0.18 * missing - 0.02 * wide })
}

/// Neighbouring teeth, folded by the order, must stand this far apart, orders.
const LEAST_FOLDED: f64 = 0.03;

/// A comb's place and spacing, orders.
#[derive(Debug, Clone, Copy)]
struct Line {
    origin: f64,
    spacing: f64,
}

/// Weighted straight line through the teeth found: phase + order against tooth.
fn improve(classes: &[Class], teeth: &[Option<(i32, i32)>], line: Line) -> Line {
    let (mut s0, mut s1, mut s2, mut t0, mut t1) = (0.0, 0.0, 0.0, 0.0, 0.0);
    for (class, tooth) in classes.iter().zip(teeth) {
        let Some((order, tooth)) = tooth else { continue };
        let (m, at, w) = (f64::from(*tooth), class.phase + f64::from(*order), class.height);
        s0 += w;
        s1 += w * m;
        s2 += w * m * m;
        t0 += w * at;
        t1 += w * m * at;
    }
    let determinant = s0 * s2 - s1 * s1;
    if determinant.is_nan() || determinant <= 1e-9 * s0 * s0 {
        return line;
    }
    let spacing = (s0 * t1 - s1 * t0) / determinant;
    if spacing > 0.0 { Line { origin: (s2 * t0 - s1 * t1) / determinant, spacing } } else { line }
}

/// Gives classes to teeth, strongest first; no tooth twice.
fn assign(classes: &[Class], line: Line, tolerance: f64, most: i32) -> Vec<Option<(i32, i32)>> {
    let spacing = line.spacing;
    let mut order_of: Vec<usize> = (0..classes.len()).collect();
    order_of.sort_by(|a, b| classes[*b].height.total_cmp(&classes[*a].height));
    let mut teeth: Vec<Option<(i32, i32)>> = vec![None; classes.len()];
    let (mut low, mut high) = (0, 0);
    for i in order_of {
        let d = classes[i].phase - line.origin;
        let mut best: Option<(f64, i32, i32)> = None;
        for order in -3..=3 {
            let tooth = ((d + f64::from(order)) / spacing).round() as i32;
            if tooth.abs() > most || (high.max(tooth) - low.min(tooth)) > most {
                continue;
            }
            let off = (d + f64::from(order) - f64::from(tooth) * spacing).abs();
            let taken = teeth.iter().flatten().any(|t| t.1 == tooth);
            // Further teeth stand less surely: the spacing proposed has an error of its own.
            let reach = tolerance * (1.0 + 0.25 * f64::from((tooth.abs() - 1).max(0)));
            // A tooth next to those placed is likelier than one far out that fits by chance.
            let gap = f64::from((tooth - high).max(low - tooth).max(1) - 1);
            let cost = off / tolerance + 1.5 * gap;
            if off < reach && !taken && best.is_none_or(|b| cost < b.0) {
                best = Some((cost, order, tooth));
            }
        }
        if let Some((_, order, tooth)) = best {
            teeth[i] = Some((order, tooth));
            low = low.min(tooth);
            high = high.max(tooth);
        }
    }
    teeth
}
