//! The block at the foot of the terminal, laid out for its size: where the run is, the latest sweep, the walk, time left.
//! Must not keep anything between two drawings.
//! Main function: [`block`].

use super::{state::State, sweep, walk};
use crate::instruments::{Line, Look, Role};
use crate::phrase::{Language, figure, name, terminal};

/// Below this many columns there are words only.
pub(in crate::cli::inspect) const NARROW: usize = 60;
/// From this many columns on, sweep and walk stand side by side.
const WIDE: usize = 112;
/// Most columns of a sweep.
const SWEEP_WIDTH: usize = 96;

/// The lines, top first; at most two thirds of the terminal.
pub(super) fn block(state: &State, look: &Look) -> Vec<Line> {
    let width = look.width.saturating_sub(1);
    let room = look.height * 2 / 3;
    let mut lines = Vec::new();
    if look.width >= NARROW && room >= 8 && state.sweep.is_some() {
        lines.push(rule(state, width, look));
        if width >= WIDE {
            lines.extend(side_by_side(state, width, (room - 2).min(11), look));
        } else {
            lines.extend(stacked(state, width, room - 2, look));
        }
        lines.push(where_it_is(state, look));
    } else if look.width >= NARROW {
        lines.push(rule(state, width, look));
        lines.push(where_it_is(state, look));
    } else {
        lines.push(Line::of(Role::Strong, step_of(state, look)));
        lines.push(Line::of(Role::Plain, left(state, look)));
    }
    lines
}

fn rule(state: &State, width: usize, look: &Look) -> Line {
    let sign = look.sign("─", "-");
    let line = Line::of(Role::Quiet, sign.repeat(2)).and(Role::Strong, format!(" {} ", step_of(state, look)));
    let rest = width.saturating_sub(line.width());
    line.and(Role::Quiet, sign.repeat(rest))
}

fn step_of(state: &State, look: &Look) -> String {
    let pieces = [name(state.step.as_str()), figure(state.step_number), figure(state.n_steps)];
    terminal::STEP_OF.with(pieces).text(look.language)
}

fn side_by_side(state: &State, width: usize, rows: usize, look: &Look) -> Vec<Line> {
    let left = (width * 3 / 5).min(SWEEP_WIDTH);
    let right = (width - left - 4).min(SWEEP_WIDTH);
    let sweeps = sweep::panel(state.sweep.as_ref(), left, rows, look);
    let walks = walk::panel(state.walk.as_ref(), state.left_s.0, right, rows, look);
    sweeps.into_iter().zip(walks).map(|(sweep, walk)| sweep.to_column(left + 4).then(walk)).collect()
}

fn stacked(state: &State, width: usize, rows: usize, look: &Look) -> Vec<Line> {
    // A strip of less than two rows of dots says nothing.
    let is_walking = state.walk.as_ref().is_some_and(|walk| walk.dwell_end.is_none());
    let of_walk = if rows >= 14 && is_walking { (rows * 2 / 5).clamp(6, 8) } else { 0 };
    let mut lines = sweep::panel(state.sweep.as_ref(), width, (rows - of_walk).min(11), look);
    if of_walk > 0 {
        lines.extend(walk::panel(state.walk.as_ref(), state.left_s.0, width, of_walk, look));
    }
    lines
}

fn where_it_is(state: &State, look: &Look) -> Line {
    let pieces = [figure(state.captures), figure(clock(state.elapsed_s)), name(left(state, look))];
    Line::of(Role::Plain, terminal::CAPTURES.with(pieces).text(look.language))
}

/// "about 6 min left (6 s at this pace)".
fn left(state: &State, look: &Look) -> String {
    let Some(bench) = state.left_s.1.filter(|left| left.is_finite()) else {
        return terminal::LEFT_UNKNOWN.of(look.language).to_owned();
    };
    let here = about(bench, look.language);
    match state.rate.filter(|rate| *rate > 0.0) {
        Some(rate) => terminal::LEFT_PACED.with([name(here), name(about(bench / rate, look.language))]),
        None => terminal::LEFT.with([name(here)]),
    }
    .text(look.language)
}

/// "6 min", "40 s".
pub(in crate::cli::inspect) fn about(seconds: f64, language: Language) -> String {
    match seconds {
        s if s < 1.0 => terminal::A_MOMENT.of(language).to_owned(),
        s if s < 90.0 => format!("{s:.0} s"),
        s => format!("{:.0} min", s / 60.0),
    }
}

/// "12 min 05 s".
fn clock(seconds: f64) -> String {
    let whole = seconds.max(0.0).round() as u64;
    match (whole / 3600, whole / 60 % 60, whole % 60) {
        (0, 0, seconds) => format!("{seconds} s"),
        (0, minutes, seconds) => format!("{minutes} min {seconds:02} s"),
        (hours, minutes, _) => format!("{hours} h {minutes:02} min"),
    }
}
