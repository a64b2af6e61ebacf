//! Charts of the sheet as numbers: one sweep, heights along the gain line, the walk with its prediction.
//! Must not draw.
//! Main functions: [`sweep_chart`], [`gain_chart`], [`walk_chart`].

use chrono::{DateTime, FixedOffset, TimeDelta};

use super::{
    notebook::{DwellEnd, Notebook, Seen},
    steps::Room,
};
use crate::record::{
    event::Captured,
    finding::ModeFinding,
    sheet::{ChartMode, GainChart, SweepChart, WalkChart},
};

/// Most points of a chart.
const MOST: usize = 300;

/// The chart of a capture that carries a trace.
pub(crate) fn sweep_chart(captured: &Captured, room: &Room<'_>) -> Option<SweepChart> {
    let finding = &captured.finding;
    let trace = finding.trace.clone()?;
    let peaks = finding.modes.iter().map(|mode| (mode, false)).chain(finding.off_axis.iter().map(|mode| (mode, true)));
    let modes = peaks.enumerate().map(|(i, (mode, off_axis))| chart_mode(i, mode, off_axis)).collect();
    let taken_at = moment(room.opened_at, captured.fact.taken_s);
    Some(SweepChart { taken_at, trace, modes, free_spectral_range: finding.free_spectral_range })
}

fn chart_mode(index: usize, mode: &ModeFinding, off_axis: bool) -> ChartMode {
    ChartMode { name: letter(index), offset: mode.offset, peak_height: mode.peak_height, fwhm: mode.fwhm, off_axis }
}

/// a … z, then a1, b1 …
fn letter(index: usize) -> String {
    let letter = (b'a'..=b'z').nth(index % 26).map_or('a', char::from);
    if index < 26 { letter.to_string() } else { format!("{letter}{}", index / 26) }
}

/// Wall time of a moment of the run.
fn moment(opened_at: Option<DateTime<FixedOffset>>, seconds: f64) -> Option<DateTime<FixedOffset>> {
    // `as` saturates; a sum that leaves the calendar gives none.
    opened_at?.checked_add_signed(TimeDelta::try_milliseconds((seconds * 1e3).round() as i64)?)
}

/// Heights along the gain line over the last whole cycles of a dwell; none without cycles or where the line is wider than an order.
pub(crate) fn gain_chart(book: &Notebook, step: &str) -> Option<GainChart> {
    let dwelt = book.dwelt(step)?;
    let (window, cycles) = [dwelt.cycles, 1.0].iter().find_map(|n| Some((dwelt.warmup.last_cycles(*n)?, *n)))?;
    let captures = book.of_within(step, window);
    let fsr = captures.first().map(|seen| seen.glimpse.free_spectral_range).filter(|fsr| *fsr > 0.0)?;
    let modes = || captures.iter().flat_map(|seen| seen.glimpse.modes.iter());
    let greatest = modes().map(|mode| mode.height).fold(0.0, f64::max);
    if greatest <= 0.0 {
        return None;
    }
    // Middle of the line: circular mean of the positions, weighted by height.
    let turn = std::f64::consts::TAU / fsr;
    let cos: f64 = modes().map(|mode| mode.height * (turn * mode.position).cos()).sum();
    let sin: f64 = modes().map(|mode| mode.height * (turn * mode.position).sin()).sum();
    let middle = sin.atan2(cos) / turn;
    let sign = direction(captures, fsr);
    let detuning = |position: f64| sign * folded(position - middle, fsr);
    let all: Vec<_> =
        modes().map(|mode| (detuning(mode.position), mode.height / greatest, mode.u_height / greatest)).collect();
    let points: Vec<_> =
        thinned(&all).into_iter().filter(|(d, h, u)| d.is_finite() && h.is_finite() && u.is_finite()).collect();
    (!points.is_empty()).then_some(GainChart { cycles, points })
}

fn folded(difference: f64, fsr: f64) -> f64 {
    difference - fsr * (difference / fsr).round()
}

/// −1 where modes move up on the scan axis: in warm-up they move down in frequency, so the axis is reversed.
fn direction(captures: &[Seen], fsr: f64) -> f64 {
    let mut up = 0.0;
    for pair in captures.windows(2) {
        let (before, after) = (&pair[0].glimpse.modes, &pair[1].glimpse.modes);
        for mode in after {
            let moves = before.iter().map(|other| folded(mode.position - other.position, fsr));
            up += moves.min_by(|a, b| a.abs().total_cmp(&b.abs())).unwrap_or(0.0);
        }
    }
    if up > 0.0 { -1.0 } else { 1.0 }
}

/// The walk of the last dwell begun.
pub(crate) fn walk_chart(book: &Notebook) -> Option<WalkChart> {
    let dwelt = book.dwells.last()?;
    let state = dwelt.warmup.state();
    if state.points.is_empty() {
        return None;
    }
    let pair = |measured: &crate::uncertainty::Measured| (measured.value, measured.expanded());
    let finite = |(a, b): &(f64, f64)| a.is_finite() && b.is_finite();
    let ended = dwelt.end.is_some_and(|end| end != DwellEnd::Dark);
    Some(WalkChart {
        points: thinned(&state.points).into_iter().filter(finite).collect(),
        prediction: thinned(&state.prediction).into_iter().filter(finite).collect(),
        tau: state.tau.as_ref().map(pair).filter(finite),
        ready: state.ready.as_ref().filter(|_| state.settled).map(pair).filter(finite),
        dwell_end: ended.then_some(dwelt.seconds),
        hops: book.hops.iter().map(|hop| (hop.at, hop.size)).filter(finite).collect(),
        swaps: book.swaps.iter().map(|swap| swap.at).filter(|at| at.is_finite()).collect(),
    })
}

/// At most [`MOST`] of them, evenly taken, the last among them.
fn thinned<T: Clone>(points: &[T]) -> Vec<T> {
    let every = points.len().div_ceil(MOST - 1).max(1);
    let last = points.len().saturating_sub(1);
    points.iter().enumerate().filter(|(i, _)| i % every == 0 || *i == last).map(|(_, point)| point.clone()).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn letters_and_thinning() {
        assert_eq!([letter(0), letter(25), letter(27)], ["a", "z", "b1"]);
        for n in [0, 1, 299, 300, 301, 8000] {
            let points: Vec<usize> = (0..n).collect();
            let thin = thinned(&points);
            assert!(thin.len() <= MOST && thin.last() == points.last(), "{n}");
        }
    }
}
