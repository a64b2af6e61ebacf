//! The walk so far as a strip, and where it is expected to end.
//! Must not predict: the chart comes in with its fit.
//! Main function: [`panel`].

use super::{axis, canvas::Canvas};
use crate::instruments::{Line, Look, Role};
use crate::phrase::{figure, terminal};
use crate::record::sheet::WalkChart;

/// Title, dots, axis and figures in that many columns and rows.
///
/// * `ends_in`: bench seconds until the step is expected to end, where that can be said.
pub(super) fn panel(
    walk: Option<&WalkChart>,
    ends_in: Option<f64>,
    width: usize,
    rows: usize,
    look: &Look,
) -> Vec<Line> {
    let dots = rows.saturating_sub(3);
    let rule = || Line::of(Role::Quiet, look.sign("─", "-").repeat(width));
    let Some((walk, now)) = walk.and_then(|walk| Some((walk, *walk.points.last()?))) else {
        let mut lines = vec![Line::of(Role::Quiet, terminal::NO_WALK.of(look.language))];
        lines.extend((0..dots).map(|_| Line::default()));
        lines.extend([rule(), Line::default()]);
        return lines;
    };
    let end = walk.dwell_end.or_else(|| Some(now.0 + ends_in?)).filter(|end| end.is_finite() && *end > 0.0);
    // Some room behind the end, so that it can be seen to come.
    let to = end.unwrap_or(now.0 * 1.5).max(now.0) * 1.05;
    let mut lines = vec![title(walk, now, end, look).cut(width)];
    lines.extend(field(walk, to, end, width, dots, look));
    lines.push(rule());
    lines.push(Line::of(Role::Quiet, axis::figures(to / 60.0, "min", width, 14)).cut(width));
    lines
}

fn title(walk: &WalkChart, now: (f64, f64), end: Option<f64>, look: &Look) -> Line {
    let walked = terminal::WALK.with([figure(format!("{:.1}", now.1))]).text(look.language);
    let at = |end: f64| [figure(format!("{} {:.1}", look.sign("┊", "|"), end / 60.0))];
    let (role, ends) = match (walk.dwell_end, end) {
        (Some(end), _) => (Role::Plain, terminal::WALK_ENDED.with(at(end))),
        (None, Some(end)) => (Role::Plain, terminal::WALK_ENDS.with(at(end))),
        (None, None) => (Role::Quiet, (&terminal::WALK_OPEN).into()),
    };
    Line::of(Role::Plain, format!("{walked}, ")).and(role, ends.text(look.language))
}

/// Points measured as dots, the fit as every fourth dot, the end as a dashed line.
fn field(walk: &WalkChart, to: f64, end: Option<f64>, width: usize, rows: usize, look: &Look) -> Vec<Line> {
    let shown = walk.points.iter().chain(walk.prediction.iter().filter(|point| point.0 <= to));
    let highest = shown.map(|point| point.1).filter(|walked| walked.is_finite()).fold(1.0, f64::max);
    let (mut measured, mut fitted) = (Canvas::new(width, rows), Canvas::new(width, rows));
    let place = |(at, walked): (f64, f64)| {
        let x = (at / to * measured.width() as f64) as usize;
        let y = (walked.max(0.0) / highest * measured.height().saturating_sub(1) as f64).round() as usize;
        (x, y)
    };
    let points: Vec<_> = walk.points.iter().map(|point| place(*point)).collect();
    let ahead: Vec<_> = walk.prediction.iter().map(|point| place(*point)).filter(|(x, _)| x % 4 == 0).collect();
    points.into_iter().for_each(|(x, y)| measured.set(x, y));
    ahead.into_iter().for_each(|(x, y)| fitted.set(x, y));
    let end = end.map(|end| ((end / to * width as f64) as usize).min(width.saturating_sub(1)));
    let both = measured.lines(look.draws_unicode()).into_iter().zip(fitted.lines(look.draws_unicode()));
    both.map(|(measured, fitted)| row(&measured, &fitted, end, look)).collect()
}

/// One row of characters: what was measured stands before the fit, both before the line at the end.
fn row(measured: &str, fitted: &str, end: Option<usize>, look: &Look) -> Line {
    let mut line = Line::default();
    for (column, (measured, fitted)) in measured.chars().zip(fitted.chars()).enumerate() {
        line = match (measured, fitted) {
            (' ', ' ') if end == Some(column) => line.and(Role::Quiet, look.sign("┊", "|")),
            (' ', fitted) => line.and(Role::Quiet, fitted),
            (measured, _) => line.and(Role::Plain, measured),
        };
    }
    line
}
