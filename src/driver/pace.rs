//! A ceiling on how fast a simulated bench's time may pass.
//! Must not slow a real bench: its clock is the wall.
//! Main type: [`Pace`].

use std::thread;
use std::time::{Duration, Instant};

/// Holds bench time back to a multiple of wall time.
#[derive(Debug, Clone)]
pub struct Pace {
    /// Bench seconds a wall second at most; none: no ceiling.
    ceiling: Option<f64>,
    began: Option<(Instant, u64)>,
}

impl Pace {
    /// A ceiling; values that are not above zero mean none.
    pub fn new(ceiling: Option<f64>) -> Self {
        Self { ceiling: ceiling.filter(|ceiling| *ceiling > 0.0), began: None }
    }

    /// Sleeps until the wall has caught up with bench time.
    pub fn hold(&mut self, elapsed_ms: u64) {
        let Some(ceiling) = self.ceiling else { return };
        let (began, first_ms) = *self.began.get_or_insert((Instant::now(), elapsed_ms));
        let wanted = elapsed_ms.saturating_sub(first_ms) as f64 / 1000.0 / ceiling;
        if let Ok(wanted) = Duration::try_from_secs_f64(wanted) {
            thread::sleep(wanted.saturating_sub(began.elapsed()));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn holds_back_to_the_ceiling() {
        let began = Instant::now();
        let mut pace = Pace::new(Some(100.0));
        for elapsed_ms in [5_000, 6_000, 8_000] {
            pace.hold(elapsed_ms);
        }
        // Three seconds of bench time at a hundredfold are 30 ms; the upper bound leaves room for a busy machine.
        assert!((30..3000).contains(&began.elapsed().as_millis()));
    }

    #[test]
    fn no_ceiling_is_no_wait() {
        let began = Instant::now();
        let mut pace = Pace::new(None);
        pace.hold(0);
        pace.hold(u64::MAX);
        assert!(began.elapsed().as_secs() < 1);
    }
}
