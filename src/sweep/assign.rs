//! Which fitted line is which: classes, comb and axis, each round sharper than the one before.
//! Must not write a result: it says what was found, or why nothing was.
//! Main entry: [`assign`]; main type: [`Assigned`].

use std::collections::BTreeSet;

use nalgebra::DMatrix;

use super::{
    Refusal, Settings,
    axis::{self, AxisFit, Choice, Offsets, Placed},
    comb::{self, Class, Comb, Phased},
    fitted::Fitted,
    lines::LineFit,
    orders::Orders,
};

/// Share of all fitted height that must stand on the comb; off-axis light up to half of every axial mode passes.
const LEAST_COMB_SHARE: f64 = 0.64;
/// More lights an order than this are clutter: eight modes of a tube a metre long, and as many off the axis.
const MOST_LIGHTS: usize = 16;
/// A fitted line counts if its height exceeds this many of its own standard uncertainties (`measurement.md`: 5 σ).
const LEAST_HEIGHT_SIGMA: f64 = 5.0;
/// Reach of a class on the smooth map and on a fitted axis: share of the apparent width, and its bounds, orders.
const FIRST: [(f64, f64, f64); 3] = [(0.6, 0.015, 0.06), (1.2, 0.03, 0.06), (2.4, 0.05, 0.06)];
const LATER: (f64, f64, f64) = (0.4, 0.006, 0.04);
/// Share of all height that should repeat.
const ENOUGH: f64 = 0.8;

/// Rounds: the smooth order map, then free offsets, then twice the comb.
const ROUNDS: usize = 4;

/// What the lines are.
pub(super) struct Assigned {
    /// Lights that repeat from order to order.
    pub classes: Vec<Class>,
    /// The comb, or why there is none.
    pub comb: Result<Comb, Refusal>,
    /// The axis.
    pub choice: Choice,
    /// Peaks that do not repeat.
    pub n_stray: usize,
    /// Orders seen, whole or in part.
    pub n_orders: usize,
}

/// The ramp on which lines are assigned.
struct Ramp<'a> {
    fit: &'a LineFit,
    /// Half its length, samples.
    half: f64,
    fsr: f64,
    /// Lines that stand clear of the noise and on the ramp.
    good: Vec<usize>,
    /// Apparent width, orders.
    apparent: f64,
}

/// What one round found.
struct Round {
    classes: Vec<Class>,
    comb: Result<Comb, Refusal>,
    choice: Option<Choice>,
    n_stray: usize,
}

/// Assigns fitted lines to orders and teeth.
///
/// * `n_samples`: on the ramp. Errors: why the lines give no scale, or are no comb although a comb was wanted.
pub(super) fn assign(
    n_samples: usize,
    orders: &Orders,
    fitted: &Fitted,
    settings: &Settings,
) -> Result<Assigned, Refusal> {
    let fit = &fitted.fit;
    let length = n_samples as f64;
    let clear = |i: &usize| {
        let (x, h) = (fit.centres[*i], fit.heights[*i]);
        h > LEAST_HEIGHT_SIGMA * fit.u_heights[*i] && x > 0.0 && x < length
    };
    let ramp = Ramp {
        fit,
        half: length / 2.0,
        fsr: settings.free_spectral_range,
        good: (0..fit.centres.len()).filter(clear).collect(),
        apparent: fitted.apparent_width / orders.period,
    };
    let mut map = Map::Smooth(*orders);
    let mut best: Option<Round> = None;
    let mut best_share = 0.0;
    for number in 0..ROUNDS {
        let (kept, n_stray) = if number == 0 { ramp.first_classes(&map) } else { ramp.classes(&map, LATER) };
        if number == 0 {
            if let Some(choice) = ramp.free_axis(&kept, &map) {
                map = Map::Fitted(choice.fit);
            }
            continue;
        }
        let found = comb::find(&kept, ramp.reach(&map), ramp.fsr, settings.nominal_spacing);
        let Ok(comb) = &found else {
            // Without a comb the free axis stands; with one from the round before, that stands.
            if best.is_none() {
                let choice = ramp.free_axis(&kept, &map);
                best = Some(Round { classes: kept, comb: found, choice, n_stray });
            }
            break;
        };
        // A sharper axis must not lose light from the comb: if it does, what was found before stands.
        let share = ramp.comb_share(&kept, comb);
        if share < best_share - 0.02 {
            break;
        }
        best_share = share;
        let placed = ramp.place(&kept, &comb.teeth);
        let choice = axis::choose(&placed, &ramp.covariance(&placed, &map), ramp.fsr, Offsets::Comb);
        let next = choice.as_ref().map(|c| c.fit.clone());
        best = Some(Round { classes: kept, comb: found, choice, n_stray });
        match next {
            Some(axis) => map = Map::Fitted(axis),
            None => break,
        }
    }
    judge(&ramp, best.ok_or(Refusal::WeakScale)?)
}

/// Takes what was found, or refuses it in words.
fn judge(ramp: &Ramp<'_>, round: Round) -> Result<Assigned, Refusal> {
    let Round { classes, comb, choice, n_stray } = round;
    // One light seen twice gives any two peaks a repeat: a scale needs two, or one in three orders.
    let repeats: usize = classes.iter().map(|c| c.members.len().saturating_sub(1)).sum();
    if repeats < 2 && classes.len() > 1 {
        return Err(Refusal::NoRepeat { share: repeats as f64 / classes.len() as f64 });
    }
    let Some(choice) = choice else {
        return Err(match comb {
            Err(refusal @ (Refusal::Ambiguous { .. } | Refusal::NoComb { .. })) => refusal,
            _ => Refusal::WeakScale,
        });
    };
    if let Ok(comb) = &comb {
        let share = ramp.comb_share(&classes, comb);
        let n_on = comb.teeth.iter().flatten().count();
        // More lights off the comb than on it are clutter, however weak.
        if share < LEAST_COMB_SHARE || classes.len() > (2 * n_on + 1).min(MOST_LIGHTS) {
            return Err(Refusal::NoComb { share });
        }
    }
    let seen: BTreeSet<i32> = classes.iter().flat_map(|c| c.members.iter().map(|m| m.1)).collect();
    Ok(Assigned { classes, comb, choice, n_stray, n_orders: seen.len() })
}

impl Ramp<'_> {
    fn u_of(&self, x: f64) -> f64 {
        (x - self.half) / self.half
    }

    /// Classes on the smooth map: where too little repeats, the map may be further off than lines are wide.
    fn first_classes(&self, map: &Map) -> (Vec<Class>, usize) {
        let repeated = |classes: &[Class]| {
            let members = |class: &&Class| class.members.len() >= 2;
            classes.iter().filter(members).map(|class| class.height * class.members.len() as f64).sum::<f64>()
        };
        let all: f64 = self.good.iter().map(|i| self.fit.heights[*i]).sum();
        let mut best = self.classes(map, FIRST[0]);
        for reach in &FIRST[1..] {
            if repeated(&best.0) > ENOUGH * all {
                break;
            }
            let wider = self.classes(map, *reach);
            if repeated(&wider.0) > repeated(&best.0) {
                best = wider;
            }
        }
        best
    }

    /// Classes that repeat, and how many do not.
    fn classes(&self, map: &Map, (share, least, most): (f64, f64, f64)) -> (Vec<Class>, usize) {
        let tolerance = (share * self.apparent)
            .clamp(least, most)
            .hypot((4.0 * self.u_phase(map)).min(0.02))
            .hypot((3.0 * map.rms() / self.fsr).min(0.02));
        let phase = |x: f64| map.detuning(x, self.half, self.fsr) / self.fsr;
        let phased = |i: &usize| Phased { peak: *i, phase: phase(self.fit.centres[*i]), height: self.fit.heights[*i] };
        let peaks: Vec<Phased> = self.good.iter().map(phased).collect();
        let all = comb::classes(&peaks, tolerance, (phase(0.0), phase(2.0 * self.half)));
        // What shows in one order but should in several does not repeat: it is left out, and said.
        let (kept, stray): (Vec<Class>, Vec<Class>) =
            all.into_iter().partition(|c| c.members.len() >= 2 || c.expected < 2);
        (kept, stray.len())
    }

    /// How far a tooth may be off, orders: a part of the line's width, and what noise did to it.
    fn reach(&self, map: &Map) -> f64 {
        (0.35 * self.apparent).clamp(0.006, 0.04).hypot((4.0 * self.u_phase(map)).min(0.03))
    }

    /// Median standard uncertainty of the centres, orders.
    fn u_phase(&self, map: &Map) -> f64 {
        let u = |i: &usize| {
            let x = self.fit.centres[*i];
            self.fit.centre_covariance[(*i, *i)].max(0.0).sqrt() * map.slope(x, self.half, self.fsr) / self.fsr
        };
        let mut all: Vec<f64> = self.good.iter().map(u).collect();
        all.sort_by(f64::total_cmp);
        all.get(all.len() / 2).copied().unwrap_or(0.0)
    }

    /// The axis with a free offset for every class.
    fn free_axis(&self, classes: &[Class], map: &Map) -> Option<Choice> {
        let placed = self.place(classes, &vec![Some((0, 0)); classes.len()]);
        axis::choose(&placed, &self.covariance(&placed, map), self.fsr, Offsets::Classes(classes.len()))
    }

    /// Covariance of the placed peaks' frequencies, Hz².
    fn covariance(&self, placed: &[Placed], map: &Map) -> DMatrix<f64> {
        let slope = |i: usize| map.slope(self.fit.centres[i], self.half, self.fsr);
        DMatrix::from_fn(placed.len(), placed.len(), |a, b| {
            let (i, j) = (placed[a].peak, placed[b].peak);
            self.fit.centre_covariance[(i, j)] * slope(i) * slope(j)
        })
    }

    /// Share of all fitted height, strays included, that stands on the comb.
    fn comb_share(&self, classes: &[Class], comb: &Comb) -> f64 {
        let all: f64 = self.good.iter().map(|i| self.fit.heights[*i]).sum();
        let on: f64 = classes
            .iter()
            .zip(&comb.teeth)
            .filter(|(_, tooth)| tooth.is_some())
            .flat_map(|(class, _)| &class.members)
            .map(|m| self.fit.heights[m.0])
            .sum();
        if all > 0.0 { on / all } else { 0.0 }
    }

    /// Puts every member of a class at its order and tooth: ν = own·FSR + class, class + order·FSR = tooth·Δν + const.
    fn place(&self, classes: &[Class], teeth: &[Option<(i32, i32)>]) -> Vec<Placed> {
        let mut placed = Vec::new();
        for (index, (class, tooth)) in classes.iter().zip(teeth).enumerate() {
            let Some((order, tooth)) = tooth else { continue };
            for (peak, own) in &class.members {
                let u = self.u_of(self.fit.centres[*peak]);
                placed.push(Placed { peak: *peak, u, order: own - order, tooth: *tooth, class: index });
            }
        }
        placed.sort_by(|a, b| a.u.total_cmp(&b.u));
        placed
    }
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

/// Every class off but the one seen most often, the strongest of those.
pub(super) fn strongest_only(classes: &[Class]) -> Vec<Option<(i32, i32)>> {
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
