//! Shifts of a bench: which one a moment lies in, by the wall clock of its zone.
//! Must not read a clock.
//! Main type: [`Shift`]; main function: [`shift_at`].

use chrono::{DateTime, Days, MappedLocalTime, NaiveDate, NaiveDateTime, NaiveTime, TimeDelta, TimeZone as _};
use chrono_tz::Tz;

/// One shift: from its start to the start of the next, which does not belong to it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Shift {
    /// When it begins.
    pub start: DateTime<Tz>,
    /// When the next begins.
    pub end: DateTime<Tz>,
}

/// The shift that a moment lies in.
///
/// * `starts`: times of day at which shifts begin, in the order of the day.
///
/// None where there are no shifts. A start that clocks going forward skip falls on the first moment after the gap; of one
/// that comes twice as clocks go back, the first counts. So a shift over such a night is an hour shorter or longer.
pub fn shift_at(starts: &[NaiveTime], zone: Tz, at: DateTime<Tz>) -> Option<Shift> {
    let at = at.with_timezone(&zone);
    let today = at.date_naive();
    let days = [today.checked_sub_days(Days::new(1)), Some(today), today.checked_add_days(Days::new(1))];
    let moments = days.into_iter().flatten().flat_map(|day| starts.iter().filter_map(move |t| moment(zone, day, *t)));
    let mut moments: Vec<DateTime<Tz>> = moments.collect();
    moments.sort();
    let next = moments.iter().position(|start| *start > at)?;
    Some(Shift { start: *moments.get(next.checked_sub(1)?)?, end: moments[next] })
}

/// A time of day as a moment: the first of two, or the first after a gap.
pub fn moment(zone: Tz, day: NaiveDate, time: NaiveTime) -> Option<DateTime<Tz>> {
    let resolve = |local: NaiveDateTime| match zone.from_local_datetime(&local) {
        MappedLocalTime::Single(moment) => Some(moment),
        MappedLocalTime::Ambiguous(first, _) => Some(first),
        MappedLocalTime::None => None,
    };
    // Gaps are of whole minutes and end within a day.
    (0..=24 * 60).find_map(|minutes| resolve(day.and_time(time).checked_add_signed(TimeDelta::minutes(minutes))?))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    const LISBON: Tz = Tz::Europe__Lisbon;

    fn shift(starts: &[&str], at: &str) -> (String, String) {
        let starts: Vec<NaiveTime> = starts.iter().map(|t| NaiveTime::parse_from_str(t, "%H:%M").unwrap()).collect();
        let at = DateTime::parse_from_rfc3339(at).unwrap().with_timezone(&LISBON);
        let shift = shift_at(&starts, LISBON, at).unwrap();
        (shift.start.to_rfc3339(), shift.end.to_rfc3339())
    }

    #[test]
    fn a_night_shift_goes_over_midnight() {
        let starts = ["06:00", "14:00", "22:00"];
        let night = ("2026-03-02T22:00:00+00:00".to_owned(), "2026-03-03T06:00:00+00:00".to_owned());
        for at in ["2026-03-02T22:00:00Z", "2026-03-02T23:59:59Z", "2026-03-03T00:00:00Z", "2026-03-03T05:59:59Z"] {
            assert_eq!(shift(&starts, at), night, "{at}");
        }
        assert_eq!(shift(&starts, "2026-03-03T06:00:00Z").0, "2026-03-03T06:00:00+00:00");
        // One start: the shift is the day from it on.
        assert_eq!(shift(&["06:00"], "2026-03-03T05:00:00Z").0, "2026-03-02T06:00:00+00:00");
        assert_eq!(shift_at(&[], LISBON, DateTime::UNIX_EPOCH.with_timezone(&LISBON)), None);
    }

    #[test]
    fn clocks_going_forward_shorten_the_night() {
        // Lisbon: 2026-03-29, 01:00 WET is 02:00 WEST (IANA time zone database).
        let (start, end) = shift(&["22:00", "06:00"][..], "2026-03-29T00:30:00Z");
        assert_eq!((start.as_str(), end.as_str()), ("2026-03-28T22:00:00+00:00", "2026-03-29T06:00:00+01:00"));
        // 01:30 does not exist that night: the shift begins with the first moment after the gap.
        assert_eq!(shift(&["01:30"], "2026-03-29T01:00:00Z").0, "2026-03-29T02:00:00+01:00");
        assert_eq!(shift(&["01:30"], "2026-03-29T00:59:59Z").0, "2026-03-28T01:30:00+00:00");
    }

    #[test]
    fn clocks_going_back_lengthen_the_night_and_no_shift_begins_twice() {
        // Lisbon: 2026-10-25, 02:00 WEST is 01:00 WET.
        let (start, end) = shift(&["06:00", "22:00"], "2026-10-25T01:30:00Z");
        assert_eq!((start.as_str(), end.as_str()), ("2026-10-24T22:00:00+01:00", "2026-10-25T06:00:00+00:00"));
        // 01:30 comes twice, at 00:30 and 01:30 UTC: the first is the start.
        for at in ["2026-10-25T00:30:00Z", "2026-10-25T01:30:00Z", "2026-10-25T23:00:00Z"] {
            assert_eq!(shift(&["01:30"], at).0, "2026-10-25T01:30:00+01:00", "{at}");
        }
    }
}
