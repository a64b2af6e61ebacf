//! A bench over a day, a night and a change of clocks: when it holds, and what it says.
//! Must not test how sums are made.

#![allow(clippy::unwrap_used)]

use super::*;

const STATION: &str = r#"
station = "b"
time_zone = "Europe/Lisbon"
shifts = ["06:00", "14:00", "22:00"]
[power_meter]
source = "typed"
u = "1 %"
certificate = { number = "C-1", date = 2026-01-12, due = 2026-03-28 }
[[reference]]
serial = "REF-A"
type = "twin-150"
values = { power = { value = "0.91 mW", within = "3 %" } }
[[reference]]
serial = "REF-B"
type = "twin-150"
since = 2026-03-01
values = { power = { value = "0.80 mW", within = "0.02 mW" } }
"#;

fn station() -> StationFile {
    StationFile::parse("station.toml", STATION).unwrap()
}

fn check(serial: &str, at: &str, milliwatts: f64, sums: Option<(f64, f64)>) -> ReferenceCheck {
    let value = CheckedValue { measurand: "power".into(), value: milliwatts * 1e-3, sums };
    ReferenceCheck { serial: serial.into(), run_id: "r".into(), at: at.into(), stored: false, values: vec![value] }
}

fn both(at: &str) -> Vec<ReferenceCheck> {
    vec![check("REF-A", at, 0.92, None), check("REF-B", at, 0.80, None)]
}

fn held(at: &str, checks: &[ReferenceCheck]) -> Vec<String> {
    let holds = holds(&station(), DateTime::parse_from_rfc3339(at).unwrap(), Some(checks));
    holds.iter().map(|sentence| sentence.english()).collect()
}

#[test]
fn a_check_holds_for_its_own_shift_only() {
    let checks = both("2026-03-02T06:10:00+00:00");
    assert_eq!(held("2026-03-02T06:10:00+00:00", &checks), Vec::<String>::new());
    assert_eq!(held("2026-03-02T13:59:59+00:00", &checks), Vec::<String>::new());
    let due = held("2026-03-02T14:00:00+00:00", &checks);
    assert_eq!(due.len(), 2);
    let words = "Reference tube REF-A is due since 2026-03-02 14:00, the start of the shift; its last check was \
                 2026-03-02 06:10: inspect it first.";
    assert_eq!(due[0], words);
    // A check that is still to come says nothing about now.
    assert!(held("2026-03-02T06:00:00+00:00", &checks)[0].contains("REF-A was never checked here"));
}

#[test]
fn a_night_shift_is_one_over_midnight_and_over_a_change_of_clocks() {
    let checks = both("2026-03-27T22:30:00+00:00");
    assert_eq!(held("2026-03-28T05:59:00+00:00", &checks), Vec::<String>::new());
    assert_eq!(held("2026-03-28T06:00:00+00:00", &checks).len(), 2);
    // The night of 28 to 29 March ends at 06:00 summer time, 05:00 UTC.
    let checks = both("2026-03-28T22:30:00+00:00");
    let tubes = |at: &str| held(at, &checks).iter().filter(|sentence| sentence.contains("REF-")).count();
    assert_eq!((tubes("2026-03-29T04:59:59+00:00"), tubes("2026-03-29T05:00:00+00:00")), (0, 2));
}

#[test]
fn a_certificate_lasts_through_its_last_day_in_the_zone_of_the_station() {
    let due = |at: &str| {
        let at = DateTime::parse_from_rfc3339(at).unwrap().with_timezone(&station().time_zone).fixed_offset();
        holds(&station(), at, None).len()
    };
    assert_eq!((due("2026-03-28T23:59:59Z"), due("2026-03-29T00:00:00Z")), (0, 1));
}

#[test]
fn out_of_bounds_says_by_how_much_and_lasts_until_a_good_check() {
    let mut checks = both("2026-03-02T06:10:00+00:00");
    checks.push(check("REF-A", "2026-03-02T09:00:00+00:00", 0.95, None));
    let out = held("2026-03-02T09:30:00+00:00", &checks);
    assert_eq!(
        out,
        ["Reference tube REF-A was out of bounds at 2026-03-02 09:00: power 0.9500 mW is 0.0400 mW above \
          0.9100 mW, and 0.0273 mW is allowed; set the bench right and inspect it again."]
    );
    // The next shift does not wash it away.
    assert!(held("2026-03-02T14:30:00+00:00", &checks)[0].contains("out of bounds"));
    checks.push(check("REF-A", "2026-03-02T10:00:00+00:00", 0.91, None));
    assert_eq!(held("2026-03-02T10:30:00+00:00", &checks), Vec::<String>::new());
}

#[test]
fn a_drift_holds_though_every_value_is_inside() {
    let at = "2026-03-02T06:10:00+00:00";
    let checks = [check("REF-A", at, 0.92, Some((8.1, 0.0))), check("REF-B", at, 0.80, Some((0.0, 8.0)))];
    let held = held("2026-03-02T07:00:00+00:00", &checks);
    assert_eq!(held.len(), 1);
    assert!(held[0].contains("REF-A") && held[0].contains("stands at 8.1"), "{held:?}");
}

#[test]
fn checks_from_before_its_values_were_assigned_do_not_count() {
    let held = held("2026-02-27T07:00:00+00:00", &both("2026-02-27T06:10:00+00:00"));
    assert_eq!(held, ["Reference tube REF-B was never checked here: inspect it first."]);
}

#[test]
fn a_shift_without_its_end_check_is_named_once_the_next_has_begun() {
    let said =
        |at: &str, checks: &[ReferenceCheck]| unclosed(&station(), DateTime::parse_from_rfc3339(at).unwrap(), checks);
    let mut checks = both("2026-03-02T06:10:00+00:00");
    assert_eq!(said("2026-03-02T13:00:00+00:00", &checks), Vec::<String>::new());
    checks.push(check("REF-B", "2026-03-02T13:50:00+00:00", 0.80, None));
    checks.extend(both("2026-03-02T14:05:00+00:00"));
    let words = "The shift 2026-03-02 06:00 to 2026-03-02 14:00 has no end check of reference tube REF-A; see \
                 `tubewright station`.";
    assert_eq!(said("2026-03-02T14:10:00+00:00", &checks), [words]);
    checks.push(check("REF-A", "2026-03-02T13:55:00+00:00", 0.99, None));
    assert!(said("2026-03-02T14:10:00+00:00", &checks)[0].contains("ended with reference tube REF-A out of bounds"));
}

#[test]
fn a_bench_without_reference_tubes_is_not_held_for_them() {
    let text = STATION.split("[[reference]]").next().unwrap();
    let station = StationFile::parse("station.toml", text).unwrap();
    let at = DateTime::parse_from_rfc3339("2026-03-02T07:00:00+00:00").unwrap();
    assert!(holds(&station, at, Some(&[])).is_empty());
}
