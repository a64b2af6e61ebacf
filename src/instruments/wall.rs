//! The clock of a real bench: wall time in the station's zone, monotonic time since the run was opened.
//! Must not be used on a simulated bench.
//! Main type: [`WallClock`].

use std::thread;
use std::time::{Duration, Instant};

use chrono::{DateTime, Utc};
use chrono_tz::Tz;

use crate::record::event::Event;
use crate::station::{Clock, Moment, Trouble};

/// Wall and monotonic clock.
#[derive(Debug, Clone)]
pub struct WallClock {
    zone: Tz,
    began: Instant,
    offset: Duration,
}

impl WallClock {
    /// Starts at zero, now.
    pub fn start(zone: Tz) -> Self {
        Self { zone, began: Instant::now(), offset: Duration::ZERO }
    }
}

impl Clock for WallClock {
    fn now(&mut self) -> Moment {
        let elapsed = self.offset + self.began.elapsed();
        Moment {
            wall: Utc::now().with_timezone(&self.zone).fixed_offset(),
            elapsed_ms: u64::try_from(elapsed.as_millis()).unwrap_or(u64::MAX),
        }
    }

    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble> {
        let now = self.now().elapsed_ms;
        thread::sleep(Duration::from_millis(elapsed_ms.saturating_sub(now)));
        Ok(())
    }

    /// The monotonic clock of a process that ended is gone: the wall says how long the gap was, never less than nothing.
    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
        let Some(last) = events.last() else { return Ok(()) };
        let gap = DateTime::parse_from_rfc3339(&last.at)
            .map_or(0, |at| (Utc::now() - at.with_timezone(&Utc)).num_milliseconds().max(0));
        let elapsed = Duration::try_from_secs_f64(last.elapsed_s).unwrap_or_default();
        self.offset = elapsed + Duration::from_millis(gap.unsigned_abs());
        self.began = Instant::now();
        Ok(())
    }
}
