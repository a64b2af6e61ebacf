//! The block at the foot of the terminal, laid out for its size: where the run is, the latest sweep, the walk, time left.
//! Must not keep anything between two drawings.
//! Main function: [`block`].

use super::{state::State, sweep, walk};
use crate::instruments::{Line, Look, Role};

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
        lines.push(where_it_is(state));
    } else if look.width >= NARROW {
        lines.push(rule(state, width, look));
        lines.push(where_it_is(state));
    } else {
        lines.push(Line::of(Role::Strong, state.step.clone()).and(Role::Plain, step_of(state)));
        lines.push(Line::of(Role::Plain, capital(&left(state))));
    }
    lines
}

fn rule(state: &State, width: usize, look: &Look) -> Line {
    let sign = look.sign("─", "-");
    let line = Line::of(Role::Quiet, sign.repeat(2)).and(Role::Strong, format!(" {}", state.step));
    let line = line.and(Role::Plain, format!("{} ", step_of(state)));
    let rest = width.saturating_sub(line.width());
    line.and(Role::Quiet, sign.repeat(rest))
}

fn step_of(state: &State) -> String {
    format!(", step {} of {}", state.step_number, state.n_steps)
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

fn where_it_is(state: &State) -> Line {
    let captures = match state.captures {
        1 => "1 capture".to_owned(),
        n => format!("{n} captures"),
    };
    Line::of(Role::Plain, format!("{captures} in {}; {}", clock(state.elapsed_s), left(state)))
}

/// "about 6 min left (6 s at this pace)".
fn left(state: &State) -> String {
    let Some(bench) = state.left_s.1.filter(|left| left.is_finite()) else {
        return "time left not known yet".to_owned();
    };
    match state.rate.filter(|rate| *rate > 0.0) {
        Some(rate) => format!("about {} left ({} at this pace)", about(bench), about(bench / rate)),
        None => format!("about {} left", about(bench)),
    }
}

/// "6 min", "40 s".
pub(in crate::cli::inspect) fn about(seconds: f64) -> String {
    match seconds {
        s if s < 1.0 => "a moment".to_owned(),
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

fn capital(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or_else(String::new, |first| first.to_uppercase().chain(chars).collect())
}
