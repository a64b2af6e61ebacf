//! Finds exchanges of polarization axis between the two families of modes.
//! Must not find or attribute jumps of the comb.
//! Main function: [`find`].

use super::jumps::Jump;
use super::line::Placed;
use super::track::Track;
use crate::numerics::summary::median;

/// Glimpses that must agree on either side of an exchange: it must persist over three captures.
const PERSIST: usize = 3;

/// Least difference between the families' shares of crossed light for them to be told apart.
const LEAST_CONTRAST: f64 = 0.1;

/// Least share of the full contrast for a glimpse to have a say.
const LEAST_SAY: f64 = 0.5;

/// What was found.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct Exchanges {
    /// (last point before, time half-way to the next), s.
    pub exchanges: Vec<(usize, f64)>,
    /// Whether the families could be told apart at all.
    pub axes_seen: bool,
}

/// Exchanges of axis.
///
/// # Method
/// 1. Share of crossed light q of each mode; the families' levels are the middles of the lower and upper half of all
///    shares.
/// 2. A mode keeps its number on the comb while it walks, and neighbours are at right angles: the sign of (−1)^k·(q −
///    middle) is one and the same for all modes of all glimpses. A glimpse's sense is that sign where its modes agree.
/// 3. An exchange is a change of sense between glimpses that follow each other, with three of one sense before and
///    three of the other after. A jump of the comb (known only modulo one spacing) starts a new count.
pub(crate) fn find(track: &Track, placed: &[Placed], jumps: &[Jump]) -> Exchanges {
    let shares: Vec<f64> = placed.iter().filter_map(share).collect();
    let Some((low, high)) = levels(shares) else { return Exchanges::default() };
    if high - low < LEAST_CONTRAST {
        return Exchanges::default();
    }
    let senses: Vec<(usize, i8)> = placed
        .chunk_by(|a, b| a.point == b.point)
        .filter_map(|modes| Some((modes.first()?.point, sense(modes, low, high)?)))
        .collect();
    let jumped = |from: usize, to: usize| jumps.iter().any(|j| from < j.point && j.point <= to);
    let mut found = Exchanges { exchanges: Vec::new(), axes_seen: true };
    for next in PERSIST..senses.len().saturating_sub(PERSIST - 1) {
        let around = &senses[next - PERSIST..next + PERSIST];
        let (before, after) = around.split_at(PERSIST);
        let steady = |side: &[(usize, i8)]| side.iter().all(|s| s.1 == side[0].1);
        let changes = steady(before) && steady(after) && before[0].1 != after[0].1;
        if changes && !jumped(around[0].0, around[2 * PERSIST - 1].0) {
            let (from, to) = (senses[next - 1].0, senses[next].0);
            found.exchanges.push((from, 0.5 * (track.points[from].at + track.points[to].at)));
        }
    }
    found
}

/// Share of a mode's light in the crossed photodiode.
fn share(placed: &Placed) -> Option<f64> {
    let crossed = placed.mode.crossed?;
    let sum = placed.mode.height + crossed;
    (sum > 0.0 && crossed.is_finite()).then(|| (crossed / sum).clamp(0.0, 1.0))
}

fn levels(shares: Vec<f64>) -> Option<(f64, f64)> {
    if shares.len() < 2 * PERSIST {
        return None;
    }
    let lowest = shares.iter().copied().fold(f64::INFINITY, f64::min);
    let highest = shares.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let middle = 0.5 * (lowest + highest);
    let (lower, upper): (Vec<f64>, Vec<f64>) = shares.into_iter().partition(|q| *q < middle);
    if lower.len() < PERSIST || upper.len() < PERSIST {
        return None;
    }
    Some((median(&lower)?, median(&upper)?))
}

/// +1 or −1 where the modes of a glimpse agree, weighted by height; `None` where they do not say.
fn sense(modes: &[Placed], low: f64, high: f64) -> Option<i8> {
    let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
    let (mut sum, mut weights) = (0.0, 0.0);
    for mode in modes {
        let Some(q) = share(mode) else { continue };
        let parity = if mode.comb_index.rem_euclid(2) == 0 { 1.0 } else { -1.0 };
        let weight = mode.mode.total_height();
        sum += weight * parity * ((q - middle) / half).clamp(-1.0, 1.0);
        weights += weight;
    }
    let say = sum / weights;
    (say.abs() >= LEAST_SAY).then_some(if say > 0.0 { 1 } else { -1 })
}
