//! Follows the comb through a series of glimpses: unwraps its phase and numbers its modes.
//! Must not fit a model of the walk.
//! Main type: [`Track`].

use std::f64::consts::TAU;

use super::glimpse::{Glimpse, GlimpseMode};
use crate::numerics::summary::{NORMAL_SD_PER_MAD, median};

/// Least uncertainty of a mode's position when modes are averaged, Hz: below it a stated uncertainty is not believed to
/// differ between the modes of one capture.
const LEAST_U_POSITION: f64 = 0.5e6;

/// Least agreement between the modes of one glimpse (length of their mean phasor) for its phase to be used.
const LEAST_AGREEMENT: f64 = 0.5;

/// Weight of a new glimpse in the running place of the cluster of modes; it only sets where an order is cut.
const CLUSTER_WEIGHT: f64 = 1.0 / 32.0;

/// Glimpses that set the first place of the cluster.
const CLUSTER_START: usize = 16;

/// Points over which the rate of walk is taken to predict the next phase.
const LOOK_BACK: usize = 4;

/// Largest error of a predicted step, in cycles, at which the phase may still be unwrapped. Half a cycle is the hard
/// bound.
const LARGEST_STEP_ERROR: f64 = 0.3;

/// Shortest time over which the rate of walk changes by itself, s (the fast part of a warm-up; common practice).
const SHORTEST_RATE_CHANGE: f64 = 5.0;

/// One glimpse on the track.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct TrackPoint {
    /// Index of the glimpse.
    pub index: usize,
    /// Seconds since first light.
    pub at: f64,
    /// Unwrapped comb phase along the scan axis, in spacings from the origin of the track.
    pub phase: f64,
    /// Its standard uncertainty from the positions, in spacings.
    pub u_phase: f64,
    /// Unfolded place of the cluster of modes, Hz from the origin of the track.
    pub cluster: f64,
}

/// The comb followed through a series of glimpses.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Track {
    /// Spacing used, Hz.
    pub spacing: f64,
    /// Scan-axis position of the origin, Hz.
    pub origin: f64,
    /// In order of time.
    pub points: Vec<TrackPoint>,
    /// Glimpses before the first point could not be unwrapped.
    pub early_unknown: bool,
    /// Robust scatter of the phase from point to point, in spacings.
    pub scatter: f64,
}

impl Track {
    /// Follows the comb.
    ///
    /// * `glimpses`: in order of time; unusable ones are passed over.
    /// * `spacing`: mode spacing, Hz; 1 % off does no harm.
    ///
    /// # Method
    /// 1. Unfold each position to within half an order of the running place of the cluster of modes, so that the cut
    ///    between orders lies opposite to the gain line.
    /// 2. Phase of a glimpse: argument of the weighted mean of exp(2πi·position/spacing) over its modes.
    /// 3. Unwrap from the last glimpse backward, each step nearest to what the rate just after it predicts: the walk
    ///    slows down, so the end is the safe place to start. Stop where the rate can no longer say which cycle it is.
    pub fn follow(glimpses: &[Glimpse], spacing: f64) -> Self {
        let mut track = Self { spacing, origin: 0.0, points: Vec::new(), early_unknown: false, scatter: 0.0 };
        if !(spacing.is_finite() && spacing > 0.0) {
            return track;
        }
        let usable: Vec<(usize, &Glimpse)> = glimpses.iter().enumerate().filter(|(_, g)| g.is_usable()).collect();
        let Some(origin) = first_cluster(&usable) else { return track };
        track.origin = origin;
        let mut cluster = 0.0;
        let mut last_at = f64::NEG_INFINITY;
        for (index, glimpse) in usable {
            cluster += CLUSTER_WEIGHT * cluster_offset(glimpse, origin + cluster).unwrap_or(0.0);
            if glimpse.at <= last_at {
                continue;
            }
            if let Some((phase, u_phase)) = comb_phase(glimpse, origin, cluster, spacing) {
                last_at = glimpse.at;
                track.points.push(TrackPoint { index, at: glimpse.at, phase, u_phase, cluster });
            }
        }
        track.unwrap_backward();
        track.scatter = scatter(&track.points);
        track
    }

    fn unwrap_backward(&mut self) {
        let n = self.points.len();
        for i in (0..n.saturating_sub(1)).rev() {
            let next = &self.points[i + 1];
            let step = next.at - self.points[i].at;
            // Look forward over at least as long as the step to be bridged.
            let mut far = (i + 1 + LOOK_BACK).min(n - 1);
            while far + 1 < n && self.points[far].at - next.at < step && far < i + 40 {
                far += 1;
            }
            let span = self.points[far].at - next.at;
            let rate = if span > 0.0 { (self.points[far].phase - next.phase) / span } else { 0.0 };
            let change = SHORTEST_RATE_CHANGE.max(self.points[i].at);
            let error = (rate * step).abs() * 0.5 * (span + step) / change;
            if error > LARGEST_STEP_ERROR {
                self.points.drain(..=i);
                self.early_unknown = true;
                return;
            }
            let predicted = next.phase - rate * step;
            let point = &mut self.points[i];
            point.phase += (predicted - point.phase).round();
        }
    }

    /// Net walk of the comb along the scan axis with `removed(i)` taken off point i: +1, or −1 where it goes down.
    pub fn direction(&self, removed: impl Fn(usize) -> f64) -> f64 {
        match (self.points.first(), self.points.last()) {
            (Some(first), Some(last)) => {
                let walked = last.phase - removed(self.points.len() - 1) - first.phase + removed(0);
                if walked < 0.0 { -1.0 } else { 1.0 }
            }
            _ => 1.0,
        }
    }

    /// First of the points before `point` that make up `cycles` of walk and at least `least` points.
    pub fn reach_back(&self, point: usize, cycles: f64, least: usize) -> usize {
        let Some(end) = self.points.get(point) else { return 0 };
        let far = |i: &usize| (self.points[*i].phase - end.phase).abs() >= cycles && *i + least <= point;
        (0..point).rev().find(far).unwrap_or(0)
    }

    /// One past the last of the points from `point` on that make up `cycles` of walk and at least `least` points.
    pub fn reach_on(&self, point: usize, cycles: f64, least: usize) -> usize {
        let n = self.points.len();
        let Some(start) = self.points.get(point) else { return n };
        let far = |i: &usize| (self.points[*i].phase - start.phase).abs() >= cycles && *i >= point + least;
        (point..n).find(far).map_or(n, |i| i + 1)
    }

    /// Position of a mode, unfolded near the cluster of its point, Hz from the origin of the track.
    pub fn unfolded(&self, point: &TrackPoint, mode: &GlimpseMode, free_spectral_range: f64) -> f64 {
        unfold(mode.position - self.origin, point.cluster, free_spectral_range)
    }

    /// Number of a mode on the comb: a mode keeps it while it walks through the line, its neighbours differ by one.
    pub fn comb_index(&self, point: &TrackPoint, mode: &GlimpseMode, free_spectral_range: f64) -> i64 {
        (self.unfolded(point, mode, free_spectral_range) / self.spacing - point.phase).round() as i64
    }
}

/// Spacing to unwrap with: the median of what was measured, once there are a few, else the nominal one, Hz.
///
/// A measured spacing near a whole multiple of the nominal one is taken as a comb with modes hidden, and divided.
pub(crate) fn pooled_spacing(glimpses: &[Glimpse], nominal: f64) -> f64 {
    const ENOUGH: usize = 5;
    let measured: Vec<f64> =
        glimpses.iter().filter_map(|g| g.mode_spacing).filter(|s| s.is_finite() && *s > 0.0).collect();
    if measured.len() < ENOUGH {
        return nominal;
    }
    let Some(pooled) = median(&measured) else { return nominal };
    let ratio = (pooled / nominal).round();
    if ratio >= 2.0 && (pooled / nominal / ratio - 1.0).abs() < 0.05 { pooled / ratio } else { pooled }
}

/// `value` moved by whole `period`s to within half a period of `near`.
fn unfold(value: f64, near: f64, period: f64) -> f64 {
    value - ((value - near) / period).round() * period
}

/// Height-weighted circular mean of positions over one order, Hz; the phasor itself as (cosine, sine).
fn phasor(glimpse: &Glimpse) -> (f64, f64) {
    glimpse.modes.iter().filter(|m| m.is_usable()).fold((0.0, 0.0), |(c, s), m| {
        let angle = TAU * m.position / glimpse.free_spectral_range;
        (c + m.total_height() * angle.cos(), s + m.total_height() * angle.sin())
    })
}

fn first_cluster(usable: &[(usize, &Glimpse)]) -> Option<f64> {
    let range = usable.first()?.1.free_spectral_range;
    let (c, s) =
        usable.iter().take(CLUSTER_START).map(|(_, g)| phasor(g)).fold((0.0, 0.0), |a, b| (a.0 + b.0, a.1 + b.1));
    Some(s.atan2(c) / TAU * range)
}

fn cluster_offset(glimpse: &Glimpse, cluster: f64) -> Option<f64> {
    let (c, s) = phasor(glimpse);
    let place = s.atan2(c) / TAU * glimpse.free_spectral_range;
    let offset = unfold(place - cluster, 0.0, glimpse.free_spectral_range);
    offset.is_finite().then_some(offset)
}

fn comb_phase(glimpse: &Glimpse, origin: f64, cluster: f64, spacing: f64) -> Option<(f64, f64)> {
    let (mut c, mut s, mut sum) = (0.0, 0.0, 0.0);
    for mode in glimpse.modes.iter().filter(|m| m.is_usable()) {
        let place = unfold(mode.position - origin, cluster, glimpse.free_spectral_range);
        let weight = 1.0 / (mode.u_position.powi(2) + LEAST_U_POSITION.powi(2));
        let angle = TAU * place / spacing;
        c += weight * angle.cos();
        s += weight * angle.sin();
        sum += weight;
    }
    let agreement = c.hypot(s) / sum;
    (agreement >= LEAST_AGREEMENT).then(|| (s.atan2(c) / TAU, 1.0 / sum.sqrt() / spacing))
}

/// Robust standard deviation of a point about the straight line between its neighbours, 0 with fewer than 3 points.
fn scatter(points: &[TrackPoint]) -> f64 {
    let residuals: Vec<f64> = points
        .windows(3)
        .map(|w| {
            let share = (w[1].at - w[0].at) / (w[2].at - w[0].at);
            let line = w[0].phase + share * (w[2].phase - w[0].phase);
            (w[1].phase - line) / (1.0 + share.powi(2) + (1.0 - share).powi(2)).sqrt()
        })
        .collect();
    let sizes: Vec<f64> = residuals.iter().map(|r| r.abs()).collect();
    NORMAL_SD_PER_MAD * median(&sizes).unwrap_or(0.0)
}
