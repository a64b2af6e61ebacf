//! Drift of the interferometer, told from the place of the gain line, which the tube keeps.
//! Must not correct the walk: it says how much of it may not be the tube's.
//! Main function: [`line_drift`].

use super::glimpse::Glimpse;
use super::jumps;
use super::line::place_modes;
use super::track::{Track, pooled_spacing};
use crate::numerics::{linear::weighted, summary::straight_line};
use crate::uncertainty::{BudgetLine, Evaluation, Measured};

/// Fewest whole walk cycles for a drift.
const LEAST_CYCLES: usize = 4;

/// Fewest glimpses in a cycle for its centroid to be free of where in the cycle they lie.
const LEAST_GLIMPSES: usize = 12;

/// Rate at which the gain line moves along the scan axis, Hz/s, positive toward higher frequency.
///
/// The gain line of a tube stands still (pressure and temperature move it by a few megahertz, from memory), so that is
/// the drift of the interferometer, with opposite sign to a growth of its body.
///
/// * `glimpses`: in order of time, over at least four whole walk cycles of 12 glimpses or more; else `None`.
/// * `spacing`: mode spacing of the type, Hz.
///
/// # Method
/// 1. Height-weighted centroid of all modes over each whole walk cycle, which does not depend on the comb's phase.
/// 2. Straight line through the centroids.
pub fn line_drift(glimpses: &[Glimpse], spacing: f64) -> Option<Measured> {
    let track = Track::follow(glimpses, pooled_spacing(glimpses, spacing));
    let jumps = jumps::find(&track);
    let removed = |i: usize| jumps.iter().take_while(|j| j.point <= i).map(|j| j.size).sum::<f64>();
    let direction = track.direction(removed);
    let first = track.points.first()?.phase;
    let cycle = |point: usize| (direction * (track.points[point].phase - removed(point) - first)).floor() as i64;
    let whole = cycle(track.points.len() - 1);
    let placed = place_modes(&track, glimpses, |_| 0.0);
    let (mut times, mut centroids) = (Vec::new(), Vec::new());
    for modes in placed.chunk_by(|a, b| cycle(a.point) == cycle(b.point)) {
        let n = modes.chunk_by(|a, b| a.point == b.point).count();
        if n < LEAST_GLIMPSES || !(0..whole).contains(&cycle(modes[0].point)) {
            continue;
        }
        let height: f64 = modes.iter().map(|m| m.mode.total_height()).sum();
        let mean = |f: &dyn Fn(usize) -> f64| {
            (0..modes.len()).map(|i| modes[i].mode.total_height() * f(i)).sum::<f64>() / height
        };
        times.push(mean(&|i| track.points[modes[i].point].at));
        centroids.push(mean(&|i| modes[i].place));
    }
    if times.len() < LEAST_CYCLES {
        return None;
    }
    let fit = straight_line(&times, &centroids).ok()?;
    let line = BudgetLine::direct(
        "scatter",
        "scatter of the line's place about a straight line",
        Evaluation::TypeA,
        fit.u_slope?,
        fit.degrees_of_freedom as f64,
    );
    Some(Measured::with_line(-direction * fit.slope, line))
}

/// Change of a fitted time constant for each unit of a steady slope under the walk.
///
/// * `tau`: s. * `n_infinity`: mode spacings. * `seconds`: length of what was fitted, s.
///
/// Returns ∂τ/∂slope, s per (mode spacing a second); none if the fit does not tell the slope's shape from its own.
///
/// The slope t is projected on the derivatives of a + N(1 − e^(−t/τ)) by a, N and τ, at evenly spread times; the share
/// of the last is what the fit takes for a change of τ (first order; JCGM 100:2008, 5.1.3 for the use of it).
pub fn tau_per_slope(tau: f64, n_infinity: f64, seconds: f64) -> Option<f64> {
    const POINTS: usize = 200;
    if !(tau > 0.0 && seconds > 0.0 && n_infinity.is_finite()) {
        return None;
    }
    let times: Vec<f64> = (0..POINTS).map(|i| seconds * i as f64 / (POINTS - 1) as f64).collect();
    let row = |t: &f64| {
        let decay = (-t / tau).exp();
        [1.0, 1.0 - decay, -n_infinity * t / (tau * tau) * decay]
    };
    let design: Vec<f64> = times.iter().flat_map(row).collect();
    let fit = weighted(&design, &times, &[1.0; POINTS]).ok()?;
    fit.coefficients.get(2).copied().filter(|share| share.is_finite())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::behaviour::synthetic::Synthetic;

    #[test]
    fn planted_drift_is_found() {
        for (seed, drift, direction) in [(1, 0.0, -1.0), (2, 1.5e6, -1.0), (3, -0.8e6, 1.0)] {
            let tube = Synthetic { drift, direction, ..Synthetic::quad(seed) };
            let found = line_drift(&tube.glimpses(200.0, 800.0, 0.5), tube.spacing).unwrap();
            // The drift is planted on the scan axis; the made-up axis runs against frequency where the walk runs up.
            let planted = -direction * drift;
            assert!((found.value - planted).abs() < 0.1e6, "{found:?}, planted {planted}");
        }
        assert_eq!(line_drift(&Synthetic::quad(1).glimpses(2000.0, 2100.0, 1.0), 400e6), None);
        assert_eq!(line_drift(&[], 400e6), None);
    }
}
