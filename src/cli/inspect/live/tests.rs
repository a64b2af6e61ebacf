//! The live view as lines, for terminals of several widths: nothing is drawn on one.
//! Must not lean on a run: states and rows are made up here.

#![allow(clippy::unwrap_used)]

use std::time::Instant;

use super::{block::block, row_lines, state::State, state::Sweep, verdict_lines};
use crate::instruments::{Charset, Line, Look};
use crate::phrase::{Language, Saying};
use crate::record::finding::{CaptureFinding, ModeFinding, Trace};
use crate::record::sheet::{Judged, Outcome, Row, RowVerdict, Value, WalkChart, Zone};

fn look(width: usize, height: usize) -> Look {
    Look { width, height, charset: Charset::Unicode, language: Language::English, colour: false }
}

fn text(lines: &[Line], look: &Look) -> String {
    lines.iter().map(|line| line.coded(look)).map(|line| line.trim_end().to_owned() + "\n").collect()
}

/// Two modes on the comb and one off it, in two orders.
fn sweep() -> Sweep {
    let marks = vec![(0, 1.0e9), (1, 2.0e9), (2, 2.4e9), (0, 7.4e9), (1, 8.4e9), (2, 8.8e9)];
    let height = |index: usize| [0.5, 1.0, 0.1][index];
    let mut trace = Trace { marks: marks.clone(), ..Trace::default() };
    for column in 0..600 {
        let at = (f64::from(column) + 0.5) / 600.0 * 12.0e9;
        let line = |(index, place): &(usize, f64)| height(*index) / (1.0 + ((at - place) / 30e6).powi(2));
        let signal: f64 = marks.iter().map(line).sum();
        trace.detuning.push(at);
        trace.low.push(signal - 0.004);
        trace.high.push(signal + 0.004);
    }
    let finding = CaptureFinding {
        mode_spacing: Some(999.3e6),
        modes: vec![ModeFinding::default(); 2],
        off_axis: vec![ModeFinding::default()],
        ..CaptureFinding::default()
    };
    Sweep::of(1408, &finding, Some(trace), 0.0)
}

fn walk() -> WalkChart {
    let walked = |at: f64| 58.0 * (1.0 - (-at / 378.0_f64).exp());
    let points = (0..200).map(|n| f64::from(n) * 2.3).map(|at| (at, walked(at))).collect();
    let prediction = (0..300).map(|n| f64::from(n) * 4.0).map(|at| (at, walked(at))).collect();
    WalkChart { points, prediction, tau: None, ready: None, dwell_end: None, hops: vec![], swaps: vec![] }
}

fn state() -> State {
    State {
        step: "warm".into(),
        step_number: 2,
        n_steps: 11,
        captures: 1408,
        elapsed_s: 458.4,
        left_s: (Some(720.0), Some(840.0)),
        rate: Some(60.0),
        sweep: Some(sweep()),
        walk: Some(walk()),
    }
}

fn row(label: &str, measurand: &str, value: Value, judged: Vec<Judged>, note: &str) -> Row {
    Row {
        step: "s".into(),
        measurand: measurand.into(),
        label: Saying::outside(label),
        value,
        budget: vec![],
        judged,
        deciding: false,
        note: Saying::outside(note),
    }
}

fn judged(grade: &str, lower: Option<f64>, upper: Option<f64>, verdict: RowVerdict, zone: Zone) -> Judged {
    Judged {
        grade: grade.into(),
        lower,
        upper,
        wanted: vec![],
        rule: "guarded".into(),
        conformance_probability: None,
        zone: Some(zone),
        verdict,
        reject_code: (verdict == RowVerdict::Fail).then(|| "dim".to_owned()),
    }
}

fn number(value: f64, expanded: f64) -> Value {
    Value::Number { value, u: expanded / 2.0, expanded, k: 2.0, dof: f64::INFINITY }
}

/// A row in every state.
fn rows() -> Vec<Row> {
    let power = |grade: &str, bound: f64, verdict, zone| judged(grade, Some(bound), None, verdict, zone);
    vec![
        row(
            "Mode spacing",
            "mode_spacing",
            number(998.7e6, 3.0e6),
            vec![judged("", Some(979.3e6), Some(1019.3e6), RowVerdict::Pass, Zone::InsideByU)],
            "",
        ),
        row(
            "Power",
            "power",
            number(0.505e-3, 0.015e-3),
            vec![
                power("prime", 0.5e-3, RowVerdict::Fail, Zone::Inside),
                power("alignment", 0.3e-3, RowVerdict::Pass, Zone::InsideByU),
            ],
            "prime lost in doubt; alignment, 0.30 mW, holds",
        ),
        row(
            "Power",
            "power",
            number(0.22e-3, 0.01e-3),
            vec![power("alignment", 0.3e-3, RowVerdict::Fail, Zone::OutsideByU)],
            "",
        ),
        row(
            "Axis swaps",
            "swap_count",
            Value::Count { value: 2, low: 2, high: 3 },
            vec![judged("", None, Some(0.0), RowVerdict::Fail, Zone::OutsideByU)],
            "",
        ),
        row(
            "Power ripple",
            "power_ripple",
            Value::Absent(Saying::outside("too few power readings over the whole cycles")),
            vec![judged("", None, Some(0.1), RowVerdict::Hold, Zone::Inside)],
            "",
        ),
        row("Warm-up time constant", "warmup_tau", number(378.0, 0.1), vec![], ""),
    ]
}

fn all_rows(look: &Look) -> String {
    rows().iter().map(|row| text(&row_lines(row, look), look)).collect()
}

#[test]
fn rows_at_80_columns() {
    insta::assert_snapshot!(all_rows(&look(80, 24)), @r"
      Mode spacing             998.7 ± 3.0 MHz     ··[──────━●━──────]·· pass
    ▽ Power                    0.505 ± 0.015 mW    ───━━━[━●━━━━─── pass, not prime
        prime lost in doubt; alignment, 0.30 mW, holds
    × Power                    0.220 ± 0.010 mW    ··━━×━············[── fail, dim
    × Axis swaps               2 (2 to 3)          [ 0] ┆ 1┆ ┆×2┆ ┆○3┆   fail, dim
    ▒ Power ripple             no value: too few power readings over the whole
                               cycles - hold
      Warm-up time constant    6.300 ± 0.002 min
    ");
}

#[test]
fn rows_at_40_columns() {
    insta::assert_snapshot!(all_rows(&look(40, 24)), @r"
      Mode spacing: 998.7 ± 3.0 MHz - pass
    ▽ Power: 0.505 ± 0.015 mW - prime lost
      in doubt; alignment, 0.30 mW, holds -
      pass, not prime
    × Power: 0.220 ± 0.010 mW - outside -
      fail, dim
    × Axis swaps: 2 (2 to 3) - outside -
      fail, dim
    ▒ Power ripple: no value (too few power
      readings over the whole cycles) -
      hold
      Warm-up time constant: 6.300 ± 0.002
      min
    ");
}

#[test]
fn rows_at_200_columns_in_ascii() {
    insta::assert_snapshot!(all_rows(&Look { charset: Charset::Ascii, ..look(200, 24) }), @r"
      Mode spacing                  998.7 +- 3.0 MHz              979.3 ..[-------==o=--------].. 1019.3      pass
    v Power                         0.505 +- 0.015 mW         0.5 . 0.3 -----=====[=o========----             pass, not prime
        prime lost in doubt; alignment, 0.30 mW, holds
    x Power                         0.220 +- 0.010 mW               0.3 ..==x===..............[--             fail, dim
    x Axis swaps                    2 (2 to 3)             [ 0] : 1: :x2: :?3:                                fail, dim
    # Power ripple                  no value: too few power readings over the whole cycles - hold
      Warm-up time constant         6.300 +- 0.002 min
    ");
}

#[test]
fn block_at_80_columns() {
    let look = look(80, 24);
    insta::assert_snapshot!(text(&block(&state(), &look), &look), @r"
    ── warm, step 2 of 11 ─────────────────────────────────────────────────────────
    sweep 1408  modes 2  spacing 999 MHz  ◇ 1 off the comb
                 █                                         █
                ▂█                                         █
          █     ██                                  █      █
         ▂█▃   ▁██▂▄▂                              ▁█▅▁  ▁▆█▃▄▄
          a      b ◇                                a      b ◇
    ───────────────────────────────────────────────────────────────────────────────
    0            2            4            6            8           10 GHz
    walk 40.7 spacings since first light, expected to end at ┊ 19.6 min
                              ▗▄▄▖▖ ▖ ▖ ▖ ▖ ▖ ▖ ▖ ▖ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘ ▘┊▘
            ▄▄▄▄▄▄▄▟▀▀▀▀▀▀▀▀▀▀▀                                                ┊
    ▄▄▛▀▀▀▀▀▘                                                                  ┊
    ───────────────────────────────────────────────────────────────────────────────
    0                  5                 10                 15               20 min
    captures 1408, 7 min 38 s; about 14 min left (14 s at this pace)
    ");
}

#[test]
fn block_at_40_columns_is_words() {
    let look = look(40, 24);
    insta::assert_snapshot!(text(&block(&state(), &look), &look), @r"
    warm, step 2 of 11
    about 14 min left (14 s at this pace)
    ");
}

#[test]
fn block_at_200_columns_has_sweep_and_walk_side_by_side() {
    let look = look(200, 20);
    insta::assert_snapshot!(text(&block(&state(), &look), &look), @r"
    ── warm, step 2 of 11 ─────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────────
    sweep 1408  modes 2  spacing 999 MHz  ◇ 1 off the comb                                              walk 40.7 spacings since first light, expected to end at ┊ 19.6 min
                   ██                                                  █                                                                                          ▖ ▖ ▖ ▖ ▖ ▖ ▖ ▖ ▖ ▌ ▘ ▘ ▘ ▘ ▘ ▘ ▘┊▘
                   ██                                                  █                                                                        ▖ ▖ ▖ ▖ ▘ ▘ ▘ ▘ ▘ ▘                                ┊
                   ██                                                  █                                                           ▄▄▄▄▄▞▀▀▀▘ ▘                                                    ┊
           ▄▄      ██                                          ▄       █                                                   ▄▄▄▄▀▀▀▀▘                                                               ┊
           ██      ██                                          █      ▁█                                            ▗▄▄▟▀▀▀▘                                                                       ┊
           ██      ██                                          █      ██                                       ▄▄▟▀▀▀                                                                              ┊
         ▁▂██▂▁▁▁▁▃██▃▄▆▁▁                                  ▁▁██▂▁▁▁▁▂██▅▂▆▁▁                              ▄▄▀▀▘                                                                                   ┊
            a       b  ◇                                       a       b  ◇                             ▄▀▀                                                                                        ┊
    ────────────────────────────────────────────────────────────────────────────────────────────────    ────────────────────────────────────────────────────────────────────────────────────────────────
    0               2               4               6               8              10 GHz               0                      5                     10                     15                    20 min
    captures 1408, 7 min 38 s; about 14 min left (14 s at this pace)
    ");
}

#[test]
fn no_light_and_no_trace_are_said() {
    let look = look(80, 16);
    let dark = CaptureFinding { dark: true, ..CaptureFinding::default() };
    let state = State { sweep: Some(Sweep::of(7, &dark, None, 0.0)), walk: None, left_s: (None, None), ..state() };
    let lines = text(&block(&state, &look), &look);
    assert!(lines.contains("sweep 7  no light") && lines.contains("time left not known yet"), "{lines}");
}

/// No state may be told from another by ink alone: with all ink gone, sign at the margin, drawing and word still differ.
#[test]
fn states_differ_without_ink() {
    for charset in [Charset::Unicode, Charset::Ascii] {
        let look = Look { charset, ..look(100, 24) };
        let words = ["pass", "pass, not prime", "fail, dim", "fail, dim", "hold", ""];
        let signs: &[&str] = if charset == Charset::Unicode {
            &["", "▽", "×", "×", "▒", ""]
        } else {
            &["", "v", "x", "x", "#", ""]
        };
        for ((row, word), sign) in rows().iter().zip(words).zip(signs) {
            let lines = text(&row_lines(row, &look), &look);
            let margin: String = lines.chars().take(1).collect();
            assert_eq!(margin.trim(), *sign, "{lines}");
            assert!(lines.contains(word), "{word} in {lines}");
        }
    }
}

#[test]
fn every_verdict_has_a_shape_of_its_own() {
    let mut shapes: Vec<String> = Vec::new();
    for outcome in [Outcome::Pass, Outcome::Fail, Outcome::Hold, Outcome::Stopped] {
        for charset in [Charset::Unicode, Charset::Ascii] {
            let look = Look { charset, ..look(60, 24) };
            let lines = verdict_lines(
                "DEMO-0001",
                outcome,
                "a sentence.",
                "A reason that is too long for one line of this box.",
                &look,
            );
            let lines = text(&lines, &look);
            assert!(lines.lines().all(|line| line.chars().count() == 59 || outcome == Outcome::Fail), "{lines}");
            assert!(!shapes.contains(&lines), "{lines}");
            shapes.push(lines);
        }
    }
    insta::assert_snapshot!(shapes[2], @r"
    ┌────────────────────────────────────────────────────────╲
    │ DEMO-0001: a sentence.                                  │
    │ A reason that is too long for one line of this box.     │
    └─────────────────────────────────────────────────────────┘
    ");
}

/// Nothing that is drawn is wider than the terminal, however odd its size.
#[test]
fn any_size_can_be_drawn() {
    for width in [1, 2, 7, 20, 39, 59, 60, 61, 80, 111, 112, 113, 200, 500] {
        for height in [1, 2, 5, 12, 24, 50, 200] {
            let look = look(width, height);
            for state in [state(), State { sweep: None, walk: None, ..state() }, State::default()] {
                let lines = block(&state, &look);
                // Words are cut to the width when they are drawn; pictures must fit by themselves.
                let pictures = lines.len().saturating_sub(1);
                let widest = lines.iter().take(pictures).map(Line::width).max().unwrap_or(0);
                assert!(width < super::block::NARROW || widest < width, "{width} × {height}: {widest}");
                assert!(lines.len() <= (height * 2 / 3).max(2), "{width} × {height}: {} lines", lines.len());
            }
            rows().iter().for_each(|row| drop(row_lines(row, &look)));
        }
    }
}

/// Five drawings a second must cost the bench nothing that can be measured.
#[test]
fn drawing_is_cheap() {
    let (state, look) = (state(), look(200, 50));
    let began = Instant::now();
    for _ in 0..20 {
        assert!(!text(&block(&state, &look), &look).is_empty());
    }
    let each = began.elapsed().as_secs_f64() / 20.0;
    // 5 drawings a second at 10 ms would be 5 % of one core; about 0.3 ms were seen. A loaded machine may take long.
    assert!(each < 0.01, "{each} s");
}
