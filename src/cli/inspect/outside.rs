//! `--stop`: an unfinished run that no process holds is ended with a reason, from outside.
//! Must not measure or ask anything: what was measured is kept, the rest is left empty.
//! Main function: [`stop`].

use chrono::DateTime;

use super::{Format, earlier, finish, show::Show};
use crate::cli::{Ending, Failure};
use crate::disk::{DiskError, RunFolder, SerialLock, Store};
use crate::driver::{Driver, resume};
use crate::instruments::{NoInstrument, Nobody, Screen, WallClock};
use crate::record::event::{Event, Identity, Opened};
use crate::run::{Plan, Run};
use crate::station::{Bench, Clock, Interlock, Moment, Trouble};

/// Stops the unfinished run of a serial.
///
/// Errors: there is none, or a process holds it (Ctrl-C there), or the store says no.
pub(super) fn stop(store: &Store, serial: &str, why: &str, format: Format) -> Result<Ending, Failure> {
    let reason = earlier::reason(why)?;
    let disk = |error: DiskError| Failure::store(&error);
    let open = |store: &Store| -> Result<_, Failure> {
        store.runs_of(serial).map_err(disk)?.into_iter().rfind(|run| !run.frozen).ok_or_else(|| {
            Failure::unusable(format!("`{serial}` has no unfinished run in `{}` to stop", store.reports().display()))
        })
    };
    // Looked for before the lock too, so that a serial nobody knows leaves nothing behind.
    open(store)?;
    let since = chrono::Utc::now().format("%Y-%m-%dT%H:%M:%SZ").to_string();
    let _lock = SerialLock::take(store.reports(), serial, &since).map_err(disk)?;
    let found = open(store)?;
    let Opened { identity, recipe, limits, station } = found.opened;
    let plan = Plan::from_texts(&recipe, &limits, &station).map_err(|faults| super::inputs::faulty("plan", &faults))?;
    let mut bench = bench(&identity, &plan, reason);
    let mut run = Run::open(plan, identity);
    let (mut journal, events) = RunFolder::reopen(&found.path).map_err(disk)?;
    let mut show = Show::new(format, None, Screen::plain(), false);
    resume(&mut run, &mut bench, &mut journal, &events).map_err(|why| super::interrupted(&why, journal.path()))?;
    Driver { run: &mut run, bench: &mut bench, journal: &mut journal, engine: None, watcher: &mut show }
        .drive()
        .map_err(|why| super::interrupted(&why, journal.path()))?;
    finish(&run, &mut journal, Some(&mut show)).map(|sheet| super::ending_of(&sheet))
}

/// Nothing but a clock and the key that stops.
fn bench(identity: &Identity, plan: &Plan, reason: String) -> Bench {
    let none = || Box::new(NoInstrument { reason: reason.clone() });
    // Bench time that is not the wall's stands still where the run was left.
    let clock: Box<dyn Clock> = match identity.simulated || identity.from_captures {
        true => Box::new(StillClock(None)),
        false => Box::new(WallClock::start(plan.station.time_zone)),
    };
    Bench {
        clock,
        captures: none(),
        meters: none(),
        person: Box::new(Nobody::LeavesOpen(String::new())),
        interlock: Box::new(StopNow(reason.clone())),
    }
}

/// Stops at once.
struct StopNow(String);

impl Interlock for StopNow {
    fn make_safe(&mut self) -> Result<(), Trouble> {
        Err(Trouble::NotHere("stopped from outside: nobody stood at the switch".into()))
    }

    fn stop_key(&mut self) -> Result<(), Trouble> {
        Err(Trouble::Stopped(self.0.clone()))
    }
}

/// Stands where the last event left it.
struct StillClock(Option<Moment>);

impl Clock for StillClock {
    fn now(&mut self) -> Moment {
        self.0.unwrap_or(Moment { wall: DateTime::default(), elapsed_ms: 0 })
    }

    fn wait_until(&mut self, _: u64) -> Result<(), Trouble> {
        Ok(())
    }

    fn resume(&mut self, events: &[Event]) -> Result<(), Trouble> {
        let of = |event: &Event| {
            let wall = DateTime::parse_from_rfc3339(&event.at).ok()?;
            Some(Moment { wall, elapsed_ms: (event.elapsed_s * 1000.0).round() as u64 })
        };
        self.0 = events.last().and_then(of);
        Ok(())
    }
}
