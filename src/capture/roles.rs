//! Tells ramp and photodiode apart, by name, else by shape.
//! Must not read bytes.
//! Main function: [`guess`].

/// A channel to be given a part.
#[derive(Debug, Clone, Copy)]
pub(super) struct Candidate<'a> {
    /// Its column's name, lower case.
    pub name: &'a str,
    /// Its file's name without extension, lower case; empty where files hold several channels.
    pub file: &'a str,
    pub volts: &'a [f64],
}

/// Indices of the channels with a part.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Roles {
    pub ramp: Option<usize>,
    pub photodiode: usize,
    pub crossed: Option<usize>,
    /// By shape: whether the shapes were too alike to be sure.
    pub by_shape: Option<bool>,
}

const RAMP: &[&str] = &["ramp", "piezo", "sweep"];
const PHOTODIODE: &[&str] = &["photodiode", "detector", "transmission"];
const CROSSED: &[&str] = &["crossed"];
/// Best and next ramp score must differ by this factor. In the real captures at hand of one ramp and one photodiode the least factor is 4.3.
const SURE: f64 = 1.5;
/// Blocks that a channel is averaged into, against noise.
const BLOCKS: usize = 200;

/// Gives the parts of ramp, photodiode and crossed photodiode. `None` without any channel.
///
/// 1. A channel whose column or file is the only one of a telling name has that part.
/// 2. One channel alone is the photodiode.
/// 3. Else the ramp is the channel of the greatest [`ramp_score`], the photodiode that of the least. Where two scores are
///    too close, the first channel is the photodiode and the second the ramp, as benches are usually wired.
pub(super) fn guess(channels: &[Candidate<'_>]) -> Option<Roles> {
    let crossed = named(channels, CROSSED);
    let mut ramp = named(channels, RAMP).filter(|&c| Some(c) != crossed);
    let mut photodiode = named(channels, PHOTODIODE).filter(|&c| Some(c) != crossed && Some(c) != ramp);
    let taken = [crossed, ramp, photodiode];
    let free: Vec<usize> = (0..channels.len()).filter(|&c| !taken.contains(&Some(c))).collect();
    let mut scored: Vec<(f64, usize)> =
        free.iter().filter_map(|&c| Some((ramp_score(channels[c].volts)?, c))).collect();
    scored.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut by_shape = None;
    if ramp.is_none() && scored.len() > usize::from(photodiode.is_none()) {
        let next = scored.get(1).map_or(0.0, |next| next.0);
        let sure = scored[0].0 >= SURE * next;
        by_shape = Some(!sure);
        let by_order = free.get(1).or(free.first()).copied();
        ramp = if sure || photodiode.is_some() { Some(scored[0].1) } else { by_order };
    }
    if photodiode.is_none() {
        let uncertain = by_shape == Some(true);
        let least = scored.iter().rev().map(|&(_, c)| c).find(|&c| Some(c) != ramp);
        let first = free.iter().copied().find(|&c| Some(c) != ramp);
        photodiode = if uncertain { first } else { least.or(first) };
    }
    Some(Roles {
        ramp,
        photodiode: photodiode.or(crossed)?,
        crossed: crossed.filter(|_| photodiode.is_some()),
        by_shape,
    })
}

/// The only channel whose column has one of the words in its name, else the only one whose file has.
fn named(channels: &[Candidate<'_>], words: &[&str]) -> Option<usize> {
    let only = |name: &dyn Fn(&Candidate<'_>) -> bool| {
        let mut found = channels.iter().enumerate().filter(|(_, c)| name(c)).map(|(index, _)| index);
        found.next().filter(|_| found.next().is_none())
    };
    let has = |text: &str| words.iter().any(|word| text.contains(word));
    only(&|c| has(c.name)).or_else(|| only(&|c| has(c.file)))
}

/// How much a channel looks like a ramp: 3 for a clean triangle, below 1 for peaks. `None` for a constant.
///
/// A ramp visits all its levels equally (entropy of its histogram) and turns seldom (little path for its range):
/// score = (1 + entropy in bits) / (path / range), over means of blocks. Our own measure.
fn ramp_score(volts: &[f64]) -> Option<f64> {
    let size = volts.len().div_ceil(BLOCKS).max(1);
    let mean = |block: &[f64]| block.iter().sum::<f64>() / block.len() as f64;
    let blocks: Vec<f64> = volts.chunks(size).map(mean).filter(|mean| mean.is_finite()).collect();
    let (low, high) = blocks.iter().fold((f64::MAX, f64::MIN), |(low, high), &v| (low.min(v), high.max(v)));
    let range = high - low;
    if !(range > 0.0 && range.is_finite()) {
        return None;
    }
    let path: f64 = blocks.windows(2).map(|pair| (pair[1] - pair[0]).abs()).sum();
    let mut counts = [0_usize; 16];
    for value in &blocks {
        // Inside 0 … 15 whatever the rounding: a float cast saturates.
        counts[(((value - low) / range * 16.0) as usize).min(15)] += 1;
    }
    let part = |&count: &usize| count as f64 / blocks.len() as f64;
    let entropy: f64 = counts.iter().map(part).filter(|p| *p > 0.0).map(|p| -p * p.log2()).sum();
    Some((1.0 + entropy) * range / path)
}

/// Range of a channel in its smallest steps, where it has fewer than `fewest`; `None` where it has more or is constant.
///
/// * `extent`: its least and greatest value, as from [`extent`].
pub(super) fn coarse_levels(volts: &[f64], (low, high): (f64, f64), fewest: usize) -> Option<usize> {
    let range = high - low;
    // Coarse steps make samples repeat; exports round, so that a difference below 1e-4 of the range is no step.
    let repeats = volts.windows(2).filter(|pair| pair[0] == pair[1]).count();
    if 8 * repeats <= volts.len() {
        return None;
    }
    let mut least = f64::INFINITY;
    for pair in volts.windows(2) {
        let step = (pair[1] - pair[0]).abs();
        least = if step > 1e-4 * range && step < least { step } else { least };
    }
    let levels = range / least;
    (levels >= 0.5 && levels < fewest as f64).then_some(levels.round() as usize)
}

/// Least and greatest value, NaN left out; (∞, −∞) of none. Four at a time: a capture is long.
pub(super) fn extent(values: &[f64]) -> (f64, f64) {
    let (mut low, mut high) = ([f64::INFINITY; 4], [f64::NEG_INFINITY; 4]);
    let (fours, rest) = values.as_chunks::<4>();
    let mut take = |k: usize, v: f64| {
        low[k] = if v < low[k] { v } else { low[k] };
        high[k] = if v > high[k] { v } else { high[k] };
    };
    for four in fours {
        for (k, v) in four.iter().enumerate() {
            take(k, *v);
        }
    }
    rest.iter().for_each(|v| take(0, *v));
    (low.iter().copied().fold(f64::INFINITY, f64::min), high.iter().copied().fold(f64::NEG_INFINITY, f64::max))
}
