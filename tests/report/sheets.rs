//! Made-up sheets for the tests of the report: sound, failing, held, in doubt, stopped, empty, and with very long text.
//! Must not be taken for measurements: every number is invented.
//! Main functions: [`pass`] and its variations.

use chrono::{DateTime, FixedOffset, NaiveDate};
use tubewright::{
    measurand,
    phrase::{Saying, opening},
    record::{event::Identity, finding::Trace, sheet::*},
    uncertainty::{BudgetLine, Evaluation},
};

fn at(text: &str) -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339(text).unwrap()
}

/// A number in the unit of the catalogue with its expanded uncertainty for k = 2.
pub fn number(key: &str, value: f64, expanded: f64) -> Value {
    let factor = measurand::find(key).unwrap().unit().factor;
    Value::Number {
        value: value * factor,
        u: expanded * factor / 2.0,
        expanded: expanded * factor,
        k: 2.0,
        dof: f64::INFINITY,
    }
}

pub fn row(step: &str, key: &str, value: Value) -> Row {
    let label = measurand::find(key).map_or_else(|| say(key.replace("visual.", "")), |m| (&m.name).into());
    Row {
        step: step.into(),
        measurand: key.into(),
        label,
        value,
        budget: vec![],
        judged: vec![],
        deciding: false,
        note: Saying::none(),
    }
}

/// One judgement; bounds in the unit of the catalogue.
pub fn judged(key: &str, grade: &str, lower: Option<f64>, upper: Option<f64>, p: Option<f64>) -> Judged {
    let factor = measurand::find(key).map_or(1.0, |m| m.unit().factor);
    Judged {
        grade: grade.into(),
        lower: lower.map(|v| v * factor),
        upper: upper.map(|v| v * factor),
        wanted: vec![],
        rule: "guarded".into(),
        conformance_probability: p,
        zone: p.map(|_| Zone::InsideByU),
        verdict: RowVerdict::Pass,
        reject_code: None,
    }
}

fn limited(step: &str, key: &str, value: (f64, f64), lower: Option<f64>, upper: Option<f64>) -> Row {
    let mut row = row(step, key, number(key, value.0, value.1));
    row.judged = vec![judged(key, "", lower, upper, Some(0.999_99))];
    row
}

fn count(step: &str, key: &str, value: u64, lower: Option<f64>, upper: Option<f64>) -> Row {
    let mut row = row(step, key, Value::Count { value, low: value, high: value });
    if lower.is_some() || upper.is_some() {
        row.judged = vec![judged(key, "", lower, upper, None)];
    }
    row
}

fn look(name: &str, word: &str) -> Row {
    let mut row = row(name, &format!("visual.{name}"), Value::Word(word.into()));
    row.label = Saying::of(opening(say(name.replace('_', " "))));
    row.judged = vec![Judged { wanted: vec!["clean".into()], ..judged("", "", None, None, None) }];
    row
}

fn rows() -> Vec<Row> {
    let mut spacing = limited("comb", "mode_spacing", (998.7, 3.0), Some(979.3), Some(1019.3));
    let direct = |id: &str, line: &str, kind, u: f64, dof| BudgetLine::direct(id, line, kind, u, dof);
    spacing.budget = vec![
        direct("scatter", "scatter of the slope", Evaluation::TypeA, 0.4e6, 57.0),
        direct("SIM-0001", "free spectral range", Evaluation::TypeB, 1.44e6, f64::INFINITY),
    ];
    let mut power = row("output", "power", number("power", 0.88, 0.015));
    power.judged = vec![judged("power", "prime", Some(0.5), None, Some(0.999_999))];
    let mut rows = vec![
        spacing,
        row("comb", "mirror_spacing", number("mirror_spacing", 150.05, 0.46)),
        count("comb", "mode_count_min", 1, Some(1.0), None),
        count("comb", "mode_count_max", 2, None, Some(2.0)),
        limited("comb", "off_axis_ratio", (0.4, 0.2), None, Some(2.0)),
        row("comb", "finesse", number("finesse", 61.2, 2.4)),
        limited("polarizer", "mode_orthogonality", (89.6, 1.1), Some(85.0), Some(95.0)),
        power,
        limited("output", "power_ripple", (7.1, 0.6), None, Some(20.0)),
        limited("warm", "warmup_tau", (6.3, 0.3), None, Some(12.0)),
        row("warm", "warmup_ready", number("warmup_ready", 28.61, 0.41)),
        row("warm", "walk_growth", number("walk_growth", 18.6, 0.1)),
        row("warm", "walk_rate", number("walk_rate", -41.2, 2.2)),
        count("watching", "hop_count", 0, None, Some(0.0)),
        count("watching", "swap_count", 0, None, Some(0.0)),
        row("watching", "cycles_watched", number("cycles_watched", 57.9, 0.1)),
        limited("strike", "start_delay", (0.6, 0.1), None, Some(2.0)),
        count("strike", "start_tries", 1, None, Some(2.0)),
        limited("supply", "run_voltage", (0.98, 0.01), Some(0.9), Some(1.02)),
        limited("supply", "dropout_fraction", (74.0, 3.0), None, Some(90.0)),
    ];
    rows.push(look("output_mirror", "clean"));
    rows
}

/// Signal of the invented sweep at a detuning, V.
fn signal(detuning: f64) -> f64 {
    let line = |center: f64, height: f64| height / (1.0 + ((detuning - center) / 45e6).powi(2));
    line(2e9, 0.7) + line(3e9, 1.0) + line(8.4e9, 0.7) + line(9.4e9, 1.0)
}

fn sweep_chart() -> SweepChart {
    let detuning: Vec<f64> = (0..600).map(|i| i as f64 * 10e9 / 599.0).collect();
    let wiggle = |i: usize| 0.006 * ((i * 7919 % 101) as f64 / 50.0 - 1.0);
    let low = detuning.iter().enumerate().map(|(i, &d)| signal(d) - 0.004 + wiggle(i)).collect();
    let high = detuning.iter().enumerate().map(|(i, &d)| signal(d) + 0.004 + wiggle(i)).collect();
    let mode = |name: &str, offset, peak_height| ChartMode {
        name: name.into(),
        offset,
        peak_height,
        fwhm: 90e6,
        off_axis: false,
    };
    SweepChart {
        taken_at: Some(at("2026-03-02T10:41:07+00:00")),
        trace: Trace { detuning, low, high, marks: vec![(0, 2e9), (1, 3e9), (0, 8.4e9), (1, 9.4e9)] },
        modes: vec![mode("a", 0.0, 0.7), mode("b", 1e9, 1.0)],
        free_spectral_range: 6.4e9,
    }
}

fn gain_chart() -> GainChart {
    let height = |x: f64| (1.0 - (x / 640e6).powi(4)).max(0.0) * (1.0 - 0.3 * (-(x / 160e6).powi(2)).exp());
    let points = (0..110).map(|i| (i as f64 - 54.5) * 11.5e6).map(|x| (x, height(x), 0.012)).collect();
    GainChart { cycles: 57.9, points }
}

fn walk_chart() -> WalkChart {
    let walk = |t: f64| 58.9 * (1.0 - (-t / 378.0).exp());
    WalkChart {
        points: (0..180).map(|i| i as f64 * 9.7).map(|t| (t, walk(t))).collect(),
        prediction: (0..200).map(|i| i as f64 * 12.0).map(|t| (t, walk(t))).collect(),
        tau: Some((378.0, 18.0)),
        ready: Some((1716.6, 24.6)),
        dwell_end: Some(1744.0),
        hops: vec![],
        swaps: vec![],
    }
}

fn instrument(role: &str, what: &str, certificate: &str) -> Instrument {
    let due = NaiveDate::from_ymd_opt(2027, 1, 12);
    Instrument { role: say(role), what: say(what), certificate: certificate.into(), due, overdue: false }
}

/// Words that are in no table.
pub fn say(text: impl AsRef<str>) -> Saying {
    Saying::outside(text.as_ref())
}

/// A sound tube of the best grade.
pub fn pass() -> Sheet {
    let revision = |digit: &str| Revision { revision: 1, sha256: digit.repeat(64) };
    Sheet {
        identity: Identity {
            run_id: "019cad3e-6f10-7c51-a2d4-3b1f0c9e7a55".into(),
            serial: "DEMO-0001".into(),
            tube_type: "twin-150".into(),
            supplier: "A".into(),
            lot: "A-twin-01".into(),
            condition: "sound, clean".into(),
            received: "2026-03-02".into(),
            technician: "KT".into(),
            started_at: "2026-03-02T10:12:40.000+00:00".into(),
            time_zone: "Europe/Lisbon".into(),
            simulated: true,
            from_captures: false,
            times_assumed: false,
            program_version: "0.1.0".into(),
            ..Default::default()
        },
        title: say("Two-mode tube, random polarization, mirrors 150 mm apart"),
        station: "bench-1".into(),
        started_at: Some(at("2026-03-02T10:12:40+00:00")),
        ended_at: Some(at("2026-03-02T10:46:52+00:00")),
        dwell: Some(1744.0),
        recipe: revision("1"),
        limits: revision("2"),
        station_file: Revision { revision: 0, sha256: "3".repeat(64) },
        rule: "guarded".into(),
        instruments: vec![
            instrument("interferometer", "6.4 GHz ± 0.3 %", "SIM-0001"),
            instrument("power meter", "± 3 %", "SIM-0002"),
            instrument("supply", "ballast 75 kΩ", "SIM-0003"),
        ],
        verdict: TubeVerdict {
            outcome: Outcome::Pass,
            grade: Some("prime".into()),
            reject_code: None,
            sentence: say("pass, grade prime."),
            reason: Saying::none(),
        },
        rows: rows(),
        sweep_chart: Some(sweep_chart()),
        gain_chart: Some(gain_chart()),
        walk_chart: Some(walk_chart()),
        run_current: None,
        remarks: vec![],
        caution: say(
            "Laser light, start pulses to 10 kV, stored charge, glass under vacuum. Power in the range of class 2 \
                  (IEC 60825-1): treat as at least 2. Local rules and licensed practice decide.",
        ),
        measured_by: Some(MeasuredBy {
            initials: "KT".into(),
            at: at("2026-03-02T10:46:52+00:00"),
            meaning: say("measured"),
        }),
    }
}

/// Row of a measurand.
pub fn row_mut<'a>(sheet: &'a mut Sheet, key: &str) -> &'a mut Row {
    sheet.rows.iter_mut().find(|row| row.measurand == key).unwrap()
}

/// A tube below the last grade's bound.
pub fn fail() -> Sheet {
    let mut sheet = pass();
    sheet.identity.serial = "DEMO-0004".into();
    sheet.verdict = TubeVerdict {
        outcome: Outcome::Fail,
        grade: None,
        reject_code: Some("dim".into()),
        sentence: say("fail, dim."),
        reason: say("Power 0.220 mW is below 0.30 mW. Likely cause: helium lost (0.8; deeper red-orange, lasing span \
                 short); next: air leak (0.1)."),
    };
    let power = row_mut(&mut sheet, "power");
    power.value = number("power", 0.22, 0.015);
    power.judged = [("prime", 0.5), ("alignment", 0.3)]
        .map(|(grade, bound)| Judged {
            verdict: RowVerdict::Fail,
            zone: Some(Zone::OutsideByU),
            reject_code: Some("dim".into()),
            ..judged("power", grade, Some(bound), None, Some(1.2e-26))
        })
        .into();
    power.deciding = true;
    power.note = say("dim: below 0.30 mW, the last grade's bound");
    let swaps = row_mut(&mut sheet, "swap_count");
    swaps.value = Value::Count { value: 2, low: 2, high: 2 };
    swaps.judged[0].verdict = RowVerdict::Fail;
    swaps.judged[0].reject_code = Some("axis-swaps".into());
    let walk = sheet.walk_chart.as_mut().unwrap();
    walk.swaps = vec![305.0, 911.0];
    walk.hops = vec![(620.0, 999e6)];
    sheet
}

/// A bound of a hold limit was passed.
pub fn hold() -> Sheet {
    let mut sheet = pass();
    sheet.identity.serial = "DEMO-0011".into();
    sheet.verdict = TubeVerdict {
        outcome: Outcome::Hold,
        grade: None,
        reject_code: None,
        sentence: say("hold."),
        reason: say(
            "Mains ripple 0.90 % points at the supply, not at the tube: repeat on another supply. No verdict on \
                 the tube is given.",
        ),
    };
    let mut ripple = limited("noise", "line_ripple", (0.9, 0.01), None, Some(0.5));
    ripple.judged[0].verdict = RowVerdict::Hold;
    ripple.judged[0].zone = Some(Zone::OutsideByU);
    ripple.judged[0].conformance_probability = Some(0.0);
    ripple.deciding = true;
    ripple.note = say("outside 0.5 %: gives hold, not fail");
    sheet.rows.insert(9, ripple);
    sheet.instruments[1].overdue = true;
    sheet.instruments[1].due = NaiveDate::from_ymd_opt(2026, 1, 12);
    sheet.remarks = vec![say("The power meter's certificate ended on 2026-01-12.")];
    sheet
}

/// The best grade lost in doubt.
pub fn doubt() -> Sheet {
    let mut sheet = pass();
    sheet.identity.serial = "DEMO-0009".into();
    sheet.identity.simulated = false;
    sheet.verdict.grade = Some("alignment".into());
    sheet.verdict.sentence = say("pass, grade alignment.");
    sheet.verdict.reason =
        say("Not prime: power 0.505 mW is above 0.50 mW, but not by its expanded uncertainty 0.015 mW \
                            (rule: guarded).");
    let power = row_mut(&mut sheet, "power");
    power.value = number("power", 0.505, 0.015);
    power.judged = vec![
        Judged {
            verdict: RowVerdict::Fail,
            zone: Some(Zone::Inside),
            ..judged("power", "prime", Some(0.5), None, Some(0.748))
        },
        judged("power", "alignment", Some(0.3), None, Some(1.0)),
    ];
    power.deciding = true;
    power.note = say("prime lost in doubt; alignment, 0.30 mW, holds");
    sheet
}

/// The one below the last grade's bound, in German, with what has no value.
pub fn german() -> Sheet {
    let mut sheet = fail();
    sheet.identity.language = "de".into();
    let finesse = row_mut(&mut sheet, "finesse");
    finesse.value = Value::Absent((&tubewright::phrase::reasons::NO_FINESSE).into());
    sheet
}

/// Stopped during the dwell: what was measured is kept, the rest says why not.
pub fn stopped() -> Sheet {
    let mut sheet = pass();
    sheet.verdict = TubeVerdict {
        outcome: Outcome::Stopped,
        grade: None,
        reject_code: None,
        sentence: say("stopped."),
        reason: say("Stopped by KT after 4 min: arc at the anode cap."),
    };
    for row in &mut sheet.rows {
        if row.step != "strike" {
            row.value = Value::Absent(say("the run was stopped before"));
            row.judged.iter_mut().for_each(|judged| {
                judged.verdict = RowVerdict::Hold;
                judged.zone = None;
                judged.conformance_probability = None;
            });
        }
    }
    sheet.sweep_chart = None;
    sheet.gain_chart = None;
    let walk = sheet.walk_chart.as_mut().unwrap();
    walk.points.truncate(24);
    walk.prediction.clear();
    (walk.tau, walk.ready, walk.dwell_end) = (None, None, None);
    sheet.dwell = None;
    sheet
}

/// Just opened: no rows, no charts, no names.
pub fn empty() -> Sheet {
    let mut sheet = pass();
    sheet.rows.clear();
    (sheet.sweep_chart, sheet.gain_chart, sheet.walk_chart) = (None, None, None);
    (sheet.measured_by, sheet.started_at, sheet.ended_at, sheet.dwell) = (None, None, None, None);
    sheet.instruments.clear();
    sheet.identity = Identity { serial: "X".into(), ..Identity::default() };
    sheet.verdict = TubeVerdict {
        outcome: Outcome::Open,
        grade: None,
        reject_code: None,
        sentence: say("open."),
        reason: Saying::none(),
    };
    sheet
}

/// Text as long and as odd as it may come.
pub fn long() -> Sheet {
    let mut sheet = fail();
    let endless = "a-reason-without-any-blank-".repeat(12);
    let words = "many words that say at length what one could say in short ".repeat(9);
    sheet.identity.serial = "W".repeat(64);
    sheet.identity.lot = endless.clone();
    sheet.identity.supplier = words.clone();
    sheet.identity.condition = words.clone();
    sheet.identity.technician = "Ä".repeat(40);
    sheet.title = say(&words);
    sheet.station = "bench-".repeat(30);
    sheet.verdict.sentence = say(format!("fail, {endless}."));
    sheet.verdict.reason = say(words.clone() + &endless);
    sheet.caution = say(words.repeat(3));
    sheet.remarks = [&words, &endless, &words, &words].map(say).into();
    sheet.measured_by.as_mut().unwrap().initials = "Ö".repeat(64);
    sheet.measured_by.as_mut().unwrap().meaning = say(&words);
    for instrument in &mut sheet.instruments {
        instrument.what = say(&words);
        instrument.certificate = endless.clone();
        instrument.role = say(&endless);
    }
    row_mut(&mut sheet, "power").note = say(words.clone() + &endless);
    row_mut(&mut sheet, "mode_spacing").label = say(&endless);
    row_mut(&mut sheet, "mirror_spacing").value = Value::Absent(say(words.clone() + &endless));
    row_mut(&mut sheet, "finesse").value = number("finesse", -1.234_567e17, 9.9e3);
    row_mut(&mut sheet, "visual.output_mirror").value = Value::Word(endless.clone());
    row_mut(&mut sheet, "visual.output_mirror").judged[0].wanted = vec![words, endless];
    sheet
}

/// A serial of 64 characters of four bytes each, none of which the type has.
pub fn glyphless() -> Sheet {
    let mut sheet = pass();
    sheet.identity.serial = "\u{1F4A1}".repeat(64);
    sheet
}

/// Every measurand of the catalogue, limited, and six looks: still one page.
pub fn full() -> Sheet {
    let mut sheet = fail();
    let known = sheet.rows.clone();
    let of = |key: &str| known.iter().find(|row| row.measurand == key).cloned();
    sheet.rows = measurand::CATALOGUE
        .iter()
        .map(|m| {
            of(m.key).unwrap_or_else(|| match m.shape {
                measurand::Shape::Count => count("step", m.key, 1, Some(0.0), Some(3.0)),
                _ => limited("step", m.key, (12.3, 0.4), Some(10.0), Some(14.0)),
            })
        })
        .collect();
    let looks = ["output_mirror", "cathode", "bore", "glow", "leads", "label"];
    sheet.rows.extend(looks.map(|name| look(name, "clean")));
    sheet.remarks = vec![say("Two captures were lost during the dwell.")];
    sheet
}

/// More rows than a page can hold, however close.
pub fn endless() -> Sheet {
    let mut sheet = pass();
    sheet.rows.extend((0..140).map(|i| look(&format!("look_{i}"), "clean")));
    sheet
}
