//! Watches a series of glimpses for hops and swaps.
//! Must not judge what they mean for a verdict.
//! Main types: [`Watched`], [`Hop`], [`Swap`]; main function: [`watch`].

use super::glimpse::Glimpse;
use super::jumps::{self, Jump};
use super::line::{Line, Placed, place_modes};
use super::swaps;
use super::track::{Track, pooled_spacing};

/// Glimpses on either side of a jump whose heights attribute it.
const WITNESSES: usize = 8;

/// Difference of χ² that decides between tube and interferometer: 3 standard deviations.
const DECISIVE: f64 = 9.0;

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
/// 1. Follow the comb and find its jumps. 2. Build the gain line from all glimpses. 3. Attribute each jump: after a hop of the
///    tube the heights fit the line where it was; after one of the interferometer they fit the line displaced by the jump, plus
///    any whole number of spacings. Both are compared by χ² over the glimpses next to the jump; under 9 it stays open.
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
    let line = Line::of(&placed);
    let found = swaps::find(&track, &placed, &jumps);
    watched.axes_seen = found.axes_seen;
    watched.swaps = found
        .exchanges
        .into_iter()
        .map(|(point, at)| {
            let detuning = line.as_ref().and_then(|line| {
                let offsets = placed.iter().filter(|p| p.point == point).map(|p| p.place - line.middle);
                offsets.min_by(|a, b| a.abs().total_cmp(&b.abs()))
            });
            Swap { at, detuning: detuning.map(|d| -direction * d) }
        })
        .collect();
    watched
}

/// Whose a jump is.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Owner {
    Tube,
    Interferometer(f64),
    Unknown,
}

/// Attributes one jump by mode heights; `shift` holds what is known of the interferometer before it.
fn attribute(
    track: &Track,
    glimpses: &[Glimpse],
    jumps: &[Jump],
    number: usize,
    shift: impl Fn(usize) -> f64,
) -> Owner {
    let jump = &jumps[number];
    let placed = place_modes(track, glimpses, shift);
    let start = if number == 0 { 0 } else { jumps[number - 1].point };
    let end = jumps.get(number + 1).map_or(track.points.len(), |next| next.point);
    // The line as seen before the jump; where that is too little of a cycle, what comes after tells as much.
    let before: Vec<Placed> = placed.iter().filter(|p| p.point < jump.point).copied().collect();
    let after: Vec<Placed> = placed.iter().filter(|p| p.point >= jump.point && p.point < end).copied().collect();
    let walked = |from: usize, to: usize| (track.points[to - 1].phase - track.points[from].phase).abs();
    let (known, tested, sense) = if walked(0, jump.point) >= walked(jump.point, end) || number > 0 {
        (before, nearest(&after, jump.point, true), 1.0)
    } else {
        let near: Vec<Placed> = before.into_iter().filter(|p| p.point >= start).collect();
        (after, nearest(&near, jump.point, false), -1.0)
    };
    let Some(line) = Line::of(&known) else { return Owner::Unknown };
    let misfit = |offset: f64| -> f64 {
        tested.chunk_by(|a, b| a.point == b.point).map(|glimpse| line.misfit(glimpse, offset)).sum()
    };
    let tube = misfit(0.0);
    let size = jump.size * track.spacing;
    let reach = (line.extent() / track.spacing).ceil() as i64 + 1;
    let interferometer = (-reach..=reach)
        .map(|m| size + m as f64 * track.spacing)
        .map(|by| (misfit(sense * by), by))
        .min_by(|a, b| a.0.total_cmp(&b.0));
    match interferometer {
        Some((other, _)) if other - tube > DECISIVE => Owner::Tube,
        Some((other, by)) if tube - other > DECISIVE => Owner::Interferometer(by),
        _ => Owner::Unknown,
    }
}

/// Modes of the glimpses next to a jump.
fn nearest(placed: &[Placed], jump: usize, after: bool) -> Vec<Placed> {
    let near = |p: &&Placed| if after { p.point < jump + WITNESSES } else { p.point + WITNESSES >= jump };
    placed.iter().filter(near).copied().collect()
}

#[cfg(test)]
#[path = "watch_tests.rs"]
mod tests;
