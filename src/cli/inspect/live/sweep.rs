//! The latest sweep on a hertz axis, its fitted modes marked below: letters on the comb, a diamond off it.
//! Must not measure: trace and modes come in.
//! Main function: [`panel`].

use super::{
    axis,
    canvas::bars,
    state::{Seen, Sweep},
};
use crate::instruments::{Line, Look, Role};
use crate::phrase::{Saying, figure, said, terminal};
use crate::record::finding::{Trace, mode_letter};

/// Title, dots, marks, axis and figures in that many columns and rows.
pub(super) fn panel(sweep: Option<&Sweep>, width: usize, rows: usize, look: &Look) -> Vec<Line> {
    let mut lines = vec![title(sweep, look).cut(width)];
    let dots = rows.saturating_sub(4);
    match sweep.and_then(|sweep| Some((sweep, sweep.trace.as_ref()?))) {
        Some((sweep, trace)) if sweep.seen == Seen::Light && span(trace) > 0.0 => {
            let drawn = bars(&heights(trace, sweep.top, width), dots, look.draws_unicode());
            lines.extend(drawn.into_iter().map(|row| Line::of(Role::Plain, row)));
            lines.push(marks(trace, sweep.n_modes, width, look));
            lines.push(Line::of(Role::Quiet, look.sign("─", "-").repeat(width)));
            lines.push(Line::of(Role::Quiet, axis::figures(span(trace) / 1e9, "GHz", width, 12)));
        }
        _ => {
            lines.extend((0..dots + 1).map(|_| Line::default()));
            lines.push(Line::of(Role::Quiet, look.sign("─", "-").repeat(width)));
            lines.push(Line::default());
        }
    }
    lines
}

fn title(sweep: Option<&Sweep>, look: &Look) -> Line {
    let Some(sweep) = sweep else { return Line::of(Role::Quiet, terminal::NO_SWEEP.of(look.language)) };
    let line = Line::of(Role::Quiet, terminal::SWEEP.with([figure(sweep.number)]).text(look.language));
    match &sweep.seen {
        Seen::Dark => return line.and(Role::Strong, format!("  {}", terminal::DARK.of(look.language))),
        Seen::Refused(why) => {
            let why = terminal::NOT_MEASURED.with([said(Saying::outside(why))]).text(look.language);
            return line.and(Role::Strong, format!("  {why}"));
        }
        Seen::Light => {}
    }
    let modes = terminal::MODES.with([figure(sweep.n_modes)]).text(look.language);
    let mut line = line.and(Role::Plain, format!("  {modes}"));
    if let Some(spacing) = sweep.mode_spacing {
        let spacing = terminal::SPACING.with([figure(format!("{:.0}", spacing / 1e6))]).text(look.language);
        line = line.and(Role::Plain, format!("  {spacing}"));
    }
    if sweep.n_off_axis > 0 {
        let off = terminal::OFF_COMB.with([figure(sweep.n_off_axis)]).text(look.language);
        line = line.and(Role::Alert, format!("  {} {off}", look.sign("◇", "*")));
    }
    line
}

/// Length of the axis, Hz.
fn span(trace: &Trace) -> f64 {
    let span = trace.detuning.last().copied().unwrap_or(0.0);
    if span.is_finite() { span } else { 0.0 }
}

/// Greatest signal of each column as a part of the whole height: a peak between two columns is never lost.
fn heights(trace: &Trace, top: f64, width: usize) -> Vec<f64> {
    let mut heights = vec![0.0; width];
    for (at, high) in trace.detuning.iter().zip(&trace.high) {
        let column = (at / span(trace) * width as f64) as usize;
        if let Some(height) = heights.get_mut(column.min(width.saturating_sub(1))) {
            *height = f64::max(*height, high / top);
        }
    }
    heights
}

/// A letter or a diamond below each fitted mode, in every order.
fn marks(trace: &Trace, n_modes: usize, width: usize, look: &Look) -> Line {
    let mut line = Line::default();
    for (index, at) in &trace.marks {
        let column = (at / span(trace) * width as f64) as usize;
        if column < line.width() || column >= width {
            continue;
        }
        line = line.to_column(column);
        line = if *index < n_modes {
            line.and(Role::Strong, mode_letter(*index))
        } else {
            line.and(Role::Alert, look.sign("◇", "*"))
        };
    }
    line
}
