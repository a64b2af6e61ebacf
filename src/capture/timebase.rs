//! Fits an even time base to time stamps and checks it.
//! Must not know files; rows are counted from 0.
//! Main types: [`TimeBase`], [`Stamps`].

use super::{error::CaptureError, remark::CaptureRemark};

/// Even times of samples.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TimeBase {
    /// Time of the first sample, seconds.
    pub start: f64,
    /// Seconds between samples, positive.
    pub step: f64,
    /// How many samples.
    pub n: usize,
}

impl TimeBase {
    /// Time of the sample `index`, from 0, seconds.
    pub fn at(&self, index: usize) -> f64 {
        self.start + self.step * index as f64
    }

    /// From the first sample to the last, seconds.
    pub fn span(&self) -> f64 {
        self.step * self.n.saturating_sub(1) as f64
    }
}

/// Part of the stamps that may be wrong one by one.
const WRONG_PART: f64 = 0.01;
/// Part of its span by which a column of times may leave a straight line, from rounding to three digits.
const STRAIGHT: f64 = 0.005;
/// A rounder step may widen the rest by this factor: a thousand stamps show their widest rounding to a few per cent.
const LOOSER: f64 = 1.05;
/// Pairs and samples used for the robust first line.
const PICKS: usize = 65;

/// What time stamps say, before anything is judged.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Stamps {
    pub start: f64,
    pub step: f64,
    /// How far a good stamp may lie off, seconds.
    allowed: f64,
    /// Stamps farther off.
    wrong: usize,
    /// Row of the first of them.
    first_wrong: usize,
    /// Largest distance of a good stamp, seconds.
    largest: f64,
    /// Stamps equal to their predecessor.
    repeated: usize,
}

/// Fits `start + step·i` to stamps.
///
/// Method:
/// 1. Median slope of pairs half the record apart, then median offset: single wrong stamps do not matter.
/// 2. A good stamp lies within half a step, or within the largest usual jump where stamps are rounded.
/// 3. Least squares over the good stamps.
///
/// NaN are left out. `None` for fewer than two finite stamps.
pub(super) fn fit(stamps: &[f64]) -> Option<Stamps> {
    let half = stamps.len() / 2;
    let picks = half.min(PICKS);
    let mut slopes: Vec<f64> = (0..picks)
        .map(|k| k * half / picks)
        .map(|i| (stamps[i + half] - stamps[i]) / half as f64)
        .filter(|slope| slope.is_finite())
        .collect();
    let slope = median(&mut slopes)?;
    let every = stamps.len().div_ceil(4 * PICKS).max(1);
    let offset = |(i, t): (usize, &f64)| Some(t - slope * i as f64).filter(|o| o.is_finite());
    let mut offsets: Vec<f64> = stamps.iter().enumerate().step_by(every).filter_map(offset).collect();
    let start = median(&mut offsets)?;
    let allowed = (0.5 * slope.abs()).max(1.25 * usual_jump(stamps));
    let (start, step) = least_squares(stamps, (start, slope), allowed).unwrap_or((start, slope));
    let (mut wrong, mut first_wrong, mut largest, mut repeated) = (0, 0, 0.0_f64, 0);
    let mut previous = f64::NAN;
    for (i, &t) in stamps.iter().enumerate() {
        let off = (t - start - step * i as f64).abs();
        if off <= allowed {
            largest = largest.max(off);
        } else if !off.is_nan() {
            first_wrong = if wrong == 0 { i } else { first_wrong };
            wrong += 1;
        }
        repeated += usize::from(t == previous);
        previous = t;
    }
    Some(Stamps { start, step, allowed, wrong, first_wrong, largest, repeated })
}

/// The jump between successive unequal stamps that nine in ten do not exceed; 0 if no two are equal.
fn usual_jump(stamps: &[f64]) -> f64 {
    let pairs = || stamps.windows(2).map(|pair| (pair[1] - pair[0]).abs());
    if !pairs().any(|jump| jump == 0.0) {
        return 0.0;
    }
    let mut jumps: Vec<f64> = pairs().filter(|jump| *jump > 0.0 && jump.is_finite()).collect();
    if jumps.is_empty() {
        return 0.0;
    }
    let rank = jumps.len() * 9 / 10;
    *jumps.select_nth_unstable_by(rank, f64::total_cmp).1
}

/// Start and step by least squares over the stamps that lie within `allowed` of a first line; `None` where they give none.
///
/// Only the small distances from that line are summed, about its middle, so that nothing is lost to rounding.
fn least_squares(stamps: &[f64], (start, step): (f64, f64), allowed: f64) -> Option<(f64, f64)> {
    let middle = stamps.len() as f64 / 2.0;
    let (mut n, mut sx, mut sxx, mut sy, mut sxy) = (0.0_f64, 0.0, 0.0, 0.0, 0.0);
    for (i, t) in stamps.iter().enumerate() {
        let off = t - start - step * i as f64;
        let good = off.abs() <= allowed;
        let (weight, y) = if good { (1.0, off) } else { (0.0, 0.0) };
        let x = weight * (i as f64 - middle);
        n += weight;
        sx += x;
        sxx += x * x;
        sy += y;
        sxy += x * y;
    }
    let more = (n * sxy - sx * sy) / (n * sxx - sx * sx);
    let better = step + more;
    better.is_finite().then_some((start + (sy - more * sx) / n - more * middle, better))
}

fn median(values: &mut [f64]) -> Option<f64> {
    if values.is_empty() {
        return None;
    }
    let rank = values.len() / 2;
    Some(*values.select_nth_unstable_by(rank, f64::total_cmp).1)
}

impl Stamps {
    /// Whether a column of numbers behaves as time does: straight, whichever way it runs.
    pub fn is_straight(&self, n: usize) -> bool {
        let span = (self.step * n as f64).abs();
        span > 0.0 && self.wrong as f64 <= WRONG_PART * n as f64 && self.largest <= STRAIGHT * span
    }

    /// Judges the stamps.
    ///
    /// * `stamps`: seconds, without NaN.
    /// * `stated`: the header's own step, seconds; used where rounded stamps agree with it.
    /// * `line_of`: line number of a row.
    ///
    /// Errors: time runs backward or stands; more than 1 % of the stamps off the even base.
    pub fn judge(
        &self,
        stamps: &[f64],
        stated: Option<f64>,
        line_of: impl Fn(usize) -> usize,
    ) -> Result<(TimeBase, Vec<CaptureRemark>), CaptureError> {
        let n = stamps.len();
        if self.step < 0.0 {
            return Err(CaptureError::TimeBackward { step: self.step });
        }
        if self.step == 0.0 {
            return Err(CaptureError::TimeStands { stamp: self.start });
        }
        if self.wrong as f64 > WRONG_PART * n as f64 {
            let (count, allowed, step) = (self.wrong, self.allowed, self.step);
            return Err(CaptureError::TimeUneven { line: line_of(self.first_wrong), count, allowed, step });
        }
        let mut remarks = Vec::new();
        if self.wrong > 0 {
            let stamp = stamps.get(self.first_wrong).copied().unwrap_or(f64::NAN);
            remarks.push(CaptureRemark::StampsWrong { count: self.wrong, line: line_of(self.first_wrong), stamp });
        }
        if self.repeated > 0 {
            remarks.push(CaptureRemark::StampsRepeated { count: self.repeated });
        } else if self.largest > 0.1 * self.step {
            remarks.push(CaptureRemark::StampsRounded { largest: self.largest / self.step });
        }
        Ok((self.base(stamps, stated), remarks))
    }

    /// The base. Where stamps are rounded many steps fit: the header's own if it does, else the one of fewest digits,
    /// as digitizers sample at round steps (common practice); the start is then the middle of what the stamps allow.
    fn base(&self, stamps: &[f64], stated: Option<f64>) -> TimeBase {
        let n = stamps.len();
        let mut base = TimeBase { start: self.start, step: self.step, n };
        if self.largest > 0.01 * self.step {
            let (_, spread) = self.rest(stamps, self.step);
            let fits = |step: &f64| {
                let near = (step - self.step).abs() * n as f64 <= 2.0 * self.largest;
                near && self.rest(stamps, *step).1 <= LOOSER * spread
            };
            base.step =
                stated.into_iter().chain((1..=4).map(|d| round_to(self.step, d))).find(fits).unwrap_or(self.step);
            base.start = self.rest(stamps, base.step).0;
        }
        match stamps.first().filter(|first| (*first - base.start).abs() < 0.01 * base.step) {
            Some(&exact) => TimeBase { start: exact, ..base },
            None => base,
        }
    }

    /// Middle and width of what good stamps leave after `step·i` is taken away.
    fn rest(&self, stamps: &[f64], step: f64) -> (f64, f64) {
        let good = |&(i, t): &(usize, &f64)| (t - self.start - self.step * i as f64).abs() <= self.allowed;
        let rests = stamps.iter().enumerate().filter(good).map(|(i, t)| t - step * i as f64);
        let (low, high) = rests.fold((f64::MAX, f64::MIN), |(low, high), rest| (low.min(rest), high.max(rest)));
        (0.5 * low + 0.5 * high, high - low)
    }
}

/// A positive value rounded to significant digits.
fn round_to(value: f64, digits: usize) -> f64 {
    format!("{value:.*e}", digits.saturating_sub(1)).parse().unwrap_or(value)
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn judged(stamps: &[f64], stated: Option<f64>) -> Result<(TimeBase, Vec<CaptureRemark>), CaptureError> {
        fit(stamps).unwrap().judge(stamps, stated, |row| row + 1)
    }

    #[test]
    fn rounded_stamps_give_back_the_round_step() {
        let rounded: Vec<f64> = (0..1000).map(|i| ((-0.5 + 0.001 * f64::from(i)) * 100.0).round() / 100.0).collect();
        let (time, remarks) = judged(&rounded, None).unwrap();
        assert_eq!(time.step, 0.001);
        assert!((time.start + 0.5).abs() < 0.001, "half a step is all that rounding leaves open: {}", time.start);
        // 101 different stamps, -0.50 to 0.50, among 1,000.
        assert_eq!(remarks, [CaptureRemark::StampsRepeated { count: 1000 - 101 }]);
    }

    #[test]
    fn one_wrong_stamp_is_a_remark_and_many_are_an_error() {
        let mut stamps: Vec<f64> = (0..500).map(|i| 4e-6 * f64::from(i)).collect();
        stamps[250] = 0.0;
        let (time, remarks) = judged(&stamps, None).unwrap();
        assert!((time.step / 4e-6 - 1.0).abs() < 1e-12, "least squares over exact stamps: rounding alone");
        assert_eq!(remarks, [CaptureRemark::StampsWrong { count: 1, line: 251, stamp: 0.0 }]);
        stamps.iter_mut().skip(100).for_each(|t| *t += 1e-4);
        assert!(matches!(judged(&stamps, None), Err(CaptureError::TimeUneven { .. })));
    }

    #[test]
    fn backward_and_standing_time_are_errors() {
        let back: Vec<f64> = (0..200).map(|i| -1e-3 * f64::from(i)).collect();
        assert!(matches!(judged(&back, None), Err(CaptureError::TimeBackward { .. })));
        assert!(matches!(judged(&[0.25; 200], None), Err(CaptureError::TimeStands { .. })));
    }
}
