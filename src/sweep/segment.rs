//! From a capture to one ramp: where it runs one way, which way the signal points, its noise, what is clipped.
//! Must not look for peaks.
//! Main type: [`Segment`].

use crate::capture::Capture;

/// One ramp of a capture, signal pointing up.
#[derive(Debug, Clone)]
pub(super) struct Segment {
    /// First sample in the capture.
    pub start: usize,
    /// One past the last.
    pub end: usize,
    /// Signal, upward: all light, both photodiodes together where the bench has two.
    pub signal: Vec<f64>,
    /// The two photodiodes apart, upward: main and crossed.
    pub pair: Option<(Vec<f64>, Vec<f64>)>,
    /// Samples that may be fitted (not clipped).
    pub usable: Vec<bool>,
    /// The ramp rises.
    pub rising: bool,
    /// The signal was turned over.
    pub inverted: bool,
    /// A ramp channel was usable.
    pub has_ramp: bool,
    /// Standard deviation of the noise, V.
    pub noise: f64,
    /// Smallest step of the digitizer seen, V.
    pub step: f64,
    /// Sample position (in the segment) of the reference voltage.
    pub reference: f64,
    /// Ramp voltage at the segment's first sample, V, of the straight line through the ramp; seconds without a ramp.
    pub ramp_start: f64,
    /// Volts (seconds) a sample.
    pub ramp_slope: f64,
    /// Samples left out as clipped.
    pub n_clipped: usize,
    /// Seconds a sample.
    pub dt: f64,
}

impl Segment {
    /// Ramp voltage at a sample position, V.
    pub fn ramp_at(&self, x: f64) -> f64 {
        self.ramp_start + self.ramp_slope * x
    }
}

/// Blocks the ramp is thinned to before its slope is judged: fine enough to find the turn within 1 %.
const BLOCKS: usize = 128;
/// A block belongs to a ramp while its slope is at least this share of the median slope.
const SLOPE_SHARE: f64 = 0.3;

/// Blocks without slope inside a ramp that do not end it: a monitor of forty levels stands still for two.
const ODD_BLOCKS: usize = 3;

/// A ramp this many times quicker than another is a flyback.
const FLYBACK: usize = 4;

/// Finds the longest one-way ramp of a capture and prepares its signal; the whole capture where no channel ramps.
pub(super) fn find(capture: &Capture) -> Segment {
    let n = capture.photodiode.len();
    let found = capture.ramp.as_deref().filter(|ramp| ramp.len() == n).and_then(one_way);
    cut(capture, found.unwrap_or((0, n)), found.is_some())
}

/// A ramp shorter than this share of the main one is left alone: a flyback.
const LEAST_OTHER: f64 = 0.3;
/// Fewest samples of another ramp that is worth a look.
const FEWEST_OTHER: f64 = 100.0;

/// The longest ramp of what the main one leaves of a capture, if it is as good a ramp and points the same way up.
pub(super) fn other(capture: &Capture, main: &Segment) -> Option<Segment> {
    let n = capture.photodiode.len();
    let (from, to) = if main.start > n - main.end { (0, main.start) } else { (main.end, n) };
    let least = (LEAST_OTHER * (main.end - main.start) as f64).max(FEWEST_OTHER);
    let ramp = capture.ramp.as_deref().filter(|ramp| ramp.len() == n && (to - from) as f64 >= least)?;
    let (start, end) = one_way(&ramp[from..to]).filter(|(start, end)| (end - start) as f64 >= least)?;
    let other = cut(capture, (from + start, from + end), true);
    (other.inverted == main.inverted).then_some(other)
}

/// Longest stretch over which the ramp runs one way, up to its turns.
fn one_way(ramp: &[f64]) -> Option<(usize, usize)> {
    longest_ramp(ramp).map(|found| up_to_the_turn(ramp, found))
}

/// Cuts samples (first, one past last) out of a capture and prepares their signal.
///
/// * `has_ramp`: the ramp channel runs one way there; else time stands for it.
pub(super) fn cut(capture: &Capture, (start, end): (usize, usize), has_ramp: bool) -> Segment {
    let n = capture.photodiode.len();
    let line = match (&capture.ramp, has_ramp) {
        (Some(ramp), true) => ramp_line(&ramp[start..end]),
        _ => None,
    };
    // Without a ramp, time stands for it.
    let (ramp_start, ramp_slope) = line.unwrap_or((start as f64 * capture.time.step, capture.time.step));
    let rising = ramp_slope > 0.0 || line.is_none();
    let reference = line.map_or((end - start) as f64 / 2.0, |line| reference_on(line, end - start));
    let main = &capture.photodiode[start..end];
    let crossed = capture.crossed.as_ref().filter(|crossed| crossed.len() == n).map(|crossed| &crossed[start..end]);
    // One photodiode may see one family of modes only: peaks are sought in both together.
    let mut signal: Vec<f64> = match crossed {
        Some(crossed) => main.iter().zip(crossed).map(|(a, b)| a + b).collect(),
        None => main.to_vec(),
    };
    let inverted = points_down(&signal);
    if inverted {
        signal.iter_mut().for_each(|v| *v = -*v);
    }
    let upward = |values: &[f64]| if inverted { values.iter().map(|v| -v).collect() } else { values.to_vec() };
    let pair = crossed.map(|crossed| (upward(main), upward(crossed)));
    let (noise, step) = noise_of(&signal);
    let (mut usable, mut n_clipped) = unclipped(&signal, noise, step);
    if let Some((main, crossed)) = &pair {
        // Either photodiode may clip while their sum does not look flat.
        for one in [main, crossed] {
            let (noise, step) = noise_of(one);
            let (flags, _) = unclipped(one, noise, step);
            usable.iter_mut().zip(flags).for_each(|(all, flag)| *all &= flag);
        }
        n_clipped = usable.iter().filter(|flag| !**flag).count();
    }
    Segment {
        start,
        end,
        signal,
        pair,
        usable,
        rising,
        inverted,
        has_ramp,
        noise,
        step,
        reference,
        ramp_start,
        ramp_slope,
        n_clipped,
        dt: capture.time.step,
    }
}

/// Longest stretch over which the ramp runs one way, as (first, one past last); none if it does not ramp.
fn longest_ramp(ramp: &[f64]) -> Option<(usize, usize)> {
    let n = ramp.len();
    let block = n.div_ceil(BLOCKS).max(1);
    let means: Vec<f64> = ramp.chunks(block).map(|c| c.iter().sum::<f64>() / c.len() as f64).collect();
    if means.len() < 8 {
        return None;
    }
    let slopes: Vec<f64> = means.windows(2).map(|w| w[1] - w[0]).collect();
    let mut sizes: Vec<f64> = slopes.iter().map(|s| s.abs()).collect();
    sizes.sort_by(f64::total_cmp);
    let median = sizes[sizes.len() / 2];
    let range = means.iter().cloned().fold(f64::MIN, f64::max) - means.iter().cloned().fold(f64::MAX, f64::min);
    // A trigger's square wave or a constant has no slope in most blocks.
    if range.is_nan() || range <= 0.0 || median < 0.1 * range / means.len() as f64 {
        return None;
    }
    let way = |s: f64| {
        if s > SLOPE_SHARE * median {
            1
        } else if s < -SLOPE_SHARE * median {
            -1
        } else {
            0
        }
    };
    let mut runs: Vec<(usize, usize)> = Vec::new();
    let mut from = 0;
    for i in 1..=slopes.len() {
        if i == slopes.len() || way(slopes[i]) != way(slopes[from]) {
            if way(slopes[from]) != 0 {
                runs.push((from, i));
            }
            from = i;
        }
    }
    // A few odd blocks inside a ramp (a step of a coarse monitor) do not end it.
    let mut joined: Vec<(usize, usize)> = Vec::new();
    for run in runs {
        match joined.last_mut() {
            Some(last) if run.0 - last.1 <= ODD_BLOCKS && way(slopes[run.0]) == way(slopes[last.0]) => last.1 = run.1,
            _ => joined.push(run),
        }
    }
    let span = |r: &(usize, usize)| (means[r.1] - means[r.0]).abs();
    let widest = joined.iter().map(span).fold(0.0, f64::max);
    let longest = |share: f64| joined.iter().filter(|r| span(r) >= share * widest).max_by_key(|r| r.1 - r.0);
    let (whole, part) = (longest(0.5)?, longest(0.2)?);
    // A flyback shows every order, but too fast: the part of the slow ramp that was recorded is preferred.
    let best = if part.1 - part.0 >= FLYBACK * (whole.1 - whole.0) { part } else { whole };
    // Block means stand in the middle of their block: run[0] to run[1] in means; keep whole blocks between.
    let start = (best.0 * block + block / 2).min(n);
    let end = (best.1 * block + block / 2 + 1).min(n);
    let start = if best.0 == 0 { 0 } else { start };
    let end = if best.1 + 1 >= means.len() { n } else { end };
    (end > start + 8).then_some((start, end))
}

/// The same ramp without samples beyond its turns: block means place a turn no better than half a block.
fn up_to_the_turn(ramp: &[f64], (start, end): (usize, usize)) -> (usize, usize) {
    let rising = ramp[end - 1] > ramp[start];
    let block = ramp.len().div_ceil(BLOCKS).max(1);
    let height = |i: usize| if rising { ramp[i] } else { -ramp[i] };
    let (first, last) = (start..end.min(start + block), end.saturating_sub(block).max(start)..end);
    // A monitor in coarse steps goes back by one of them at a turn, or by chance: that places nothing.
    let steps = ramp.windows(2).map(|w| (w[1] - w[0]).abs()).filter(|step| *step > 0.0);
    let least = 2.5 * steps.fold(f64::INFINITY, f64::min);
    let lowest = first.min_by(|a, b| height(*a).total_cmp(&height(*b)));
    let highest = last.max_by(|a, b| height(*a).total_cmp(&height(*b)));
    let from = lowest.filter(|i| start > 0 && height(start) - height(*i) > least).unwrap_or(start);
    let to = highest.filter(|i| end < ramp.len() && height(*i) - height(end - 1) > least).map_or(end, |i| i + 1);
    if to > from + 8 { (from, to) } else { (start, end) }
}

/// Straight line through a ramp: (V at the first sample, V a sample); none if it is flat.
fn ramp_line(ramp: &[f64]) -> Option<(f64, f64)> {
    let n = ramp.len() as f64;
    let mean_i = (n - 1.0) / 2.0;
    let mean_v = ramp.iter().sum::<f64>() / n;
    let (mut sxy, mut sxx) = (0.0, 0.0);
    for (i, v) in ramp.iter().enumerate() {
        let d = i as f64 - mean_i;
        sxy += d * (v - mean_v);
        sxx += d * d;
    }
    let slope = sxy / sxx;
    (slope.is_finite() && slope != 0.0).then_some((mean_v - slope * mean_i, slope))
}

/// Sample at which the line passes the reference voltage: the middle of the ramp, rounded to a tenth of its range, so
/// that it is the same in every capture.
fn reference_on((start, slope): (f64, f64), n: usize) -> f64 {
    let range = (slope * n as f64).abs();
    let decade = 10f64.powf(range.log10().floor());
    let unit = (range / decade).round().max(1.0) * decade / 10.0;
    let middle = start + slope * (n as f64 - 1.0) / 2.0;
    ((middle / unit).round() * unit - start) / slope
}

/// Samples that are enough for a quantile: a hundred thousand would say the same.
const ENOUGH: usize = 8192;

/// Every so many values, such that about [`ENOUGH`] are left.
pub(super) fn sampled(values: &[f64]) -> Vec<f64> {
    values.iter().copied().step_by((values.len() / ENOUGH).max(1)).collect()
}

/// The value below which a share of the values lies; reorders them. Selection, not sorting: a capture has many samples.
pub(super) fn ranked(values: &mut [f64], share: f64) -> f64 {
    let Some(last) = values.len().checked_sub(1) else { return 0.0 };
    let rank = ((last as f64 * share) as usize).min(last);
    *values.select_nth_unstable_by(rank, f64::total_cmp).1
}

/// Whether the peaks point downward: the signal leans further below its median than above.
fn points_down(signal: &[f64]) -> bool {
    let mut values = sampled(signal);
    let (low, median, high) = (ranked(&mut values, 0.001), ranked(&mut values, 0.5), ranked(&mut values, 0.999));
    median - low > 2.0 * (high - median)
}

/// Noise from the median size of differences of neighbours, and the smallest step between levels.
fn noise_of(signal: &[f64]) -> (f64, f64) {
    let every = (signal.len() / ENOUGH).max(1);
    let mut sizes: Vec<f64> = signal.windows(2).step_by(every).map(|w| (w[1] - w[0]).abs()).collect();
    if sizes.is_empty() {
        return (0.0, 0.0);
    }
    let largest = sizes.iter().copied().fold(0.0, f64::max);
    let mut step = f64::INFINITY;
    for pair in signal.windows(2) {
        let size = (pair[1] - pair[0]).abs();
        step = if size > 1e-9 * largest && size < step { size } else { step };
    }
    let step = if step.is_finite() { step } else { 0.0 };
    // |difference| of two normal deviates has its median at 0.6745·√2 σ.
    let by_median = ranked(&mut sizes, 0.5) / (0.674_489_75 * std::f64::consts::SQRT_2);
    // With few levels the median is 0 or one step: take the mean of the smaller 80 % too.
    let count = (sizes.len() * 4 / 5).max(1);
    sizes.select_nth_unstable_by(count - 1, f64::total_cmp);
    let kept = &sizes[..count];
    let by_mean = kept.iter().sum::<f64>() / kept.len() as f64;
    (by_median.max(if by_median < 1.5 * step { by_mean } else { 0.0 }).max(step / 12f64.sqrt() * 0.5), step)
}

/// Marks samples on flat tops at the greatest level.
fn unclipped(signal: &[f64], noise: f64, step: f64) -> (Vec<bool>, usize) {
    let top = signal.iter().cloned().fold(f64::MIN, f64::max);
    let bottom = signal.iter().cloned().fold(f64::MAX, f64::min);
    let mut usable = vec![true; signal.len()];
    // Noise on a real top spreads it over many levels; on a clipped one all samples share the last level.
    let near = (1e-6 * (top - bottom)).max(1e-3 * step);
    let mut n_clipped = 0;
    let mut from = 0;
    while from < signal.len() {
        if top - signal[from] > near {
            from += 1;
            continue;
        }
        let mut to = from;
        while to < signal.len() && top - signal[to] <= near {
            to += 1;
        }
        // Coarse steps make short runs on any top; a run of five whose neighbours fall away by more than noise is a flat top.
        if to - from >= 5 && step < 0.02 * (top - bottom) && noise > 0.0 {
            for flag in &mut usable[from..to] {
                *flag = false;
            }
            n_clipped += to - from;
        }
        from = to;
    }
    (usable, n_clipped)
}
