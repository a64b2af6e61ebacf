//! A run where nothing can be drawn again: one line after the other.
//! Must not write a control character.
//! Main type: [`Plain`].

use std::time::{Duration, Instant};

use super::super::live::about;
use crate::cli::output;
use crate::phrase::Language;
use crate::run::Progress;

/// A line about the same step is enough this often.
const LINE_EVERY: Duration = Duration::from_secs(15);

/// Lines on standard error.
#[derive(Default)]
pub(super) struct Plain {
    /// Step and time of the last progress line.
    last: Option<(String, Instant)>,
}

impl Plain {
    /// Says where the run is, if that is new or was long ago.
    ///
    /// * `rate`: bench seconds in a second of wall time.
    pub fn at(&mut self, progress: &Progress, rate: f64) {
        let due = self.last.as_ref().is_none_or(|(step, at)| *step != progress.step || at.elapsed() >= LINE_EVERY);
        if !due || progress.step.is_empty() {
            return;
        }
        self.last = Some((progress.step.clone(), Instant::now()));
        let left = progress.expected_s.map(|seconds| seconds / rate).filter(|seconds| seconds.is_finite());
        let left =
            left.map_or_else(String::new, |seconds| format!(", about {} left", about(seconds, Language::English)));
        output::talk(&format!("[{}/{}] {}{left}", progress.done_steps + 1, progress.n_steps, progress.step));
    }
}
