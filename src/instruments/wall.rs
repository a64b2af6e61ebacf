//! The clock of a real bench: wall time in the station's zone, monotonic time since the run was opened.
//! Must not be used on a simulated bench, but for [`Zoned`], which shows any bench's time in the station's zone.
//! Main types: [`WallClock`], [`Zoned`].

use std::thread;
use std::time::{Duration, Instant};

use chrono::{DateTime, TimeDelta, Utc};
use chrono_tz::Tz;

use crate::record::event::Event;
use crate::station::{Clock, Moment, Trouble};

/// A wall clock that departs from the monotonic one by less is being steered, as network time does; by more it was set.
const SET_FROM_MS: i64 = 2000;

/// Where a wall clock takes its time from.
pub trait TimeSource {
    /// What the clock on the wall says.
    fn utc(&mut self) -> DateTime<Utc>;
    /// Time since some moment of this process that never runs backward.
    fn monotonic(&mut self) -> Duration;
    /// Lets time pass.
    fn sleep(&mut self, time: Duration);
}

/// The clocks of the system.
struct System(Instant);

impl TimeSource for System {
    fn utc(&mut self) -> DateTime<Utc> {
        Utc::now()
    }

    fn monotonic(&mut self) -> Duration {
        self.0.elapsed()
    }

    fn sleep(&mut self, time: Duration) {
        thread::sleep(time);
    }
}

/// Wall and monotonic clock.
///
/// Wall times follow the monotonic clock from the moment at which the run was opened or taken up again, so that they never run
/// backward; that the clock was set meanwhile is told by [`Clock::was_set`].
pub struct WallClock {
    zone: Tz,
    time: Box<dyn TimeSource>,
    /// Monotonic and wall time at which this process began, and time of the run by then.
    began: Duration,
    anchor: DateTime<Utc>,
    offset: Duration,
    /// How far the clock on the wall is known to stand off, ms.
    known_ms: i64,
    /// How far it was set since that was asked last, ms.
    set_ms: i64,
}

impl WallClock {
    /// Starts at zero, now.
    pub fn start(zone: Tz) -> Self {
        Self::over(zone, Box::new(System(Instant::now())))
    }

    /// The same over clocks of one's own.
    pub fn over(zone: Tz, mut time: Box<dyn TimeSource>) -> Self {
        let (began, anchor) = (time.monotonic(), time.utc());
        Self { zone, time, began, anchor, offset: Duration::ZERO, known_ms: 0, set_ms: 0 }
    }

    fn look(&mut self) -> (DateTime<Utc>, Duration) {
        let passed = self.time.monotonic().saturating_sub(self.began);
        let since = TimeDelta::from_std(passed).unwrap_or_default();
        let wall = self.anchor.checked_add_signed(since).unwrap_or(self.anchor);
        let step_ms = (self.time.utc() - wall).num_milliseconds() - self.known_ms;
        if step_ms.abs() >= SET_FROM_MS {
            self.known_ms += step_ms;
            self.set_ms += step_ms;
        }
        (wall, self.offset + passed)
    }
}

impl Clock for WallClock {
    fn now(&mut self) -> Moment {
        let (wall, elapsed) = self.look();
        Moment {
            wall: wall.with_timezone(&self.zone).fixed_offset(),
            elapsed_ms: u64::try_from(elapsed.as_millis()).unwrap_or(u64::MAX),
        }
    }

    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble> {
        let now = self.now().elapsed_ms;
        self.time.sleep(Duration::from_millis(elapsed_ms.saturating_sub(now)));
        Ok(())
    }

    /// The monotonic clock of a process that ended is gone: the wall says how long the gap was, never less than nothing.
    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
        let Some(last) = events.last() else { return Ok(()) };
        let now = self.time.utc();
        let stored = DateTime::parse_from_rfc3339(&last.at).map_or(now, |at| at.with_timezone(&Utc));
        let gap_ms = (now - stored).num_milliseconds();
        // Set back while nobody was here: wall times go on from the last one that was stored.
        self.anchor = now.max(stored);
        self.known_ms = gap_ms.min(0);
        self.set_ms = if gap_ms <= -SET_FROM_MS { gap_ms } else { 0 };
        let elapsed = Duration::try_from_secs_f64(last.elapsed_s).unwrap_or_default();
        self.offset = elapsed + Duration::from_millis(gap_ms.max(0).unsigned_abs());
        self.began = self.time.monotonic();
        Ok(())
    }

    fn was_set(&mut self) -> Option<f64> {
        Some(std::mem::take(&mut self.set_ms)).filter(|ms| *ms != 0).map(|ms| ms as f64 / 1000.0)
    }
}

/// Any bench's clock with its wall time in the station's zone, whose offset may change in the middle of a run.
pub struct Zoned {
    inner: Box<dyn Clock>,
    zone: Tz,
}

impl Zoned {
    /// Over a clock.
    pub fn over(inner: Box<dyn Clock>, zone: Tz) -> Self {
        Self { inner, zone }
    }
}

impl Clock for Zoned {
    fn now(&mut self) -> Moment {
        let now = self.inner.now();
        Moment { wall: now.wall.with_timezone(&self.zone).fixed_offset(), ..now }
    }

    fn wait_until(&mut self, elapsed_ms: u64) -> Result<(), Trouble> {
        self.inner.wait_until(elapsed_ms)
    }

    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
        self.inner.resume(events)
    }

    fn was_set(&mut self) -> Option<f64> {
        self.inner.was_set()
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use std::{cell::RefCell, rc::Rc};

    use super::*;
    use crate::record::event::{EVENT_VERSION, Happening};

    /// Wall and monotonic time that a test moves.
    #[derive(Clone)]
    struct Hands(Rc<RefCell<(DateTime<Utc>, Duration)>>);

    impl Hands {
        fn at(wall: &str) -> Self {
            Self(Rc::new(RefCell::new((wall.parse().unwrap(), Duration::from_secs(77)))))
        }

        fn pass(&self, seconds: u64) {
            let mut hands = self.0.borrow_mut();
            hands.0 += TimeDelta::seconds(seconds as i64);
            hands.1 += Duration::from_secs(seconds);
        }

        fn set(&self, by_s: i64) {
            self.0.borrow_mut().0 += TimeDelta::seconds(by_s);
        }
    }

    impl TimeSource for Hands {
        fn utc(&mut self) -> DateTime<Utc> {
            self.0.borrow().0
        }

        fn monotonic(&mut self) -> Duration {
            self.0.borrow().1
        }

        fn sleep(&mut self, time: Duration) {
            self.pass(time.as_secs());
        }
    }

    fn clock(hands: &Hands) -> WallClock {
        WallClock::over(chrono_tz::Europe::Lisbon, Box::new(hands.clone()))
    }

    #[test]
    fn summer_time_begins_in_mid_run_and_elapsed_time_does_not_care() {
        // Summer time began in Lisbon on 2026-03-29 at 01:00 UTC (last Sunday of March, directive 2000/84/EC).
        let hands = Hands::at("2026-03-29T00:30:00Z");
        let mut clock = clock(&hands);
        assert_eq!(clock.now().wall.to_rfc3339(), "2026-03-29T00:30:00+00:00");
        hands.pass(3600);
        let later = clock.now();
        assert_eq!((later.wall.to_rfc3339().as_str(), later.elapsed_ms), ("2026-03-29T02:30:00+01:00", 3_600_000));
        assert_eq!(clock.was_set(), None, "a change of the offset is no change of the clock");
    }

    #[test]
    fn a_clock_set_back_breaks_no_order_and_is_told_once() {
        let hands = Hands::at("2026-03-02T08:00:00Z");
        let mut clock = clock(&hands);
        hands.pass(60);
        let before = clock.now();
        hands.set(-3600);
        hands.pass(10);
        let after = clock.now();
        assert_eq!((after.wall - before.wall, after.elapsed_ms - before.elapsed_ms), (TimeDelta::seconds(10), 10_000));
        assert_eq!((clock.was_set(), clock.was_set()), (Some(-3600.0), None));
        hands.set(600);
        clock.wait_until(after.elapsed_ms + 5000).unwrap();
        assert_eq!(clock.now().elapsed_ms, after.elapsed_ms + 5000);
        assert_eq!(clock.was_set(), Some(600.0));
        // Half a second of steering is none.
        hands.0.borrow_mut().0 += TimeDelta::milliseconds(500);
        clock.now();
        assert_eq!(clock.was_set(), None);
    }

    #[test]
    fn set_back_between_two_processes_goes_on_from_the_last_event() {
        let last = Event {
            seq: 3,
            at: "2026-03-02T08:10:00.000+00:00".into(),
            elapsed_s: 600.0,
            version: EVENT_VERSION,
            what: Happening::Waited,
            before: String::new(),
        };
        let hands = Hands::at("2026-03-02T07:40:00Z");
        let mut back = clock(&hands);
        back.resume(std::slice::from_ref(&last)).unwrap();
        hands.pass(5);
        let now = back.now();
        assert_eq!((now.wall.to_rfc3339().as_str(), now.elapsed_ms), ("2026-03-02T08:10:05+00:00", 605_000));
        assert_eq!((back.was_set(), back.was_set()), (Some(-1800.0), None));
        // An ordinary gap counts, over midnight too.
        let hands = Hands::at("2026-03-03T00:10:00Z");
        let mut ordinary = clock(&hands);
        ordinary.resume(std::slice::from_ref(&last)).unwrap();
        let now = ordinary.now();
        assert_eq!((now.wall.to_rfc3339().as_str(), now.elapsed_ms), ("2026-03-03T00:10:00+00:00", 58_200_000));
        assert_eq!(ordinary.was_set(), None);
    }
}
