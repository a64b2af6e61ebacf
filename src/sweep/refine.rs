//! From fitted lines to the sharpest spacing: the model of all samples, over both ramps where the capture holds two.
//! Must not replace what it cannot better: where the model does not describe the samples, what was there stands.
//! Main entry: [`sharpen`].

use super::{
    assign::Assigned,
    axis::{FALL_OFF, MOST_INFLATION, MOST_TERMS, SIGNIFICANT},
    comb::Comb,
    fitted::Fitted,
    global::{self, Global, Shape, Track, Wider},
    segment::Segment,
};
use crate::numerics::distributions::excess_ratio;

/// One ramp, measured.
pub(super) struct Swept<'a> {
    /// The ramp.
    pub segment: &'a Segment,
    /// Its lines.
    pub fitted: Fitted,
    /// What they are.
    pub assigned: Assigned,
}

/// The model may leave this much more than the free lines do, per parameter saved, in units of the noise: F at 0.1 % for
/// five to thirty parameters saved is 2 to 4.
const MOST_F: f64 = 3.0;
/// What the model leaves, over the noise of neighbouring samples: a reduced chi-square of 4 is a misfit.
const MOST_NOISE: f64 = 2.0;
/// Heights on the two ramps may differ by this share (root mean square) before they are not the same lights.
const MOST_UNLIKE: f64 = 0.2;
/// Terms that a fit starts with at least, where the lines give them: what is not needed is dropped.
const FIRST_TERMS: usize = 3;

/// Sharpens what one ramp said; the other ramp, if it is there and agrees, helps.
///
/// Axis, spacing and their uncertainty, width and pole are replaced; without a comb, or where the model of all samples
/// does not fit, nothing is.
pub(super) fn sharpen<'a>(main: &mut Swept<'a>, mut other: Option<Swept<'a>>, fsr: f64) {
    let mut alone = Sharp::of(&[(main, 1.0, 0.0)], fsr);
    if let (None, Some(second)) = (&alone, &mut other) {
        // The other ramp is taken where the model describes that one only.
        alone = Sharp::of(&[(second, 1.0, 0.0)], fsr);
        if alone.is_some() {
            std::mem::swap(main, second);
            other = None;
        }
    }
    let Some(alone) = alone else { return };
    let joint = other.as_ref().and_then(|other| both(main, &alone, other, fsr));
    joint.unwrap_or(alone).put_into(main);
}

/// The model of all samples, its terms chosen, and what it says of its own truth.
struct Sharp {
    global: Global,
    /// Standard deviation of one sample, V.
    noise: f64,
    /// Factor on uncertainties for what the model leaves beyond lines.
    birge: f64,
    truncation: f64,
}

impl Sharp {
    /// * `ramps`: each with the way its teeth run and what its own tooth 0 is ahead of the common one, Hz.
    fn of(ramps: &[(&Swept<'_>, f64, f64)], fsr: f64) -> Option<Self> {
        let main = ramps.first()?.0;
        let shape = shape_of(main, main.assigned.comb.as_ref().ok()?, fsr);
        let mut tracks: Vec<Track<'_>> =
            ramps.iter().map(|(swept, way, shift)| track_of(swept, *way, *shift)).collect();
        let (global, wider) = choose(&mut tracks, &shape)?;
        let lines: Vec<&Fitted> = ramps.iter().map(|(swept, ..)| &swept.fitted).collect();
        let free: f64 = lines.iter().map(|fitted| fitted.fit.sum_of_squares).sum();
        let dof: f64 = lines.iter().map(|fitted| fitted.fit.dof).sum();
        let left: f64 = global.sums.iter().sum();
        let saved = (global.dof - dof).max(1.0);
        let excess = (left - free) / (free / dof);
        if excess / saved > MOST_F {
            return None;
        }
        let noise = (left / global.dof).sqrt();
        // Beside lines that fit badly themselves F says nothing: the samples must be described as well.
        if noise > MOST_NOISE * main.segment.noise {
            return None;
        }
        // A series that goes on does so only where the terms that showed it stand.
        let terms = global.axes.first().map_or(0, |axis| axis.len() - 1);
        let goes_on = ramps.iter().filter(|(swept, ..)| terms >= swept.assigned.choice.terms);
        let series = goes_on.map(|(swept, ..)| swept.assigned.choice.series).fold(0.0, f64::max);
        Some(Self {
            truncation: wider.map_or(0.0, |wider| truncation(&global, &wider, noise)).hypot(series),
            birge: if excess > 0.0 { excess_ratio(excess, saved) } else { 1.0 },
            noise,
            global,
        })
    }

    /// Puts the model's numbers in the place of the lines'.
    fn put_into(self, swept: &mut Swept<'_>) {
        let half = swept.segment.signal.len() as f64 / 2.0;
        let choice = &mut swept.assigned.choice;
        if let Some(axis) = self.global.axes.first() {
            choice.terms = axis.len() - 1;
            choice.fit.coefficients.clone_from(axis);
        }
        choice.fit.spacing = Some(self.global.shape.spacing);
        choice.fit.u_spacing = self.global.u_spacing * self.noise * self.global.memory.sqrt();
        choice.birge = self.birge;
        choice.birge_of_places = choice.birge_of_places.max(self.birge);
        choice.truncation = self.truncation;
        swept.fitted.fit.width = self.global.shape.width / (choice.fit.slope(0.0) / half);
        if self.global.shape.pole.is_some() {
            swept.fitted.fit.pole = self.global.shape.pole;
        }
    }
}

/// Fits with the axis terms that the samples ask for: what does not earn its chi-square at 0.1 % is dropped, what does is
/// taken in. Returns the fit, and what one term more would change.
fn choose(tracks: &mut [Track<'_>], shape: &Shape) -> Option<(Global, Option<Wider>)> {
    let mut global = global::fit(tracks, shape)?;
    for _ in 0..2 * MOST_TERMS {
        let variance = global.sums.iter().sum::<f64>() / global.dof;
        let chi_square = |ramp: usize| (global.last[ramp].0 / global.last[ramp].1).powi(2) / variance;
        let weak = |ramp: &usize| tracks[*ramp].axis.len() > 2 && chi_square(*ramp) < SIGNIFICANT;
        let weakest = (0..tracks.len()).filter(weak).min_by(|a, b| chi_square(*a).total_cmp(&chi_square(*b)));
        let Some(weakest) = weakest else { break };
        for (track, axis) in tracks.iter_mut().zip(&global.axes) {
            track.axis.clone_from(axis);
        }
        tracks[weakest].axis.pop();
        global = global::fit(tracks, &global.shape)?;
    }
    loop {
        let Some(wider) = global::wider(tracks, &global) else { return Some((global, None)) };
        let variance = global.sums.iter().sum::<f64>() / global.dof;
        let most = tracks.iter().map(|track| track.axis.len() - 1).max().unwrap_or(MOST_TERMS);
        let earned = wider.gain > SIGNIFICANT * tracks.len() as f64 * variance;
        if !earned || most >= MOST_TERMS || wider.u_spacing > MOST_INFLATION * global.u_spacing {
            return Some((global, Some(wider)));
        }
        for ((track, axis), last) in tracks.iter_mut().zip(&global.axes).zip(&wider.last) {
            track.axis.clone_from(axis);
            track.axis.push(last.0);
        }
        let Some(richer) = global::fit(tracks, &global.shape) else { return Some((global, Some(wider))) };
        global = richer;
    }
}

/// Ramps with one term more for each that ends where the samples stop to show any: piezo ramps are no polynomials.
const ODDS: f64 = 30.0;

/// Standard uncertainty of the spacing for the axis term that was left out, Hz.
///
/// Either the ramp has no such term, or it has one of the size that smooth ramps have ([`FALL_OFF`] of the last, normal
/// about 0), which before the samples are asked is [`ODDS`] times as likely. How much they speak for the second (the ratio of
/// the two marginal likelihoods) weighs what the term, drawn toward 0 as its size asks, would change, and how far that
/// change is known.
fn truncation(global: &Global, wider: &Wider, noise: f64) -> f64 {
    let (mut log_ratio, mut drawn) = (ODDS.ln(), 0.0);
    for (last, next) in global.last.iter().zip(&wider.last) {
        let (coefficient, u) = (next.0, next.1 * noise);
        let terms = global.axes.first().map_or(1, |axis| axis.len() - 1);
        let size = if terms < 2 { 0.1 } else { FALL_OFF } * last.0.abs();
        let share = size * size / (size * size + u * u);
        log_ratio += 0.5 * (1.0 - share).ln() + 0.5 * share * (coefficient / u).powi(2);
        drawn += share / global.last.len() as f64;
    }
    let likely = 1.0 / (1.0 + (-log_ratio).exp());
    let grown = (wider.u_spacing.powi(2) - global.u_spacing.powi(2)).max(0.0) * noise * noise;
    (likely * ((drawn * wider.moved).powi(2) + drawn * grown)).sqrt()
}

fn shape_of(swept: &Swept<'_>, comb: &Comb, fsr: f64) -> Shape {
    let Assigned { classes, choice, .. } = &swept.assigned;
    let fit = &swept.fitted.fit;
    let half = swept.segment.signal.len() as f64 / 2.0;
    let place = |members: &[(usize, i32)]| {
        let one = |(i, order): &(usize, i32)| choice.fit.at((fit.centres[*i] - half) / half) - f64::from(*order) * fsr;
        members.iter().map(one).sum::<f64>() / members.len().max(1) as f64
    };
    let off = classes.iter().zip(&comb.teeth).filter(|(_, tooth)| tooth.is_none());
    Shape {
        fsr,
        spacing: choice.fit.spacing.unwrap_or(comb.spacing * fsr),
        teeth: comb.teeth.iter().flatten().map(|tooth| f64::from(tooth.1)).collect(),
        free: off.map(|(class, _)| place(&class.members)).collect(),
        width: fit.width * choice.fit.slope(0.0) / half,
        pole: fit.pole,
    }
}

/// The ramp as the model takes it; `shift`: what its own tooth 0 is ahead of the common one, Hz.
fn track_of<'a>(swept: &'a Swept<'_>, way: f64, shift: f64) -> Track<'a> {
    let choice = &swept.assigned.choice;
    let one_way = |index: &usize| choice.tried.get(*index).is_some_and(|fit| fit.dof >= 0 && fit.is_one_way(-1.0, 1.0));
    let richer = (choice.terms..FIRST_TERMS).rev().find(one_way).and_then(|index| choice.tried.get(index));
    let mut axis = richer.unwrap_or(&choice.fit).coefficients.clone();
    if let Some(first) = axis.first_mut() {
        *first -= shift;
    }
    Track { samples: &swept.fitted.samples, axis, way }
}

/// Both ramps in one fit; none where they do not show the same lights.
fn both(main: &Swept<'_>, alone: &Sharp, other: &Swept<'_>, fsr: f64) -> Option<Sharp> {
    let (ours, theirs) = (main.assigned.comb.as_ref().ok()?, other.assigned.comb.as_ref().ok()?);
    let way = if main.segment.rising == other.segment.rising { 1.0 } else { -1.0 };
    let shift = aligned(&heights(main, ours), &heights(other, theirs), way)?;
    Sharp::of(&[(main, 1.0, 0.0), (other, way, f64::from(shift) * alone.global.shape.spacing)], fsr)
}

/// (tooth, height) of the comb.
fn heights(swept: &Swept<'_>, comb: &Comb) -> Vec<(i32, f64)> {
    let pairs = swept.assigned.classes.iter().zip(&comb.teeth);
    pairs.filter_map(|(class, tooth)| tooth.map(|tooth| (tooth.1, class.height))).collect()
}

/// The tooth of the other ramp that is tooth 0 of this one, by the heights: their tooth = shift + way · our tooth.
fn aligned(ours: &[(i32, f64)], theirs: &[(i32, f64)], way: f64) -> Option<i32> {
    let at = |list: &[(i32, f64)], tooth: i32| list.iter().find(|t| t.0 == tooth).map_or(0.0, |t| t.1);
    let all: f64 = ours.iter().map(|t| t.1 * t.1).sum();
    let unlike = |shift: i32| {
        let mapped = |tooth: i32| shift + if way > 0.0 { tooth } else { -tooth };
        let seen: f64 = ours.iter().map(|t| (t.1 - at(theirs, mapped(t.0))).powi(2)).sum();
        let hit = |tooth: i32| ours.iter().any(|t| mapped(t.0) == tooth);
        seen + theirs.iter().filter(|t| !hit(t.0)).map(|t| t.1 * t.1).sum::<f64>()
    };
    let most = ours.iter().chain(theirs).map(|t| t.0).max()?;
    let best = (-most..=2 * most).min_by(|a, b| unlike(*a).total_cmp(&unlike(*b)))?;
    (unlike(best) < MOST_UNLIKE * MOST_UNLIKE * all).then_some(best)
}
