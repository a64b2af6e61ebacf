//! A run on a terminal: finished rows scroll away above, a small block at the foot shows where the run is.
//! Must not judge, and must not hold the bench up: it draws a few times in a second of wall time, whatever the bench does.
//! Main type: [`Live`].

mod axis;
mod block;
mod canvas;
mod rows;
mod state;
mod sweep;
#[cfg(test)]
mod tests;
mod verdict;
mod walk;

pub(super) use self::block::about;
pub(super) use self::{rows::row_lines, verdict::verdict_lines};

use std::time::{Duration, Instant};

use self::state::{State, Sweep};
use crate::instruments::{Line, Look, Role, Screen};
use crate::record::finding::{CaptureFinding, Trace};
use crate::run::Run;

/// Time from drawing to drawing.
const DRAW_EVERY: Duration = Duration::from_millis(200);
/// Rows kept free for a question below the block.
const QUESTION_ROWS: usize = 12;

/// The block and what stands above it.
pub(super) struct Live {
    screen: Screen,
    state: State,
    drawn_at: Option<Instant>,
    swept_at: Option<Instant>,
    /// No sweep of the step at hand was seen yet.
    is_new_step: bool,
}

impl Live {
    pub fn new(screen: Screen) -> Self {
        Self { screen, state: State::default(), drawn_at: None, swept_at: None, is_new_step: true }
    }

    /// The sweep at hand is an old one: the next may take its place.
    pub fn looks(&self) -> bool {
        is_due(self.swept_at)
    }

    /// A capture was taken.
    pub fn captured(&mut self) {
        self.state.captures += 1;
    }

    /// The latest sweep.
    pub fn swept(&mut self, finding: &CaptureFinding, trace: Option<Trace>) {
        let same_step = self.state.sweep.as_ref().filter(|_| !self.is_new_step);
        let top = same_step.map_or(0.0, |sweep| sweep.top);
        self.is_new_step = false;
        self.swept_at = Some(Instant::now());
        self.state.sweep = Some(Sweep::of(self.state.captures + 1, finding, trace, top));
    }

    /// Where the run is now; drawn if it is due or another step began.
    ///
    /// * `rate`: bench seconds in a second of wall time, on a simulated bench.
    pub fn at(&mut self, run: &Run, elapsed_s: f64, rate: Option<f64>) {
        let progress = run.progress();
        let is_new = progress.step != self.state.step;
        self.is_new_step |= is_new;
        self.state.elapsed_s = elapsed_s;
        if progress.step.is_empty() || !(is_new || is_due(self.drawn_at)) {
            return;
        }
        self.state.step_number = progress.done_steps + 1;
        self.state.n_steps = progress.n_steps;
        self.state.left_s = (progress.step_s, progress.expected_s);
        self.state.rate = rate;
        self.state.walk = run.walk();
        self.state.step = progress.step;
        self.draw(&[]);
    }

    /// Lines that stay.
    pub fn lasting(&mut self, lines: &[Line]) {
        self.draw(lines);
    }

    /// Words that stay.
    pub fn say(&mut self, role: Role, words: &str) {
        let most = self.screen.look().width.saturating_sub(1);
        let lines = words.lines().flat_map(|line| {
            let indent = line.len() - line.trim_start().len();
            let hanging = Line::of(role, " ".repeat(indent));
            hanging.clone().wrapped(line, role, &hanging, most)
        });
        self.draw(&lines.collect::<Vec<_>>());
    }

    /// A question comes below the block, which makes room for it.
    pub fn asking(&mut self) {
        let mut look = self.screen.look();
        let whole = look;
        // The block takes two thirds of what it is given.
        look.height = look.height.min(look.height.saturating_sub(QUESTION_ROWS) * 3 / 2);
        self.screen.draw(&whole, &[], self.foot(&look));
        self.screen.step_below();
        self.drawn_at = None;
    }

    /// Takes the block away.
    pub fn clear(&mut self) {
        self.screen.clear();
        self.drawn_at = None;
    }

    fn draw(&mut self, lasting: &[Line]) {
        let look = self.screen.look();
        self.screen.draw(&look, lasting, self.foot(&look));
        self.drawn_at = Some(Instant::now());
    }

    fn foot(&self, look: &Look) -> Vec<Line> {
        if self.state.step.is_empty() { Vec::new() } else { block::block(&self.state, look) }
    }

    /// The run is at its end: nothing is drawn at the foot any more.
    pub fn over(&mut self) {
        self.clear();
        self.state = State::default();
    }

    pub fn screen(&self) -> &Screen {
        &self.screen
    }
}

/// What was done then may be done again.
fn is_due(then: Option<Instant>) -> bool {
    then.is_none_or(|at| at.elapsed() >= DRAW_EVERY)
}
