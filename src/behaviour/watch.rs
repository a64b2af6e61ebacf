//! Watches a series of glimpses for hops and swaps.
//! Must not judge what they mean for a verdict.
//! Main types: [`Watched`], [`Hop`], [`Swap`]; main function: [`watch`].

use super::attribution::{LINE_CYCLES, LINE_GLIMPSES, Owner, attribute, within};
use super::glimpse::Glimpse;
use super::jumps;
use super::line::{Line, Placed, place_modes};
use super::swaps;
use super::track::{Track, pooled_spacing};

/// What was seen over a series of glimpses.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Watched {
    /// Displacements of the comb that are the tube's own: the mode heights moved along the gain line with it.
    pub hops: Vec<Hop>,
    /// Displacements that neither mode heights nor anything else attribute.
    pub unattributed: Vec<Hop>,
    /// Displacements of the interferometer: the gain line moved along with the comb.
    pub interferometer: Vec<Hop>,
    /// Exchanges of axis.
    pub swaps: Vec<Swap>,
    /// Walk cycles watched.
    pub cycles: f64,
    /// Whether the polarization families could be told apart, so that swaps would have been seen.
    pub axes_seen: bool,
    /// Glimpses used.
    pub n_glimpses: usize,
}

/// A sudden displacement of the comb.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Hop {
    /// Seconds since first light: half-way between the glimpses before and after.
    pub at: f64,
    /// Displacement modulo one spacing, Hz, positive toward higher frequency (against the walk).
    pub size: f64,
    /// Its standard uncertainty, Hz.
    pub u_size: f64,
    /// Mode heights say that it is the tube's.
    pub attributed: bool,
}

/// Exchange of axis by both families.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Swap {
    /// Seconds since first light: half-way between the glimpses before and after.
    pub at: f64,
    /// Detuning from the middle of the line of the mode nearest to it, Hz, positive toward higher frequency.
    pub detuning: Option<f64>,
}

/// Finds hops and swaps.
///
/// * `glimpses`: in order of time.
/// * `spacing`: mode spacing of the type, Hz; the measured one is used where there is one.
///
/// # Method
/// 1. Follow the comb and find its jumps. 2. Build the gain line from all glimpses. 3. Attribute each jump: after a hop
///    of the tube the heights fit the line where it was; after one of the interferometer they fit the line displaced by
///    the jump, plus any whole number of spacings.
/// 4. Swaps: see [`swaps`].
pub fn watch(glimpses: &[Glimpse], spacing: f64) -> Watched {
    let track = Track::follow(glimpses, pooled_spacing(glimpses, spacing));
    let (Some(first), Some(last)) = (track.points.first(), track.points.last()) else { return Watched::default() };
    let jumps = jumps::find(&track);
    let removed = |i: usize| jumps.iter().take_while(|j| j.point <= i).map(|j| j.size).sum::<f64>();
    let direction = track.direction(removed);
    let walk = direction * (last.phase - removed(track.points.len() - 1) - first.phase);
    let mut watched = Watched { cycles: walk, n_glimpses: track.points.len(), ..Watched::default() };

    // Displacements of the interferometer found so far: (first point after, Hz).
    let mut shifts: Vec<(usize, f64)> = Vec::new();
    for (number, jump) in jumps.iter().enumerate() {
        let shift = |i: usize| shifts.iter().filter(|s| s.0 <= i).map(|s| s.1).sum::<f64>();
        let owner = attribute(&track, glimpses, &jumps, number, shift);
        let hop = Hop {
            at: jump.at,
            size: -direction * jump.size * track.spacing,
            u_size: jump.u_size * track.spacing,
            attributed: owner == Owner::Tube,
        };
        match owner {
            Owner::Tube => watched.hops.push(hop),
            Owner::Unknown => watched.unattributed.push(hop),
            Owner::Interferometer(by) => {
                shifts.push((jump.point, by));
                watched.interferometer.push(hop);
            }
        }
    }
    let placed = place_modes(&track, glimpses, |i| shifts.iter().filter(|s| s.0 <= i).map(|s| s.1).sum());
    let found = swaps::find(&track, &placed, &jumps);
    watched.axes_seen = found.axes_seen;
    let detuning = |point: usize| nearest_to_middle(&track, &placed, point).map(|d| -direction * d);
    watched.swaps = found.exchanges.iter().map(|(point, at)| Swap { at: *at, detuning: detuning(*point) }).collect();
    watched
}

/// Distance along the scan axis from the middle of the line to the mode nearest to it.
fn nearest_to_middle(track: &Track, placed: &[Placed], point: usize) -> Option<f64> {
    let from = track.reach_back(point, 0.5 * LINE_CYCLES, LINE_GLIMPSES / 2);
    let to = track.reach_on(point, 0.5 * LINE_CYCLES, LINE_GLIMPSES / 2);
    let line = Line::of(&within(placed, from..to))?;
    let offsets = placed.iter().filter(|p| p.point == point).map(|p| p.place - line.middle);
    offsets.min_by(|a, b| a.abs().total_cmp(&b.abs()))
}

#[cfg(test)]
#[path = "watch_tests.rs"]
mod tests;
