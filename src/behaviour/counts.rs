//! Counts modes over a walk cycle, and gathers the points of the gain line.
//! Must not decide which peaks are modes: that is the sweep's.
//! Main types: [`Counts`], [`GainPoint`].

use super::glimpse::Glimpse;
use super::jumps;
use super::line::{Line, Placed, place_modes};
use super::track::{Track, pooled_spacing};
use crate::numerics::distributions::normal_cdf;

/// Phases of a walk cycle at which the comb must have been seen (definition of mode_count).
const LEAST_PHASES: usize = 20;

/// Bins of a cycle that phases are told apart by: twice as many, so that captures need not be evenly spread.
const PHASE_BINS: usize = 2 * LEAST_PHASES;

/// A mode this many standard uncertainties or fewer from the floor leaves a doubt.
const DOUBT_SIGMAS: f64 = 2.0;

/// A peak is a mode from this many standard uncertainties on.
const LEAST_SIGMAS: f64 = 5.0;

/// Least and greatest number of modes over at least one walk cycle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Counts {
    /// Least number.
    pub min: u32,
    /// Greatest number.
    pub max: u32,
    /// Probability that the least number is right: that the mode nearest to the floor is on the side found, in the
    /// clearest glimpse with that number.
    pub min_probability: f64,
    /// The same for the greatest number.
    pub max_probability: f64,
    /// Even the clearest glimpse with the least number has a mode within two u of the floor.
    pub min_doubt: bool,
    /// The same for the greatest number.
    pub max_doubt: bool,
    /// Walk cycles covered.
    pub cycles: f64,
    /// Different phases of the cycle seen, of 40.
    pub phases_seen: u32,
}

/// One point of the gain line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GainPoint {
    /// Distance from the middle of the line, Hz, positive toward higher frequency.
    pub detuning: f64,
    /// Height, the greatest of all being 1.
    pub height: f64,
    /// Its standard uncertainty.
    pub u_height: f64,
}

/// Counts modes.
///
/// * `glimpses`: of the cycles to count over, in order of time.
/// * `floor`: least height of a mode over the strongest of its capture; it must stand 5 u above nothing too.
/// * `spacing`: mode spacing of the type, Hz.
///
/// `None` under one whole cycle or 20 phases.
pub fn count_modes(glimpses: &[Glimpse], floor: f64, spacing: f64) -> Option<Counts> {
    let track = Track::follow(glimpses, pooled_spacing(glimpses, spacing));
    let (first, last) = (track.points.first()?, track.points.last()?);
    let cycles = (last.phase - first.phase).abs();
    let mut phases: Vec<usize> =
        track.points.iter().map(|p| (p.phase.rem_euclid(1.0) * PHASE_BINS as f64) as usize % PHASE_BINS).collect();
    phases.sort_unstable();
    phases.dedup();
    // A window cut at one cycle exactly may fall short by the scatter of its ends.
    if cycles < 0.98 || phases.len() < LEAST_PHASES {
        return None;
    }
    let seen: Vec<(u32, f64)> = track.points.iter().filter_map(|p| count(&glimpses[p.index], floor)).collect();
    let clearest = |n: u32| seen.iter().filter(|s| s.0 == n).map(|s| s.1).fold(0.0, f64::max);
    let min = seen.iter().map(|s| s.0).min()?;
    let max = seen.iter().map(|s| s.0).max()?;
    Some(Counts {
        min,
        max,
        min_probability: normal_cdf(clearest(min)),
        max_probability: normal_cdf(clearest(max)),
        min_doubt: clearest(min) < DOUBT_SIGMAS,
        max_doubt: clearest(max) < DOUBT_SIGMAS,
        cycles,
        phases_seen: phases.len() as u32,
    })
}

/// Modes above the floor, and how many u the one nearest to the floor is away from it.
fn count(glimpse: &Glimpse, floor: f64) -> Option<(u32, f64)> {
    let modes: Vec<_> = glimpse.modes.iter().filter(|m| m.is_usable()).collect();
    let strongest = modes.iter().map(|m| m.total_height()).fold(0.0, f64::max);
    let mut n = 0;
    let mut nearest = f64::INFINITY;
    for mode in modes {
        let u = mode.u_total_height().max(f64::MIN_POSITIVE);
        let bound = (floor * strongest).max(LEAST_SIGMAS * u);
        let above = (mode.total_height() - bound) / u;
        n += u32::from(above >= 0.0);
        nearest = nearest.min(above.abs());
    }
    (n > 0).then_some((n, nearest))
}

/// Points of the gain line: every mode of every glimpse at its distance from the middle, which is the centroid of the
/// profile.
///
/// Heights are the sum of both photodiodes. Empty where there are too few modes for a profile.
pub fn gain_points(glimpses: &[Glimpse], spacing: f64) -> Vec<GainPoint> {
    let track = Track::follow(glimpses, pooled_spacing(glimpses, spacing));
    let jumps = jumps::find(&track);
    let removed = |i: usize| jumps.iter().take_while(|j| j.point <= i).map(|j| j.size).sum::<f64>();
    let direction = track.direction(removed);
    let placed = place_modes(&track, glimpses, |_| 0.0);
    let Some(line) = Line::of(&placed) else { return Vec::new() };
    let greatest = placed.iter().map(|p| p.mode.total_height()).fold(0.0, f64::max);
    let point = |p: &Placed| GainPoint {
        detuning: -direction * (p.place - line.middle),
        height: p.mode.total_height() / greatest,
        u_height: p.mode.u_total_height() / greatest,
    };
    placed.iter().map(point).collect()
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::behaviour::synthetic::Synthetic;

    #[test]
    fn counts_alternate_between_neighbours() {
        // Span 1.56 GHz less its edges, spacing 399.7 MHz: 3 or 4; 1.44 GHz at 999.3 MHz: 1 or 2.
        for (tube, min, max) in [(Synthetic::quad(1), 3, 4), (Synthetic::twin(1), 1, 2)] {
            let counts = count_modes(&tube.glimpses(600.0, 700.0, 0.5), 0.02, tube.spacing).unwrap();
            assert_eq!((counts.min, counts.max), (min, max), "{counts:?}");
            assert!(!counts.min_doubt && !counts.max_doubt && counts.cycles > 1.0);
        }
    }

    #[test]
    fn under_a_cycle_or_twenty_phases_there_is_no_count() {
        let tube = Synthetic::quad(1);
        assert_eq!(count_modes(&tube.glimpses(2000.0, 2060.0, 0.5), 0.02, tube.spacing), None);
        // Nineteen captures.
        assert_eq!(count_modes(&tube.glimpses(600.0, 690.0, 5.0), 0.02, tube.spacing), None);
        assert_eq!(count_modes(&[], 0.02, tube.spacing), None);
    }

    #[test]
    fn a_mode_at_the_floor_leaves_a_doubt() {
        let tube = Synthetic::quad(1);
        let mut glimpses = tube.glimpses(600.0, 700.0, 0.5);
        for glimpse in &mut glimpses {
            let strongest = glimpse.modes.iter().map(|m| m.total_height()).fold(0.0, f64::max);
            for mode in glimpse.modes.iter_mut().skip(3) {
                (mode.height, mode.crossed) = (0.102 * strongest, Some(0.0));
                mode.u_height = 0.002 * strongest;
            }
        }
        let counts = count_modes(&glimpses, 0.1, tube.spacing).unwrap();
        assert_eq!(counts.max, 4);
        assert!(counts.max_doubt && counts.max_probability < 0.95 && !counts.min_doubt, "{counts:?}");
    }

    #[test]
    fn the_gain_line_has_its_middle() {
        for direction in [-1.0, 1.0] {
            let tube = Synthetic { direction, ..Synthetic::quad(2) };
            let points = gain_points(&tube.glimpses(300.0, 700.0, 0.5), tube.spacing);
            let (near, far): (Vec<GainPoint>, Vec<GainPoint>) = points.iter().partition(|p| p.detuning.abs() < 0.1e9);
            assert!(near.iter().all(|p| p.height > 0.85) && far.iter().any(|p| p.height < 0.1));
            // Half range 0.78 GHz; the middle is a centroid of bins of 26 MHz.
            let (low, high) = points.iter().fold((0f64, 0f64), |r, p| (r.0.min(p.detuning), r.1.max(p.detuning)));
            assert!((low + high).abs() < 0.02e9, "{low} {high}");
        }
    }
}
