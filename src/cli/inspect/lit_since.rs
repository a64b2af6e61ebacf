//! Since when a tube burns already, as a technician says it.
//! Must not read a clock: the start of the run comes in.
//! Main function: [`lit_since`].

use chrono::{DateTime, FixedOffset, NaiveTime, TimeDelta};
use chrono_tz::Tz;

use crate::cli::Failure;
use crate::quantity::{Dimension, parse_as};
use crate::station::shift::moment;

/// The start of a run, for messages.
pub(super) const RUN: &str = "the start of the run";

/// Reads a time of day of the station's today, a time in RFC 3339, or an age such as `40 min`.
///
/// * `from`: where it was given, for messages: `--lit-since`.
/// * `end`: what `started_at` is, for messages: [`RUN`].
/// * `started_at`: when the run starts, in the station's zone; where a tube goes into the rack, now.
///
/// Errors: it is none of these, or lies after the start.
pub(in crate::cli) fn lit_since(
    from: &str,
    text: &str,
    (end, started_at): (&str, DateTime<FixedOffset>),
    zone: Tz,
) -> Result<DateTime<FixedOffset>, Failure> {
    let text = text.trim();
    let whole = || DateTime::parse_from_rfc3339(text).ok();
    let time = || ["%H:%M", "%H:%M:%S"].iter().find_map(|form| NaiveTime::parse_from_str(text, form).ok());
    let of_today = || moment(zone, started_at.with_timezone(&zone).date_naive(), time()?).map(|at| at.fixed_offset());
    let age = || {
        let seconds = parse_as(text, Dimension::Time).ok()?;
        started_at.checked_sub_signed(TimeDelta::try_milliseconds((seconds * 1e3).round() as i64)?)
    };
    let Some(since) = whole().or_else(of_today).or_else(age) else {
        return Err(Failure::unusable(format!(
            "{from} is `{text}`; expected a time of today such as 07:40, a time such as 2026-03-02T07:40:00+00:00 \
             (RFC 3339), or an age such as \"40 min\""
        )));
    };
    if since > started_at {
        return Err(Failure::unusable(format!(
            "{from} is {}, after {} at {}; expected a time before it: of yesterday say the date too, \
             or give an age such as \"40 min\"",
            since.with_timezone(&zone).format("%Y-%m-%d %H:%M"),
            end,
            started_at.format("%Y-%m-%d %H:%M")
        )));
    }
    Ok(since.with_timezone(&zone).fixed_offset())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn read(text: &str, start: &str) -> Result<String, String> {
        let zone = Tz::Europe__Lisbon;
        let start = DateTime::parse_from_rfc3339(start).unwrap().with_timezone(&zone).fixed_offset();
        lit_since("--lit-since", text, (RUN, start), zone).map(|at| at.to_rfc3339()).map_err(|failure| failure.message)
    }

    #[test]
    fn every_form_is_read_in_the_zone_of_the_station() {
        let summer = "2026-07-01T08:00:00Z";
        for text in ["08:20", "08:20:00", "2026-07-01T07:20:00Z", "40 min", "2400 s"] {
            assert_eq!(read(text, summer), Ok("2026-07-01T08:20:00+01:00".to_owned()), "{text}");
        }
        // An age goes over midnight and over the night the clocks change.
        assert_eq!(read("2 h", "2026-03-29T01:30:00Z"), Ok("2026-03-28T23:30:00+00:00".to_owned()));
    }

    #[test]
    fn the_future_and_what_is_no_time_are_refused() {
        for text in ["09:01", "2026-07-01T08:00:01Z", "-5 min"] {
            assert!(read(text, "2026-07-01T08:00:00Z").unwrap_err().contains("after the start of the run"), "{text}");
        }
        // Ten to midnight, said at ten past: yesterday's must be said as such.
        assert!(read("23:50", "2026-03-03T00:10:00Z").unwrap_err().contains("of yesterday say the date too"));
        for text in ["", "soon", "40", "25:00", "1e300 h", "3 MHz"] {
            assert!(read(text, "2026-07-01T08:00:00Z").unwrap_err().contains("expected a time of today"), "{text}");
        }
    }
}
