//! Every zone × rule × severity × grade, the order of outcomes, the reject code, and the words that people read.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use tubewright::{
    limits::{Judging, Limits, conformance_probability, judge},
    measurand::{Shape, find},
    phrase::Saying,
    record::sheet::{Outcome, Row, RowVerdict, TubeVerdict, Value, Zone},
};

fn limits(rule: &str, body: &str) -> Limits {
    let head = format!("revision = 1\ntitle = \"t\"\ngrades = [\"prime\", \"alignment\"]\nrule = \"{rule}\"\n");
    Limits::parse("limits.toml", &(head + body)).unwrap_or_else(|faults| panic!("{faults:?}"))
}

fn row(measurand: &str, value: Value) -> Row {
    let look = || Saying::outside(&measurand.trim_start_matches("visual.").replace('_', " "));
    let label = find(measurand).map_or_else(look, |known| (&known.name).into());
    let (step, measurand) = ("s".to_owned(), measurand.to_owned());
    Row { step, measurand, label, value, budget: vec![], judged: vec![], deciding: false, note: Saying::none() }
}

/// A number with k = 2 and no doubt about its uncertainty.
fn number(value: f64, expanded: f64) -> Value {
    Value::Number { value, u: expanded / 2.0, expanded, k: 2.0, dof: f64::INFINITY }
}

fn ending(limits: &Limits, rows: &mut [Row]) -> TubeVerdict {
    judge(Judging { limits, rows, bench_holds: &[], finished: true, dark: false })
}

const PASS: bool = true;
const FAIL: bool = false;
const RULES: [&str; 3] = ["shared", "guarded", "95 %"];
/// Zone, distance inside the bound in expanded uncertainties (k = 2), and whether each of [`RULES`] lets it pass.
/// Distances are powers of two or clear of an edge, so that rounding decides nothing.
const ZONES: [(Zone, f64, [bool; 3]); 7] = [
    (Zone::InsideByU, 1.5, [PASS, PASS, PASS]),
    (Zone::InsideByU, 1.0, [PASS, PASS, PASS]), // on the edge by exactly U
    (Zone::Inside, 0.9, [PASS, FAIL, PASS]),    // 1.8 u inside: p = 0.964
    (Zone::Inside, 0.5, [PASS, FAIL, FAIL]),    // 1 u inside: p = 0.841
    (Zone::Inside, 0.0, [PASS, FAIL, FAIL]),    // on the bound: p = 0.5
    (Zone::Outside, -0.5, [FAIL, FAIL, FAIL]),
    (Zone::OutsideByU, -1.5, [FAIL, FAIL, FAIL]),
];
/// Severity line, and the end for (prime, alignment) = (pass, pass), (fail, pass), (pass, fail), (fail, fail).
const ENDS: [(&str, [&str; 4]); 4] = [
    ("severity = \"critical\"\nreject = \"x\"", ["pass prime", "fail x", "fail x", "fail x"]),
    ("severity = \"major\"\nreject = \"x\"", ["pass prime", "pass alignment", "pass prime", "fail x"]),
    ("severity = \"minor\"\nreject = \"x\"", ["pass prime", "pass prime", "pass prime", "pass prime"]),
    ("outside = \"hold\"", ["pass prime", "hold", "hold", "hold"]),
];

fn said(verdict: &TubeVerdict) -> String {
    let word = verdict.outcome.word();
    match (&verdict.grade, &verdict.reject_code) {
        (Some(grade), None) => format!("{word} {grade}"),
        (None, Some(code)) => format!("{word} {code}"),
        (None, None) => word.to_owned(),
        both => panic!("{both:?}"),
    }
}

/// Volts are shown in kilovolts but are SI already: bounds below are exact in binary, value 0 and U 1 V.
fn bound_line(side: &str, prime: f64, alignment: f64) -> String {
    let sign = if side == "lower" { -1.0 } else { 1.0 };
    format!("{side} = {{ prime = \"{} V\", alignment = \"{} V\" }}", sign * prime, sign * alignment)
}

#[test]
fn every_zone_rule_severity_and_grade() {
    let mut cases = 0;
    for (prime_zone, prime_by, prime_passes) in ZONES {
        for (alignment_zone, alignment_by, alignment_passes) in ZONES {
            for (rule_index, rule) in RULES.iter().enumerate() {
                for (severity, ends) in ENDS {
                    for side in ["lower", "upper"] {
                        let bounds = bound_line(side, prime_by, alignment_by);
                        let body = format!("[[limit]]\nmeasurand = \"run_voltage\"\n{bounds}\n{severity}\n");
                        let mut rows = [row("run_voltage", number(0.0, 1.0))];
                        let verdict = ending(&limits(rule, &body), &mut rows);

                        let passes = [prime_passes[rule_index], alignment_passes[rule_index]];
                        let expected = match passes {
                            [true, true] => ends[0],
                            [false, true] => ends[1],
                            [true, false] => ends[2],
                            [false, false] => ends[3],
                        };
                        let case = format!("{body} by {rule}");
                        assert_eq!(said(&verdict), expected, "{case}");
                        let broken = if severity.contains("hold") { RowVerdict::Hold } else { RowVerdict::Fail };
                        for (judged, (zone, pass)) in
                            rows[0].judged.iter().zip([(prime_zone, passes[0]), (alignment_zone, passes[1])])
                        {
                            assert_eq!(judged.zone, Some(zone), "{case}");
                            assert_eq!(judged.verdict, if pass { RowVerdict::Pass } else { broken }, "{case}");
                            assert_eq!(judged.rule, *rule, "{case}");
                        }
                        assert_eq!(rows[0].note.is_empty(), passes == [true, true], "{case}: {:?}", rows[0].note);
                        cases += 1;
                    }
                }
            }
        }
    }
    assert_eq!(cases, 7 * 7 * 3 * 4 * 2);
}

#[test]
fn one_bound_for_every_grade() {
    for (zone, by, passes) in ZONES {
        for (rule_index, rule) in RULES.iter().enumerate() {
            for (severity, ends) in ENDS {
                let body = format!("[[limit]]\nmeasurand = \"run_voltage\"\nupper = \"{by} V\"\n{severity}\n");
                let mut rows = [row("run_voltage", number(0.0, 1.0))];
                let verdict = ending(&limits(rule, &body), &mut rows);
                let expected = if passes[rule_index] { ends[0] } else { ends[3] };
                assert_eq!(said(&verdict), expected, "{body} by {rule}");
                assert_eq!((rows[0].judged.len(), rows[0].judged[0].zone), (1, Some(zone)));
                assert_eq!(rows[0].judged[0].grade, "");
                let decides = !passes[rule_index] && !severity.contains("minor");
                assert_eq!(rows[0].deciding, decides, "{body} by {rule}");
            }
        }
    }
}

#[test]
fn a_grade_without_a_bound_passes_and_a_limit_may_have_its_own_rule() {
    let body = "[[limit]]\nmeasurand = \"power\"\nlower = { prime = \"1 W\" }\nrule = \"shared\"\nseverity = \"major\"\nreject = \"dim\"\n";
    let limits = limits("guarded", body);
    let mut rows = [row("power", number(0.5, 0.1))];
    assert_eq!(said(&ending(&limits, &mut rows)), "pass alignment");
    let alignment = &rows[0].judged[1];
    assert_eq!((alignment.verdict, alignment.zone, alignment.lower), (RowVerdict::Pass, None, None));
    let mut rows = [row("power", number(1.05, 0.1))];
    assert_eq!(said(&ending(&limits, &mut rows)), "pass prime", "inside, not by U: the limit says shared");
}

/// Of each severity one limit on a count, and a look, in this order of the file.
const MANY: &str = "
[[limit]]
measurand = \"visual.getter\"
wanted = [\"bright\", \"brown\"]
severity = \"minor\"
reject = \"getter\"
[[limit]]
measurand = \"swap_count\"
upper = { prime = 0 }
severity = \"major\"
reject = \"axis-swaps\"
[[limit]]
measurand = \"start_tries\"
upper = 2
severity = \"major\"
reject = \"hard-start\"
[[limit]]
measurand = \"mode_count_max\"
lower = 1
upper = 3
severity = \"critical\"
reject = \"modes\"
[[limit]]
measurand = \"hop_count\"
upper = 0
outside = \"hold\"
";

fn many(getter: &str, swaps: u64, tries: u64, modes: u64, hops: Option<u64>) -> Vec<Row> {
    let count = |value| Value::Count { value, low: value, high: value };
    vec![
        row("mode_count_max", count(modes)),
        row("hop_count", hops.map_or(Value::Absent(Saying::outside("the captures are too far apart.")), count)),
        row("swap_count", count(swaps)),
        row("start_tries", count(tries)),
        row("visual.getter", Value::Word(getter.to_owned())),
        row("power", number(1e-3, 1e-5)),
    ]
}

#[test]
fn the_order_of_outcomes_and_the_first_reject_code() {
    let limits = limits("guarded", MANY);
    for (rows, expected) in [
        (many("bright", 0, 1, 2, Some(0)), "pass prime"),
        (many("milky", 0, 1, 2, Some(0)), "pass prime"),
        (many("milky", 7, 2, 3, Some(0)), "pass alignment"),
        // Fail comes before hold, whichever stands first in the file.
        (many("bright", 0, 3, 2, Some(1)), "fail hard-start"),
        (many("bright", 0, 3, 2, None), "fail hard-start"),
        // The worst severity first, then the order of the file; never a minor one.
        (many("milky", 7, 3, 2, Some(0)), "fail axis-swaps"),
        (many("milky", 7, 3, 4, Some(0)), "fail modes"),
        (many("milky", 0, 1, 0, Some(0)), "fail modes"),
        // Hold: outside a limit that says so, or without a value.
        (many("bright", 0, 1, 2, Some(1)), "hold"),
        (many("bright", 7, 1, 2, None), "hold"),
    ] {
        let mut rows = rows;
        assert_eq!(said(&ending(&limits, &mut rows)), expected, "{rows:?}");
        assert!(rows[5].judged.is_empty() && rows[5].note.is_empty(), "a row without a limit is not judged");
        for judged in rows.iter().flat_map(|row| &row.judged) {
            assert_eq!((judged.rule.as_str(), judged.zone), ("shared", None), "counts and words are shared");
            assert_eq!(judged.conformance_probability, None);
            assert_eq!(judged.reject_code.is_some(), judged.verdict == RowVerdict::Fail);
        }
    }
}

#[test]
fn the_bench_comes_first_then_the_dark_tube() {
    let limits = limits("guarded", MANY);
    let overdue = [Saying::outside("The certificate X of the power meter was due 2026-03-01.")];
    for dark in [false, true] {
        let mut rows = many("bright", 0, 9, 9, None);
        let judging = Judging { limits: &limits, rows: &mut rows, bench_holds: &overdue, finished: true, dark };
        let verdict = judge(judging);
        assert_eq!(said(&verdict), "hold");
        assert_eq!(
            verdict.reason.english(),
            "The certificate X of the power meter was due 2026-03-01. No verdict on the tube is given."
        );
        assert!(rows.iter().flat_map(|row| &row.judged).all(|judged| judged.verdict == RowVerdict::Hold));
    }
    let mut rows = many("bright", 0, 9, 9, None);
    let verdict = judge(Judging { limits: &limits, rows: &mut rows, bench_holds: &[], finished: true, dark: true });
    assert_eq!((said(&verdict).as_str(), verdict.sentence.english().as_str()), ("fail dark", "fail, dark."));
}

#[test]
fn an_open_sheet_has_no_verdict_but_its_filled_rows_have() {
    let limits = limits("guarded", MANY);
    let mut rows = many("bright", 0, 9, 2, None);
    let verdict = judge(Judging { limits: &limits, rows: &mut rows, bench_holds: &[], finished: false, dark: false });
    assert_eq!(verdict.outcome, Outcome::Open);
    let of = |index: usize| rows[index].judged[0].verdict;
    assert_eq!((of(0), of(1), of(3)), (RowVerdict::Pass, RowVerdict::NotJudged, RowVerdict::Fail));
    assert!(rows.iter().all(|row| !row.deciding));
}

#[test]
fn what_cannot_be_judged_gives_hold() {
    let body = "[[limit]]\nmeasurand = \"extinction\"\nlower = { prime = 1000, alignment = 500 }\nseverity = \"major\"\nreject = \"x\"\n";
    let limits = limits("guarded", body);
    let nan = f64::NAN;
    for (value, expected) in [
        (Value::AtLeast(1000.0), "pass prime"),
        (Value::AtLeast(700.0), "hold"), // may be above 1000 or below
        (Value::AtLeast(300.0), "hold"),
        (Value::AtLeast(nan), "hold"),
        (Value::Absent(Saying::outside("why")), "hold"),
        (Value::Word("much".to_owned()), "hold"),
        (number(nan, 1.0), "hold"),
        (number(1e4, nan), "hold"),
        (number(1e4, f64::INFINITY), "hold"),
        (Value::Number { value: 1e4, u: nan, expanded: 1.0, k: 2.0, dof: 3.0 }, "hold"),
    ] {
        let mut rows = [row("extinction", value)];
        let verdict = ending(&limits, &mut rows);
        assert_eq!(said(&verdict), expected, "{rows:?}");
    }
    let verdict = ending(&limits, &mut [row("power", number(1.0, 0.1))]);
    assert_eq!(said(&verdict), "hold", "no row holds the limited measurand");
    assert_eq!(
        verdict.reason.english(),
        "Extinction is limited, but no step filled it. No verdict on the tube is given."
    );

    let body = "[[limit]]\nmeasurand = \"extinction\"\nupper = 500\nseverity = \"major\"\nreject = \"x\"\n";
    let limits = self::limits("guarded", body);
    assert_eq!(said(&ending(&limits, &mut [row("extinction", Value::AtLeast(600.0))])), "fail x");
    assert_eq!(said(&ending(&limits, &mut [row("extinction", Value::AtLeast(400.0))])), "hold");
}

const TWIN: &str = "
[[limit]]
measurand = \"power\"
lower = { prime = \"0.50 mW\", alignment = \"0.30 mW\" }
severity = \"major\"
reject = \"dim\"
[[limit]]
measurand = \"off_axis_ratio\"
upper = \"2 %\"
severity = \"major\"
reject = \"off-axis\"
[[limit]]
measurand = \"line_ripple\"
upper = \"0.5 %\"
outside = \"hold\"
[[limit]]
measurand = \"swap_count\"
upper = { prime = 0 }
severity = \"major\"
reject = \"axis-swaps\"
[[limit]]
measurand = \"visual.output_mirror\"
wanted = \"clean\"
severity = \"minor\"
reject = \"marked-mirror\"
";

fn words(power: Value, off_axis: f64, ripple: f64, swaps: u64, mirror: &str) -> String {
    let mut rows = [
        row("power", power),
        row("off_axis_ratio", number(off_axis, 0.002)),
        row("line_ripple", number(ripple, 0.0001)),
        row("swap_count", Value::Count { value: swaps, low: swaps, high: swaps }),
        row("visual.output_mirror", Value::Word(mirror.to_owned())),
    ];
    let verdict = ending(&limits("guarded", TWIN), &mut rows);
    let mut text = format!("{}\n{}\n", verdict.sentence.english(), verdict.reason.english());
    for row in rows.iter().filter(|row| !row.note.is_empty()) {
        let mark = if row.deciding { "*" } else { " " };
        text += &format!("{mark} {}: {}\n", row.label.english(), row.note.english());
    }
    text
}

#[test]
fn the_sentences_of_a_verdict() {
    let milliwatt = |power: f64, expanded: f64| number(power * 1e-3, expanded * 1e-3);
    let cases = [
        words(milliwatt(0.9, 0.027), 0.004, 0.0004, 0, "clean"),
        words(milliwatt(0.505, 0.015), 0.004, 0.0004, 0, "clean"),
        words(milliwatt(0.45, 0.014), 0.004, 0.0004, 58, "film"),
        words(milliwatt(0.220, 0.015), 0.004, 0.0004, 0, "clean"),
        words(milliwatt(0.305, 0.009), 0.031, 0.0004, 0, "clean"),
        words(milliwatt(0.880, 0.015), 0.004, 0.009, 0, "clean"),
        words(Value::Absent(Saying::outside("the walk did not settle in 60 min")), 0.004, 0.009, 0, "clean"),
    ];
    insta::assert_snapshot!(cases.join("\n"), @r#"
    pass, grade prime.


    pass, grade alignment.
    Not prime: power 0.505 mW is above 0.50 mW, but not by its expanded uncertainty 0.015 mW (rule: guarded).
    * Power: prime lost in doubt; alignment, 0.30 mW, holds

    pass, grade alignment.
    Not prime: power 0.450 mW is below 0.50 mW; likely cause: mirror sputtered; axis swaps: 58, above 0; likely cause: axes swap at a fixed place under the gain line, for life. Marked: output mirror film, wanted clean (minor).
    * Power: prime lost: below 0.50 mW; alignment, 0.30 mW, holds
    * Axis swaps: prime lost: above 0; alignment holds
      output mirror: marked-mirror: wanted clean; minor, the grade stays

    fail, dim.
    Power 0.220 mW is below 0.30 mW.
    * Power: dim: below 0.30 mW, the last grade's bound

    fail, dim.
    Power 0.3050 mW is above 0.30 mW, but not by its expanded uncertainty 0.0090 mW (rule: guarded). Also: off-axis.
    * Power: dim: above 0.30 mW, but not by U, the last grade's bound
    * Off-axis light: off-axis: above 2 %

    hold.
    Mains ripple 0.900 % points at the supply, not at the tube: repeat on another supply. No verdict on the tube is given.
    * Mains ripple: outside 0.50 %: gives hold, not fail

    hold.
    Power has no value: the walk did not settle in 60 min. Also without a verdict: mains ripple. No verdict on the tube is given.
    * Power: limited, without a value: gives hold
    * Mains ripple: outside 0.50 %: gives hold, not fail
    "#);
}

#[test]
fn examples_of_the_guide_to_conformance() {
    let normal = ("run_voltage", Shape::Normal);
    let infinite = f64::INFINITY;
    // JCGM 106:2012, 7.3.2 (from memory): a Zener diode, y = −5.47 V, u = 0.05 V, upper limit −5.40 V, p = 0.919.
    let p = conformance_probability(normal, (-5.47, 0.05, infinite), None, Some(-5.40)).unwrap();
    assert!((p - 0.919).abs() < 0.0006, "the guide prints three digits: {p}");
    // JCGM 106:2012, 8.3.3 (from memory): a speed meter of u/v = 2 %, limit 100 km/h, p ≥ 99.9 % from 107 km/h on.
    let above = |v: f64| conformance_probability(normal, (v, 0.02 * v, infinite), Some(100.0), None).unwrap();
    assert!(above(107.0) >= 0.999 && above(106.0) < 0.999);
    // JCGM 106:2012, table 1 (from memory): z for one-sided p, two decimals.
    for (p, z) in [(0.80, 0.84), (0.90, 1.28), (0.95, 1.64), (0.99, 2.33), (0.999, 3.09)] {
        let found = conformance_probability(normal, (0.0, 1.0, infinite), None, Some(z)).unwrap();
        // 0.005 in z is at most 0.0014 in p (density 0.28 at 0.84), and falls with z.
        assert!((found - p).abs() < 0.0015, "{p}: {found}");
    }
}

#[test]
fn other_distributions() {
    let infinite = f64::INFINITY;
    let p = |key, shape, value, lower, upper| conformance_probability((key, shape), value, lower, upper).unwrap();
    let near = |found: f64, expected: f64| assert!((found - expected).abs() < 6e-5, "{found}, tables say {expected}");
    // Student's t with 3 degrees of freedom (tables): P(T ≤ 1) = 0.8045, P(T ≤ 2.353) = 0.95; from 30 on the normal.
    near(p("run_voltage", Shape::Normal, (0.0, 1.0, 3.0), None, Some(1.0)), 0.80450);
    near(p("run_voltage", Shape::Normal, (0.0, 1.0, 3.9), None, Some(2.35336)), 0.95);
    near(p("run_voltage", Shape::Normal, (0.0, 1.0, 30.0), None, Some(1.0)), 0.84134);
    // Half a normal: P(|Z| ≤ 1) = 0.68269.
    near(p("off_axis_ratio", Shape::Positive, (0.0, 1.0, infinite), None, Some(1.0)), 0.68269);
    // One below zero: (Φ(3) − Φ(1)) / (1 − Φ(1)) = (0.99865 − 0.84134) / 0.15866 = 0.99149.
    near(p("off_axis_ratio", Shape::Positive, (-1.0, 1.0, infinite), None, Some(2.0)), 0.99149);
    // A lower bound at zero is no bound for what cannot be below it.
    near(p("off_axis_ratio", Shape::Positive, (0.1, 1.0, infinite), Some(0.0), None), 1.0);
    // So far below that nothing is left of the distribution: it sits at zero.
    near(p("off_axis_ratio", Shape::Positive, (-99.0, 1.0, infinite), None, Some(2.0)), 1.0);
    near(p("off_axis_ratio", Shape::Positive, (-99.0, 1.0, infinite), Some(1.0), Some(2.0)), 0.0);
    // Logarithm normal: ln(500/1000) × 1000/693.147 = −1, Φ(1) = 0.84134.
    near(p("extinction", Shape::Positive, (1000.0, 693.147, infinite), Some(500.0), None), 0.84134);
    // No doubt at all.
    near(p("power", Shape::Normal, (1.0, 0.0, infinite), Some(1.0), None), 1.0);
    near(p("power", Shape::Normal, (1.0, 0.0, infinite), Some(1.1), None), 0.0);
    assert_eq!(conformance_probability(("power", Shape::Normal), (1.0, 0.1, 9.0), None, None), None);
    assert_eq!(conformance_probability(("power", Shape::Normal), (f64::NAN, 0.1, 9.0), Some(1.0), None), None);
}
