//! First look at a ramp: where peaks stand, how high and how wide.
//! Must not fit.
//! Main entry: [`detect`].

use super::segment::{Segment, ranked, sampled};
use crate::numerics::{
    peaks::{self, Peak},
    smoothing,
};

/// A peak as first seen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Seen {
    /// Sample position in the segment.
    pub x: f64,
    /// Height above the baseline, V.
    pub height: f64,
    /// Full width at half of its prominence, samples.
    pub width: f64,
}

/// Share of the signal's range that a peak must stand out by.
const LEAST_SHARE: f64 = 0.012;
/// Noise deviations that a peak must stand out by after smoothing.
const LEAST_SIGMA: f64 = 6.0;
/// Noise deviations that the most prominent peak must exceed what noise alone is expected to span. The range of n normal deviates
/// passes 2·√(2 ln n) by so much less than once in a thousand captures, and σ itself is estimated to 2 or 3 %.
const OVER_NOISE: f64 = 2.0;
/// More peaks than this are clutter, not modes.
const MOST: usize = 160;

/// What the first look found.
pub(super) struct Look {
    /// Peaks by position.
    pub peaks: Vec<Seen>,
    /// Baseline, V.
    pub baseline: f64,
    /// Typical width of the strong peaks, samples.
    pub width: f64,
    /// No peak stands out by more than noise alone does: no light.
    pub only_noise: bool,
}

/// Samples beyond which a ramp is thinned for the first look.
const LONG: usize = 65_536;
/// Thinned samples that a line must keep.
const LEAST_WIDTH: f64 = 12.0;

/// Finds peaks; on a long ramp among means of blocks, as long as a line keeps a dozen of them: it needs less room and sees
/// weak peaks better.
pub(super) fn detect(segment: &Segment) -> Look {
    let mut block = (segment.signal.len() / LONG).max(1);
    while block > 1 {
        let thinned: Vec<f64> =
            segment.signal.chunks_exact(block).map(|c| c.iter().sum::<f64>() / block as f64).collect();
        let look = look(&thinned, segment.noise / (block as f64).sqrt());
        if look.width >= LEAST_WIDTH && !look.peaks.is_empty() {
            return look.spread(block as f64);
        }
        block /= 4;
    }
    look(&segment.signal, segment.noise)
}

impl Look {
    /// From blocks of samples to samples.
    fn spread(mut self, block: f64) -> Self {
        for peak in &mut self.peaks {
            peak.x = peak.x * block + (block - 1.0) / 2.0;
            peak.width *= block;
        }
        self.width *= block;
        self
    }
}

/// Finds peaks in two passes: the second on a signal smoothed by a third of the width the first one found.
fn look(signal: &[f64], noise: f64) -> Look {
    let baseline = ranked(&mut sampled(signal), 0.05);
    let range = signal.iter().copied().fold(f64::MIN, f64::max) - baseline;
    let first = pass(signal, baseline, (LEAST_SIGMA * noise * 1.4).max(0.05 * range));
    let rough = typical_width(&first);
    // Noise can break a top into several peaks, each too narrow: smooth once and look again.
    let half = half_window(rough);
    let smoothed = smoothing::moving_mean(signal, half);
    let again = pass(&smoothed, baseline, (LEAST_SIGMA * noise).max(0.05 * range));
    let width = typical_width(&again).max(1.0);
    let smoothed =
        if half_window(width) == half { smoothed } else { smoothing::moving_mean(signal, half_window(width)) };
    let noise = noise / (2.0 * half_window(width) as f64 + 1.0).sqrt();
    let top = smoothed.iter().cloned().fold(f64::MIN, f64::max) - baseline;
    let found = prominent(&smoothed, (LEAST_SIGMA * noise).max(LEAST_SHARE * top));
    let most = found.iter().map(|peak| peak.prominence).fold(0.0, f64::max);
    let only_noise = found.is_empty() || most <= span_of_noise(smoothed.len(), noise);
    let mut peaks = seen(found, baseline);
    peaks.truncate_strongest(MOST);
    Look { peaks, baseline, width, only_noise }
}

/// Prominence that noise of standard deviation `noise` may reach among n samples without any light, in units of `noise`'s.
///
/// The highest of n normal deviates lies near √(2 ln n)·σ and the lowest as far below (extreme values of a normal sample, e.g.
/// David & Nagaraja, Order Statistics); from the one to the other is the prominence of noise's highest peak: 7.8 σ of 2,000
/// samples, 8.9 σ of 20,000. It always passes a fixed 6 σ. Smoothed samples are not independent: they span less.
fn span_of_noise(n: usize, noise: f64) -> f64 {
    (2.0 * (2.0 * (n.max(2) as f64).ln()).sqrt() + OVER_NOISE) * noise
}

trait Truncate {
    fn truncate_strongest(&mut self, most: usize);
}

impl Truncate for Vec<Seen> {
    fn truncate_strongest(&mut self, most: usize) {
        if self.len() > most {
            self.sort_by(|a, b| b.height.total_cmp(&a.height));
            self.truncate(most);
            self.sort_by(|a, b| a.x.total_cmp(&b.x));
        }
    }
}

/// Half of a smoothing window that spans a third of a line's width.
fn half_window(width: f64) -> usize {
    (width / 6.0).round().clamp(0.0, 1e5) as usize
}

fn pass(signal: &[f64], baseline: f64, prominence: f64) -> Vec<Seen> {
    seen(prominent(signal, prominence), baseline)
}

fn prominent(signal: &[f64], prominence: f64) -> Vec<Peak> {
    peaks::find(signal, &peaks::Options { min_prominence: Some(prominence), ..Default::default() })
}

fn seen(peaks: Vec<Peak>, baseline: f64) -> Vec<Seen> {
    let seen = |peak: Peak| Seen {
        x: peak.index as f64,
        height: peak.height - baseline,
        width: peak.width_at_half_prominence.max(1.0),
    };
    peaks.into_iter().map(seen).collect()
}

/// Median width of the peaks at least half as high as the highest.
fn typical_width(peaks: &[Seen]) -> f64 {
    let top = peaks.iter().map(|p| p.height).fold(0.0, f64::max);
    let mut widths: Vec<f64> = peaks.iter().filter(|p| p.height >= 0.4 * top).map(|p| p.width).collect();
    widths.sort_by(f64::total_cmp);
    widths.get(widths.len() / 2).copied().unwrap_or(1.0)
}
