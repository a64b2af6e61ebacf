//! Says whose a jump of the comb is: the tube's or the interferometer's.
//! Must not find jumps.
//! Main function: [`attribute`].

use super::glimpse::Glimpse;
use super::jumps::Jump;
use super::line::{Line, Placed, place_modes};
use super::track::Track;

/// Glimpses on either side of a jump whose heights attribute it.
const WITNESSES: usize = 8;

/// Walk, in cycles, and glimpses from which the gain line near a moment is made: enough to fill the line, few enough
/// that a drifting interferometer does not smear it.
pub(crate) const LINE_CYCLES: f64 = 3.0;
/// See [`LINE_CYCLES`].
pub(crate) const LINE_GLIMPSES: usize = 60;

/// Difference of χ² that decides: 3 standard deviations.
const DECISIVE: f64 = 9.0;

/// Displacement of the line by drift between the time it was taken from and the jump: steps and reach of the search,
/// and the width of what is expected beforehand, Hz.
const DRIFT_STEP: f64 = 10e6;
const DRIFT_STEPS: i32 = 15;
const DRIFT_WIDTH: f64 = 75e6;

/// Whose a jump is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Owner {
    /// The tube's.
    Tube,
    /// The interferometer's, which moved by this much along the scan axis, Hz.
    Interferometer(f64),
    /// Nothing tells.
    Unknown,
}

/// Attributes jump `number` by mode heights; `shift(point)` is what is known of the interferometer's displacements
/// before it, Hz.
///
/// # Method
/// 1. Make the gain line from the glimpses before the jump (or after it, where there is under a cycle before).
/// 2. Find how far the line has drifted from there to the last glimpses on the same side of the jump.
/// 3. Compare the glimpses just beyond the jump with the line in that place (a hop of the tube), and with the line
///    displaced by the jump and any whole number of spacings (the interferometer's), all heights of a glimpse scaled
///    freely, as a knock may change them. A difference of χ² under 9 does not decide.
pub(crate) fn attribute(
    track: &Track,
    glimpses: &[Glimpse],
    jumps: &[Jump],
    number: usize,
    shift: impl Fn(usize) -> f64,
) -> Owner {
    let jump = &jumps[number];
    let placed = place_modes(track, glimpses, shift);
    let end = jumps.get(number + 1).map_or(track.points.len(), |next| next.point);
    let back = track.reach_back(jump.point, LINE_CYCLES, LINE_GLIMPSES);
    let on = track.reach_on(jump.point, LINE_CYCLES, LINE_GLIMPSES).min(end);
    let walked = |from: usize, to: usize| (track.points[to - 1].phase - track.points[from].phase).abs();
    let last = jump.point.saturating_sub(WITNESSES)..jump.point;
    let next = jump.point..(jump.point + WITNESSES).min(end);
    let (known, same_side, beyond, sense) = if walked(back, jump.point) >= 1.0 || number > 0 {
        (back..jump.point, last, next, 1.0)
    } else {
        (jump.point..on, next, last, -1.0)
    };
    let Some(line) = Line::of(&within(&placed, known)) else { return Owner::Unknown };
    let (same_side, beyond) = (within(&placed, same_side), within(&placed, beyond));
    let misfit = |modes: &[Placed], offset: f64| -> f64 {
        modes.chunk_by(|a, b| a.point == b.point).map(|glimpse| line.misfit(glimpse, offset)).sum()
    };
    let drifted = (-DRIFT_STEPS..=DRIFT_STEPS)
        .map(|k| f64::from(k) * DRIFT_STEP)
        .map(|offset| (misfit(&same_side, offset) + (offset / DRIFT_WIDTH).powi(2), offset))
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .map_or(0.0, |best| best.1);
    let tube = misfit(&beyond, drifted);
    let size = jump.size * track.spacing;
    let reach = (line.extent() / track.spacing).ceil() as i64 + 1;
    let interferometer = (-reach..=reach)
        .map(|m| size + m as f64 * track.spacing)
        .map(|by| (misfit(&beyond, drifted + sense * by), by))
        .min_by(|a, b| a.0.total_cmp(&b.0));
    match interferometer {
        Some((other, _)) if other - tube > DECISIVE => Owner::Tube,
        Some((other, by)) if tube - other > DECISIVE => Owner::Interferometer(by),
        _ => Owner::Unknown,
    }
}

/// Modes of a range of points.
pub(crate) fn within(placed: &[Placed], points: std::ops::Range<usize>) -> Vec<Placed> {
    placed.iter().filter(|p| points.contains(&p.point)).copied().collect()
}
