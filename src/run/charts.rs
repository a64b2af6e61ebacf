//! Charts of the sheet as numbers: one sweep, heights along the gain line, the walk with its prediction.
//! Must not draw.
//! Main functions: [`sweep_chart`], [`gain_chart`], [`walk_chart`].

use chrono::{DateTime, FixedOffset, TimeDelta};

use super::{
    notebook::{DwellEnd, Notebook},
    steps::Room,
};
use crate::{
    behaviour::{GainPoint, WarmupState, gain_points},
    record::{
        event::Captured,
        finding::{ModeFinding, mode_letter},
        sheet::{ChartMode, GainChart, SweepChart, WalkChart},
    },
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
    let peak_height = mode.peak_height + mode.crossed_height.unwrap_or(0.0);
    ChartMode { name: mode_letter(index), offset: mode.offset, peak_height, fwhm: mode.fwhm, off_axis }
}

/// Wall time of a moment of the run.
fn moment(opened_at: Option<DateTime<FixedOffset>>, seconds: f64) -> Option<DateTime<FixedOffset>> {
    // `as` saturates; a sum that leaves the calendar gives none.
    opened_at?.checked_add_signed(TimeDelta::try_milliseconds((seconds * 1e3).round() as i64)?)
}

/// Heights along the gain line over the last whole cycles of a dwell; none without cycles.
pub(crate) fn gain_chart(book: &Notebook, step: &str, nominal_spacing: f64) -> Option<GainChart> {
    let dwelt = book.dwelt(step)?;
    let (window, cycles) = [dwelt.cycles, 1.0].iter().find_map(|n| Some((dwelt.warmup.last_cycles(*n)?, *n)))?;
    let glimpses: Vec<_> = book.of_within(step, window).iter().map(|seen| seen.glimpse.clone()).collect();
    let finite = |point: &&GainPoint| [point.detuning, point.height, point.u_height].iter().all(|x| x.is_finite());
    let all = gain_points(&glimpses, nominal_spacing);
    let mut all: Vec<_> =
        all.iter().filter(finite).map(|point| (point.detuning, point.height, point.u_height)).collect();
    // Captures list their modes in turn: thinned as they come, every second point could be one mode's only.
    all.sort_by(|a, b| a.0.total_cmp(&b.0));
    (!all.is_empty()).then(|| GainChart { cycles, points: thinned(&all) })
}

/// The walk of the last dwell begun.
pub(crate) fn walk_chart(book: &Notebook) -> Option<WalkChart> {
    let dwelt = book.dwells.last()?;
    let state = dwelt.warmup.state();
    if state.points.is_empty() {
        return None;
    }
    if let Some(rack) = &book.rack {
        return Some(rack_chart(book, &state, rack.age_s));
    }
    let pair = |measured: &crate::uncertainty::Measured| (measured.value, measured.expanded());
    let finite = |(a, b): &(f64, f64)| a.is_finite() && b.is_finite();
    let settled = match dwelt.end {
        Some(DwellEnd::Settled) => true,
        Some(DwellEnd::Longest | DwellEnd::Dark) => false,
        Some(DwellEnd::SourceEnded) | None => state.settled,
    };
    let ended = dwelt.end.is_some_and(|end| end != DwellEnd::Dark);
    Some(WalkChart {
        points: thinned(&state.points).into_iter().filter(finite).collect(),
        prediction: thinned(&state.prediction).into_iter().filter(finite).collect(),
        tau: state.tau.as_ref().map(pair).filter(finite),
        ready: state.ready.as_ref().filter(|_| settled).map(pair).filter(finite),
        dwell_end: ended.then_some(dwelt.seconds),
        hops: book.hops.iter().map(|hop| (hop.at, hop.size)).filter(finite).collect(),
        swaps: book.swaps.iter().map(|swap| swap.at).filter(|at| at.is_finite()).collect(),
    })
}

/// The walk of a tube from the rack, on the time since it was lit there; nothing is predicted from a warm-up not seen.
fn rack_chart(book: &Notebook, state: &WarmupState, age_s: f64) -> WalkChart {
    let ended = book.dwells.last().filter(|dwelt| dwelt.end.is_some_and(|end| end != DwellEnd::Dark));
    let sound = |(at, walked): &(f64, f64)| at.is_finite() && walked.is_finite();
    WalkChart {
        points: thinned(&state.points).into_iter().filter(sound).map(|(at, walked)| (at + age_s, walked)).collect(),
        prediction: Vec::new(),
        tau: None,
        ready: None,
        dwell_end: ended.map(|dwelt| dwelt.seconds + age_s),
        hops: book.hops.iter().map(|hop| (hop.at + age_s, hop.size)).collect(),
        swaps: book.swaps.iter().map(|swap| swap.at + age_s).collect(),
    }
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
        assert_eq!([mode_letter(0), mode_letter(25), mode_letter(27)], ["a", "z", "b1"]);
        for n in [0, 1, 299, 300, 301, 8000] {
            let points: Vec<usize> = (0..n).collect();
            let thin = thinned(&points);
            assert!(thin.len() <= MOST && thin.last() == points.last(), "{n}");
        }
    }
}
