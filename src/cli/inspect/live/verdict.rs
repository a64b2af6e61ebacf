//! The verdict in its box: square for a pass, a corner cut off for a fail, edges hatched for a hold, dashed for a run that was stopped.
//! Must not let a verdict rest on ink: the word stands in the box, and each box has its own shape.
//! Main function: [`verdict_lines`].

use crate::instruments::{Line, Look, Role};
use crate::record::sheet::Outcome;

/// Most columns of the box.
const MOST: usize = 96;

/// Left edge, right edge, the sign of the upper and lower edge, upper corners.
struct Box {
    left: &'static str,
    right: &'static str,
    edge: &'static str,
    corners: [&'static str; 4],
}

fn shape(outcome: Outcome, look: &Look) -> Box {
    let (vertical, horizontal) = (look.sign("│", "|"), look.sign("─", "-"));
    let square = [look.sign("┌", "+"), look.sign("┐", "+"), look.sign("└", "+"), look.sign("┘", "+")];
    let plain = Box { left: vertical, right: vertical, edge: horizontal, corners: square };
    match outcome {
        Outcome::Pass => plain,
        Outcome::Fail => Box { corners: [square[0], look.sign("╲", "\\"), square[2], square[3]], ..plain },
        Outcome::Hold => {
            let hatch = look.sign("▒", "#");
            Box { left: hatch, right: hatch, corners: [hatch; 4], ..plain }
        }
        Outcome::Open | Outcome::Stopped => {
            let dash = look.sign("┆", ":");
            Box { left: dash, right: dash, edge: look.sign("┄", "."), corners: [dash; 4] }
        }
    }
}

/// Serial and sentence, and below them the reason.
pub(in crate::cli::inspect) fn verdict_lines(
    serial: &str,
    outcome: Outcome,
    sentence: &str,
    reason: &str,
    look: &Look,
) -> Vec<Line> {
    let width = look.width.saturating_sub(1).min(MOST);
    let role = if outcome == Outcome::Pass { Role::Strong } else { Role::Alert };
    let shape = shape(outcome, look);
    let most = width.saturating_sub(4);
    let nothing = Line::default();
    let sentence = format!("{serial}: {sentence}");
    let mut inside = nothing.clone().wrapped(&sentence, Role::Strong, &nothing, most);
    if !reason.is_empty() {
        inside.extend(nothing.clone().wrapped(reason, Role::Plain, &nothing, most));
    }
    let edge = |left: &'static str, right: &'static str, columns: usize| {
        Line::of(role, left).and(role, shape.edge.repeat(columns)).and(role, right)
    };
    // The cut corner takes a column of the upper edge.
    let cut = usize::from(outcome == Outcome::Fail);
    let mut lines = vec![edge(shape.corners[0], shape.corners[1], width.saturating_sub(2 + cut))];
    for line in inside {
        let line = Line::of(role, shape.left).and(Role::Plain, " ").then(line).to_column(width.saturating_sub(1));
        lines.push(line.and(role, shape.right));
    }
    lines.push(edge(shape.corners[2], shape.corners[3], width.saturating_sub(2)));
    lines
}
