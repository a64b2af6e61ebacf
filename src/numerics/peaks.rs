//! Peaks of a sampled signal with height, prominence and width.
//! Must not smooth, scale or interpret the signal.
//! Main entries: [`find`], [`Peak`], [`parabolic_vertex`].

/// Which peaks [`find`] keeps. The default keeps all.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Options {
    /// Least height, included, in units of the signal; `None` for any.
    pub min_height: Option<f64>,
    /// Least prominence, included, in units of the signal; `None` for any.
    pub min_prominence: Option<f64>,
    /// Least distance between kept peaks, in samples; 0 and 1 keep all. Of two peaks closer than this the higher is
    /// kept, of equal ones the earlier.
    pub min_distance: usize,
}

/// One peak.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Peak {
    /// Sample position, from 0; the middle of a plateau, rounded down.
    pub index: usize,
    /// Signal at `index`.
    pub height: f64,
    /// Height above the higher of the two bases.
    pub prominence: f64,
    /// Sample of the lowest value between the peak and the nearest higher sample on the left (or the edge); the
    /// nearest of equals.
    pub left_base: usize,
    /// The same on the right.
    pub right_base: usize,
    /// Where the signal crosses height − prominence/2 on the left, in fractional samples, interpolated linearly.
    pub left_crossing: f64,
    /// The same on the right.
    pub right_crossing: f64,
    /// `right_crossing − left_crossing`, in samples.
    pub width_at_half_prominence: f64,
}

/// Finds the peaks of `signal`, in rising order of `index`.
///
/// * `signal`: samples at equal distances, any length. The first and last sample are never peaks. NaN is never a peak
///   or part of one and ends the search for bases as a higher sample would; infinite samples make prominences and
///   widths meaningless.
///
/// # Method
/// 1. A peak is a sample, or a run of equal samples, with a lower sample on both sides.
/// 2. Drop those below `min_height`; then, from the highest down, those closer than `min_distance` to one kept; then
///    those below `min_prominence`.
/// 3. Bases of all samples come from one pass over a stack in each direction, so the time grows as n, plus n·log n
///    for sorting by height.
/// 4. Widths: walk from the peak to the crossing. A peak inside the walk of another has less than half of its
///    prominence, so a sample is walked over a few times only.
///
/// Definitions: topographic prominence as used by `scipy.signal.find_peaks`, `peak_prominences`, `peak_widths`
/// (rel_height 0.5).
///
/// ```
/// use tubewright::numerics::peaks::{Options, find};
/// let found = find(&[0.0, 1.0, 0.5, 3.0, 0.0], &Options::default());
/// assert_eq!(found.iter().map(|p| (p.index, p.prominence)).collect::<Vec<_>>(), [(1, 0.5), (3, 3.0)]);
/// ```
pub fn find(signal: &[f64], options: &Options) -> Vec<Peak> {
    let high_enough = |&i: &usize| options.min_height.is_none_or(|least| signal[i] >= least);
    let indices: Vec<usize> = local_maxima(signal).into_iter().filter(high_enough).collect();
    // No base lies below the lowest sample: what does not rise far enough above it needs no bases.
    let lowest = signal.iter().copied().fold(f64::INFINITY, f64::min);
    let may_be_prominent = |&i: &usize| options.min_prominence.is_none_or(|least| signal[i] - lowest >= least);
    let walls: Vec<usize> = indices.into_iter().filter(may_be_prominent).collect();
    let bases = if signal.iter().any(|x| x.is_nan()) { all_bases(signal, &walls) } else { bases(signal, &walls) };
    let kept = keep_distance(signal, walls.clone(), options.min_distance);
    let mut all = walls.into_iter().zip(bases);
    let with_bases = kept.into_iter().filter_map(|index| all.find(|(wall, _)| *wall == index));
    let describe = |(index, (left_base, right_base)): (usize, (usize, usize))| {
        let prominence = signal[index] - signal[left_base].max(signal[right_base]);
        with_width(signal, index, prominence, left_base, right_base)
    };
    let prominent = |p: &Peak| options.min_prominence.is_none_or(|least| p.prominence >= least);
    with_bases.map(describe).filter(prominent).collect()
}

/// Bases of peaks among which every higher maximum is listed: only these end a stretch, so one pass finds the lowest
/// sample between neighbours, and the stack of [`left_minima`] runs over the peaks alone. No sample may be NaN.
fn bases(signal: &[f64], walls: &[usize]) -> Vec<(usize, usize)> {
    // Of equal samples the nearest to the peak counts: the last on its left, the first on its right.
    let lowest = |from: usize, to: usize, last: bool| {
        let lower = |best: usize, i: usize| {
            if signal[i] < signal[best] || (last && signal[i] == signal[best]) { i } else { best }
        };
        (from + 1..=to).fold(from, lower)
    };
    let one_way = |order: &mut dyn Iterator<Item = (usize, usize)>| {
        let mut stack: Vec<(f64, usize)> = Vec::new();
        let found = order.map(|(wall, valley)| {
            let mut lowest = valley;
            while let Some(&(_, minimum)) = stack.last().filter(|(top, _)| *top <= signal[wall]) {
                if signal[minimum] < signal[lowest] {
                    lowest = minimum;
                }
                stack.pop();
            }
            stack.push((signal[wall], lowest));
            lowest
        });
        found.collect::<Vec<usize>>()
    };
    let before = |k: usize| if k == 0 { 0 } else { walls[k - 1] };
    let after = |k: usize| walls.get(k + 1).copied().unwrap_or(signal.len() - 1);
    let left = one_way(&mut (0..walls.len()).map(|k| (walls[k], lowest(before(k), walls[k], true))));
    let right = one_way(&mut (0..walls.len()).rev().map(|k| (walls[k], lowest(walls[k], after(k), false))));
    left.into_iter().zip(right.into_iter().rev()).collect()
}

/// Bases of any number of peaks, in one pass over the signal each way.
fn all_bases(signal: &[f64], indices: &[usize]) -> Vec<(usize, usize)> {
    let left = left_minima(signal);
    let mirrored: Vec<f64> = signal.iter().rev().copied().collect();
    let right = left_minima(&mirrored);
    let last = signal.len() - 1;
    indices.iter().map(|&index| (left[index], last - right[last - index])).collect()
}

fn local_maxima(signal: &[f64]) -> Vec<usize> {
    let mut found = Vec::new();
    let mut i = 1;
    while i + 1 < signal.len() {
        let start = i;
        i += 1;
        if signal[start - 1] < signal[start] {
            while i < signal.len() && signal[i] == signal[start] {
                i += 1;
            }
            if i < signal.len() && signal[i] < signal[start] {
                found.push((start + i - 1) / 2);
            }
        }
    }
    found
}

/// A kept peak removes all within the distance; kept peaks are far apart, so each peak is looked at twice at most.
fn keep_distance(signal: &[f64], indices: Vec<usize>, min_distance: usize) -> Vec<usize> {
    if min_distance <= 1 {
        return indices;
    }
    let mut by_height: Vec<usize> = (0..indices.len()).collect();
    by_height.sort_by(|&a, &b| signal[indices[b]].total_cmp(&signal[indices[a]]));
    let mut kept = vec![true; indices.len()];
    for k in by_height {
        if !kept[k] {
            continue;
        }
        let near = |j: &usize| indices[*j].abs_diff(indices[k]) < min_distance;
        for j in (0..k).rev().take_while(near) {
            kept[j] = false;
        }
        for j in (k + 1..indices.len()).take_while(near) {
            kept[j] = false;
        }
    }
    indices.into_iter().zip(kept).filter_map(|(index, keep)| keep.then_some(index)).collect()
}

/// For each sample the position of the lowest value from it leftward, up to but without the first higher sample; the
/// nearest of equals.
fn left_minima(signal: &[f64]) -> Vec<usize> {
    // Each entry: a sample, and the position of the minimum of the stretch it stands for. Heights fall strictly along
    // the stack.
    let mut stack: Vec<(f64, usize)> = Vec::new();
    let mut minima = Vec::with_capacity(signal.len());
    for (i, &height) in signal.iter().enumerate() {
        let mut lowest = i;
        // NaN compares false: it stays on the stack as a wall.
        while let Some(&(_, minimum)) = stack.last().filter(|(top, _)| *top <= height) {
            if signal[minimum] < signal[lowest] {
                lowest = minimum;
            }
            stack.pop();
        }
        stack.push((height, lowest));
        minima.push(lowest);
    }
    minima
}

fn with_width(signal: &[f64], index: usize, prominence: f64, left_base: usize, right_base: usize) -> Peak {
    let level = signal[index] - 0.5 * prominence;
    let mut i = index;
    while i > left_base && level < signal[i] {
        i -= 1;
    }
    let mut left_crossing = i as f64;
    if signal[i] < level {
        left_crossing += (level - signal[i]) / (signal[i + 1] - signal[i]);
    }
    let mut i = index;
    while i < right_base && level < signal[i] {
        i += 1;
    }
    let mut right_crossing = i as f64;
    if signal[i] < level {
        right_crossing -= (level - signal[i]) / (signal[i - 1] - signal[i]);
    }
    Peak {
        index,
        height: signal[index],
        prominence,
        left_base,
        right_base,
        left_crossing,
        right_crossing,
        width_at_half_prominence: right_crossing - left_crossing,
    }
}

/// Vertex of the parabola through sample `index` and its two neighbours: position in fractional samples, and height.
///
/// `None` at the edges, out of range, if a value is not finite, or if the three do not form a maximum. The position
/// is within half a sample of `index` if that is a local maximum.
/// Formula: offset = (a − c) / (2·(a − 2b + c)), height = b − (a − c)·offset/4, for neighbours a, b, c (common
/// practice).
pub fn parabolic_vertex(signal: &[f64], index: usize) -> Option<(f64, f64)> {
    let (a, b, c) = (*signal.get(index.checked_sub(1)?)?, *signal.get(index)?, *signal.get(index.checked_add(1)?)?);
    let curvature = a - 2.0 * b + c;
    if !curvature.is_finite() || curvature >= 0.0 || b < a || b < c {
        return None;
    }
    let offset = 0.5 * (a - c) / curvature;
    Some((index as f64 + offset, b - 0.25 * (a - c) * offset))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn indices(signal: &[f64], options: &Options) -> Vec<usize> {
        find(signal, options).iter().map(|p| p.index).collect()
    }

    /// Counted on paper: peaks 2 (height 3), 5 (height 5), 8..10 plateau (height 4, middle 9).
    const BY_HAND: [f64; 13] = [0.0, 1.0, 3.0, 2.0, 2.5, 5.0, 1.0, 2.0, 4.0, 4.0, 4.0, 0.5, 0.5];

    #[test]
    fn an_array_by_hand() {
        let found = find(&BY_HAND, &Options::default());
        let facts: Vec<_> = found.iter().map(|p| (p.index, p.prominence, p.left_base, p.right_base)).collect();
        assert_eq!(facts, [(2, 1.0, 0, 3), (5, 4.5, 0, 11), (9, 3.0, 6, 11)]);
        // Peak 5: level 2.75; left between 2.5 (4) and 5 (5): 4.1; right between 5 (5) and 1 (6): 5.5625.
        assert_eq!((found[1].left_crossing, found[1].right_crossing), (4.1, 5.5625));
        // Peak 9: level 2.5; left between 2 (7) and 4 (8): 7.25; right between 4 (10) and 0.5 (11): 11 − 2/3.5.
        assert!((found[2].width_at_half_prominence - (11.0 - 2.0 / 3.5 - 7.25)).abs() < 1e-12);
    }

    #[test]
    fn options_drop_peaks() {
        let keep = |min_height, min_prominence, min_distance| {
            indices(&BY_HAND, &Options { min_height, min_prominence, min_distance })
        };
        assert_eq!(keep(Some(4.0), None, 0), [5, 9]);
        assert_eq!(keep(None, Some(3.0), 0), [5, 9]);
        assert_eq!(keep(None, Some(3.0 + 1e-9), 0), [5]);
        assert_eq!(keep(None, None, 4), [5, 9]);
        assert_eq!(keep(None, None, 3), [2, 5, 9]);
        assert_eq!(keep(None, None, 5), [5]);
        assert_eq!(indices(&[0.0, 1.0, 0.0, 1.0, 0.0], &Options { min_distance: 3, ..Options::default() }), [1]);
    }

    #[test]
    fn edges_plateaus_and_bad_values() {
        let all = Options::default();
        assert!(find(&[], &all).is_empty() && find(&[1.0], &all).is_empty() && find(&[1.0, 2.0], &all).is_empty());
        assert!(find(&[2.0, 1.0, 2.0], &all).is_empty() && find(&[1.0; 9], &all).is_empty());
        assert!(find(&[0.0, 1.0, 1.0], &all).is_empty());
        assert!(find(&[0.0, 1.0, 1.0, 2.0, 2.0], &all).is_empty());
        assert_eq!(indices(&[0.0, 1.0, 1.0, 0.0], &all), [1]);
        assert!(find(&[0.0, f64::NAN, 0.0, 1.0, f64::NAN], &all).is_empty());
        // NaN walls off the zero at 0: the base on the left is sample 2.
        let walled = find(&[0.0, f64::NAN, 0.5, 1.0, 0.2, 0.1], &all);
        assert_eq!((walled[0].left_base, walled[0].prominence), (2, 0.5));
        find(&[0.0, f64::INFINITY, 0.0, f64::NEG_INFINITY, 1.0, f64::NEG_INFINITY], &all);
    }

    /// The definitions, word for word, as slow loops.
    fn slow_bases(signal: &[f64], peak: usize) -> (usize, usize) {
        let (mut left, mut right) = (peak, peak);
        for i in (0..=peak).rev().take_while(|&i| signal[i] <= signal[peak]) {
            left = if signal[i] < signal[left] { i } else { left };
        }
        for i in (peak..signal.len()).take_while(|&i| signal[i] <= signal[peak]) {
            right = if signal[i] < signal[right] { i } else { right };
        }
        (left, right)
    }

    #[test]
    fn bases_agree_with_the_definition_on_noise() {
        // A small multiplicative generator; values on 16 levels, so that plateaus and ties are common.
        let mut state = 12345u64;
        let mut next = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 60) as f64
        };
        for _ in 0..200 {
            let signal: Vec<f64> = (0..80).map(|_| next()).collect();
            for peak in find(&signal, &Options::default()) {
                assert_eq!((peak.left_base, peak.right_base), slow_bases(&signal, peak.index), "{signal:?}");
            }
        }
    }

    /// Shapes that make naive searches quadratic: 200 000 samples must not take minutes.
    #[test]
    fn long_signals_are_quick() {
        let n = 200_000;
        let ripple = |i: usize| if i.is_multiple_of(2) { 0.0 } else { 0.75 };
        let rising: Vec<f64> = (0..n).map(|i| i as f64 * 0.1 + ripple(i)).collect();
        let roof: Vec<f64> = (0..n).map(|i| -(i as f64 - n as f64 / 2.0).abs() * 0.1 + ripple(i)).collect();
        let flat: Vec<f64> = (0..n).map(ripple).collect();
        for signal in [rising, roof, flat] {
            let found = find(&signal, &Options { min_distance: 5, ..Options::default() });
            assert!(found.len() > n / 10);
        }
    }

    #[test]
    fn vertex_of_a_parabola() {
        let signal: Vec<f64> = (0..5).map(|i| 3.0 - 2.0 * (i as f64 - 2.2).powi(2)).collect();
        let (at, height) = parabolic_vertex(&signal, 2).unwrap();
        assert!((at - 2.2).abs() < 1e-12 && (height - 3.0).abs() < 1e-12);
        for (index, signal) in [(0, &signal[..]), (4, &signal[..]), (usize::MAX, &signal[..]), (1, &[1.0; 3][..])] {
            assert_eq!(parabolic_vertex(signal, index), None);
        }
        assert_eq!(parabolic_vertex(&[0.0, f64::NAN, 0.0], 1), None);
    }
}
