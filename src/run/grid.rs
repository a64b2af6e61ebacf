//! Times of captures: close together at first, then wider, fixed on one origin.
//! Must not read a clock.
//! Main type: [`Grid`].

/// Times origin + k·early below `early_for`, then origin + early_for + k·every; ms.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Grid {
    origin_ms: u64,
    early_every_ms: u64,
    early_for_ms: u64,
    every_ms: u64,
}

impl Grid {
    /// Seconds in; anything below a millisecond or not finite counts as one.
    pub fn new(origin_ms: u64, early_every_s: f64, early_for_s: f64, every_s: f64) -> Self {
        // `as` saturates and turns NaN into 0.
        let ms = |seconds: f64| (seconds * 1e3).round() as u64;
        let every_ms = ms(every_s).max(1);
        let early_every_ms = ms(early_every_s).max(1);
        Self { origin_ms, early_every_ms, early_for_ms: ms(early_for_s), every_ms }
    }

    /// First time of the grid at or after a time.
    pub fn at_or_after(&self, time_ms: u64) -> u64 {
        let since = time_ms.saturating_sub(self.origin_ms);
        let early = since.div_ceil(self.early_every_ms).saturating_mul(self.early_every_ms);
        let offset = if early < self.early_for_ms {
            early
        } else {
            let late = since.saturating_sub(self.early_for_ms).div_ceil(self.every_ms);
            self.early_for_ms.saturating_add(late.saturating_mul(self.every_ms))
        };
        self.origin_ms.saturating_add(offset)
    }

    /// First time of the grid after a time.
    pub fn after(&self, time_ms: u64) -> u64 {
        self.at_or_after(time_ms.saturating_add(1))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_change_after_the_early_minutes_and_gaps_are_skipped() {
        let grid = Grid::new(1000, 0.2, 1.0, 0.5);
        let mut times = vec![grid.at_or_after(0)];
        while times.len() < 8 {
            times.push(grid.after(times[times.len() - 1]));
        }
        assert_eq!(times, [1000, 1200, 1400, 1600, 1800, 2000, 2500, 3000]);
        assert_eq!(grid.after(1_950), 2000);
        assert_eq!(grid.after(12_001), 12_500);
        assert_eq!(Grid::new(u64::MAX, f64::NAN, f64::INFINITY, -1.0).after(u64::MAX), u64::MAX);
    }
}
