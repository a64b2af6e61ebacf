//! A baseline that moves under the peaks: mains hum, ambient light, a coupling capacitor, the ramp on the signal.
//! Must not decide whether it is to be taken out.
//! Main entry: [`flattened`].

use super::segment::{Segment, ranked};

/// Blocks over a ramp at most; a block is at least [`LINES`] line widths long.
const BLOCKS: f64 = 48.0;
/// Line widths in a block: so many that most of it is free of peaks.
const LINES: f64 = 10.0;
/// The value in a block that stands for the baseline, as a share of its samples: below the middle, as peaks point up.
const SHARE: f64 = 0.25;

/// The segment with its baseline taken out, and how far that moved, V.
///
/// * `width`: typical line width, samples.
///
/// 1. The lower quarter of each block is its baseline. 2. Straight lines between the blocks' middles are taken away.
///
/// Returns none where there are too few blocks to speak of.
pub(super) fn flattened(segment: &Segment, width: f64) -> Option<(Segment, f64)> {
    let n = segment.signal.len();
    let block = (n as f64 / BLOCKS).max(LINES * width).ceil() as usize;
    if n / block < 6 {
        return None;
    }
    let mut flat = segment.clone();
    let moved = flatten(&mut flat.signal, block);
    if let Some((main, crossed)) = &mut flat.pair {
        flatten(main, block);
        flatten(crossed, block);
    }
    Some((flat, moved))
}

/// Takes the baseline out of a signal; returns its range, V.
fn flatten(signal: &mut [f64], block: usize) -> f64 {
    let quarter = |chunk: &[f64]| ranked(&mut chunk.to_vec(), SHARE);
    // The rest that fills no block belongs to the last one.
    let n_blocks = (signal.len() / block).max(1);
    let levels: Vec<f64> = (0..n_blocks)
        .map(|k| quarter(&signal[k * block..if k + 1 == n_blocks { signal.len() } else { (k + 1) * block }]))
        .collect();
    let middle = ranked(&mut levels.clone(), 0.5);
    for (i, v) in signal.iter_mut().enumerate() {
        let place = ((i as f64 + 0.5) / block as f64 - 0.5).clamp(0.0, (n_blocks - 1) as f64);
        let k = (place as usize).min(n_blocks.saturating_sub(2));
        let next = levels[(k + 1).min(n_blocks - 1)];
        *v -= levels[k] + (next - levels[k]) * (place - k as f64) - middle;
    }
    levels.iter().copied().fold(f64::MIN, f64::max) - levels.iter().copied().fold(f64::MAX, f64::min)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_sine_under_peaks_is_taken_out() {
        let hum = |i: usize| 0.3 * (i as f64 / 160.0).sin();
        let peak = |i: usize| if i % 500 == 250 { 1.0 } else { 0.0 };
        let mut signal: Vec<f64> = (0..4000).map(|i| hum(i) + peak(i)).collect();
        let moved = flatten(&mut signal, 80);
        assert!((moved - 0.6).abs() < 0.06, "{moved}");
        let worst = (100..3900).map(|i| (signal[i] - peak(i)).abs()).fold(0.0, f64::max);
        // A straight line over half a period's sixth leaves the sagitta of the arc, and the quarter its offset.
        assert!(worst < 0.08, "{worst}");
    }
}
