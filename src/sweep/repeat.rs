//! One ramp cut out of a record that shows no ramp, by the signal's own repeat.
//! Must not measure: it proposes stretches in which the orders repeat one way.
//! Main entry: [`stretches`].

use super::{
    detect::{Seen, detect},
    orders,
    segment::Segment,
};
use crate::numerics::spectra::autocorrelation;

/// Blocks the record is thinned to for its autocorrelation.
const THINNED: usize = 16_384;
/// Least correlation of a record with itself one ramp period on.
const LEAST: f64 = 0.7;
/// A shorter period is believed before a longer one if it correlates this share as well.
const AS_WELL: f64 = 0.93;
/// Places within a period at which a stretch may begin.
const PLACES: usize = 24;
/// Lengths tried, in periods: a sawtooth rises for most of its period, a triangle for half.
const LENGTHS: [f64; 2] = [0.9, 0.44];
/// Stretches of each length handed on.
const BEST: usize = 3;

/// A stretch of samples and the same one ramp period later: what both say must agree.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Stretch {
    /// First sample, one past the last.
    pub range: (usize, usize),
    /// The same, one period on.
    pub again: (usize, usize),
}

/// Ramp period of a record that holds more than one, in samples, and stretches of one ramp, the likeliest of each length first.
///
/// 1. The record is thinned and compared with itself (autocorrelation): the ramp's repeat is the shortest lag at which it
///    is nearly as like itself as at the best one. 2. Stretches of one period are tried; in the right ones the peaks repeat
///    from order to order.
pub(super) fn stretches(segment: &Segment) -> Option<(f64, Vec<Stretch>)> {
    let n = segment.signal.len();
    let period = period(&segment.signal)?;
    let look = detect(segment);
    let mut found = Vec::new();
    for length in LENGTHS {
        let mut scored: Vec<(f64, Stretch)> = Vec::new();
        for place in 0..PLACES {
            let from = period * place as f64 / PLACES as f64;
            let range = (from as usize, (from + length * period) as usize);
            let again = ((from + period) as usize, (from + (1.0 + length) * period) as usize);
            if again.1 > n {
                continue;
            }
            let within = look.peaks.iter().filter(|peak| peak.x >= range.0 as f64 && peak.x < range.1 as f64);
            let peaks: Vec<Seen> = within.map(|peak| Seen { x: peak.x - range.0 as f64, ..*peak }).collect();
            if let Some(orders) = orders::find(&peaks, range.1 - range.0, look.width, None) {
                scored.push((orders.score, Stretch { range, again }));
            }
        }
        scored.sort_by(|a, b| b.0.total_cmp(&a.0));
        found.extend(scored.into_iter().take(BEST).map(|(_, stretch)| stretch));
    }
    Some((period, found))
}

/// Samples after which the whole record repeats.
fn period(signal: &[f64]) -> Option<f64> {
    let block = signal.len().div_ceil(THINNED).max(1);
    let thinned: Vec<f64> = signal.chunks(block).map(|c| c.iter().sum::<f64>() / c.len() as f64).collect();
    let n = thinned.len();
    let raw = autocorrelation(&thinned)?;
    // Fewer samples overlap at a longer lag.
    let like = |lag: usize| raw[lag] * n as f64 / (n - lag) as f64;
    let longest = n * 7 / 10;
    let is_top = |&lag: &usize| like(lag - 1) < like(lag) && like(lag) >= like(lag + 1);
    let tops: Vec<usize> = (n / 50 + 1..longest).filter(is_top).filter(|&lag| like(lag) > LEAST).collect();
    let best = tops.iter().map(|&lag| like(lag)).fold(0.0, f64::max);
    tops.into_iter().find(|&lag| like(lag) >= AS_WELL * best).map(|lag| (lag * block) as f64)
}
