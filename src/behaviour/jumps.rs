//! Finds sudden displacements of the comb in a track.
//! Must not say whose they are.
//! Main function: [`find`].

use super::track::Track;
use crate::numerics::linear;

/// Points on either side of a jump that the local fit uses.
const SIDE: usize = 8;

/// Points that must lie on either side of a jump: a displacement must persist over three captures.
const PERSIST: usize = 3;

/// Least displacement called a jump, Hz, and least number of standard uncertainties (definition of hop_count).
pub(crate) const LEAST_JUMP: f64 = 10e6;
const LEAST_SIGMAS: f64 = 5.0;

/// A sudden displacement of the comb.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Jump {
    /// First point after it.
    pub point: usize,
    /// Time half-way between the points before and after, s.
    pub at: f64,
    /// Displacement along the scan axis, modulo one spacing, in spacings.
    pub size: f64,
    /// Its standard uncertainty, in spacings.
    pub u_size: f64,
}

/// Jumps of the comb, in order of time.
///
/// # Method
/// 1. A step away from the straight line of the points before it makes a candidate.
/// 2. Local weighted fit of a parabola and a step over up to 8 points on either side, with and without the capture in
///    which the jump happened (its sweep may have seen both places).
/// 3. Kept where the step is over 5 u and over 10 MHz and the nearest three points on both sides lie on it.
/// 4. Of candidates closer than three captures the most significant stays.
pub(crate) fn find(track: &Track) -> Vec<Jump> {
    let mut found: Vec<Jump> = Vec::new();
    for after in PERSIST..track.points.len().saturating_sub(PERSIST - 1) {
        if !is_candidate(track, after) {
            continue;
        }
        let best = [after, after + 1]
            .into_iter()
            .filter_map(|first| step_at(track, after, first))
            .max_by(|a, b| significance(a).total_cmp(&significance(b)));
        let Some(jump) = best else { continue };
        match found.last_mut() {
            Some(last) if jump.point <= last.point + PERSIST => {
                if significance(&jump) > significance(last) {
                    *last = jump;
                }
            }
            _ => found.push(jump),
        }
    }
    found
}

fn significance(jump: &Jump) -> f64 {
    jump.size.abs() / jump.u_size
}

/// Cheap first look, so that the local fit is made at few points only.
fn is_candidate(track: &Track, after: usize) -> bool {
    let points = &track.points;
    let (far, last, this) = (&points[after - PERSIST], &points[after - 1], &points[after]);
    let rate = (last.phase - far.phase) / (last.at - far.at);
    let surprise = (this.phase - last.phase - rate * (this.at - last.at)).abs();
    surprise > (0.5 * LEAST_JUMP / track.spacing).max(3.0 * track.scatter)
}

/// Step between the points before `after` and those from `first` on, if it is a jump.
fn step_at(track: &Track, after: usize, first: usize) -> Option<Jump> {
    let points = &track.points;
    let before = after.saturating_sub(SIDE)..after;
    let behind = first..(first + SIDE).min(points.len());
    if before.len() < PERSIST || behind.len() < PERSIST {
        return None;
    }
    let at = 0.5 * (points[after - 1].at + points[first].at);
    let used: Vec<usize> = before.chain(behind).collect();
    let mut design = Vec::with_capacity(used.len() * 4);
    let scale = (points[*used.last()?].at - points[*used.first()?].at).max(1e-9);
    for &i in &used {
        let t = (points[i].at - at) / scale;
        design.extend([1.0, t, t * t, if i >= first { 1.0 } else { 0.0 }]);
    }
    if used.len() < 6 {
        return None;
    }
    let noise = |i: usize| points[i].u_phase.max(track.scatter).max(1e-9);
    // Values relative to the first point keep the sums small.
    let base = points[used[0]].phase;
    let values: Vec<f64> = used.iter().map(|&i| points[i].phase - base).collect();
    let weights: Vec<f64> = used.iter().map(|&i| 1.0 / noise(i)).collect();
    let fit = linear::weighted(&design, &values, &weights).ok()?;
    let inflation = fit.reduced_chi_square().map_or(1.0, |x| x.max(1.0)).sqrt();
    let size = *fit.coefficients.get(3)?;
    let u_size = fit.standard_error_from_weights(3)? * inflation;
    let persists =
        used.iter().enumerate().filter(|(_, i)| **i + PERSIST >= after && **i < first + PERSIST).all(|(row, &i)| {
            let model: f64 = design[4 * row..4 * row + 4].iter().zip(&fit.coefficients).map(|(a, c)| a * c).sum();
            (values[row] - model).abs() < (5.0 * noise(i)).max(size.abs() / 3.0)
        });
    let is_jump = persists && size.abs() > LEAST_SIGMAS * u_size && size.abs() * track.spacing > LEAST_JUMP;
    is_jump.then(|| Jump { point: first, at, size: size - size.round(), u_size })
}
