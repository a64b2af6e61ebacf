//! A sweep (all light, both photodiodes together) thinned for a chart: least and greatest signal of each column of a hertz axis, and where the modes stand.
//! Must not draw.
//! Main entry: [`thin_trace`].

use super::Measurement;
use crate::capture::Capture;

/// A thinned trace; no peak is lost, since every column keeps its least and its greatest sample.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ThinTrace {
    /// Detuning of each column's middle, Hz, ascending from 0.
    pub detuning: Vec<f64>,
    /// Least signal less the baseline, V.
    pub low: Vec<f64>,
    /// Greatest signal less the baseline, V.
    pub high: Vec<f64>,
    /// (index in `modes`, or `modes.len()` + index in `off_axis`; detuning) of every order on the axis.
    pub marks: Vec<(usize, f64)>,
}

/// Thins the ramp that was measured to at most `columns` columns; none if no axis was found.
pub fn thin_trace(capture: &Capture, measurement: &Measurement, columns: usize) -> Option<ThinTrace> {
    let axis = measurement.axis.as_ref()?;
    let n = axis.end.min(capture.photodiode.len());
    let columns = columns.clamp(2, 4096);
    let sign = if axis.rising { 1.0 } else { -1.0 };
    let from = sign * axis.detuning(if axis.rising { axis.start as f64 } else { axis.end as f64 });
    let to = sign * axis.detuning(if axis.rising { axis.end as f64 } else { axis.start as f64 });
    if to.is_nan() || from.is_nan() || to <= from {
        return None;
    }
    let mut bins: Vec<Option<(f64, f64)>> = vec![None; columns];
    for (i, raw) in capture.photodiode.iter().enumerate().take(n).skip(axis.start) {
        let at = (sign * axis.detuning(i as f64) - from) / (to - from) * columns as f64;
        let all = raw + capture.crossed.as_ref().and_then(|crossed| crossed.get(i)).copied().unwrap_or(0.0);
        let value = if axis.inverted { -all } else { all } - axis.baseline;
        if let Some(bin) = bins.get_mut(at.floor().clamp(0.0, columns as f64 - 1.0) as usize) {
            *bin = Some(bin.map_or((value, value), |(a, b)| (a.min(value), b.max(value))));
        }
    }
    let mut trace = ThinTrace::default();
    for (k, bin) in bins.into_iter().enumerate() {
        if let Some((low, high)) = bin {
            trace.detuning.push((k as f64 + 0.5) / columns as f64 * (to - from));
            trace.low.push(low);
            trace.high.push(high);
        }
    }
    let fsr = measurement.free_spectral_range;
    for (index, mode) in measurement.modes.iter().chain(&measurement.off_axis).enumerate() {
        let first = ((from - mode.position) / fsr).ceil();
        let mut at = mode.position + first * fsr;
        while at <= to {
            trace.marks.push((index, at - from));
            at += fsr;
        }
    }
    trace.marks.sort_by(|a, b| a.1.total_cmp(&b.1));
    Some(trace)
}
