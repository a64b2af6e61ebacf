//! A run is a fold over its events: the same happenings give the same wants and the same sheet, whatever they are.
//! Must not touch a file or a clock.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic, missing_docs)]

mod bench;

use bench::{Driver, Noise, Script, Texts, Tube, identity};
use tubewright::{
    record::{
        event::{Happening, Identity},
        question::Answer,
        sheet::{Outcome, Row, Sheet, Value},
    },
    run::{Plan, Run},
    station::Want,
};

const STATION: &str = include_str!("../../fixtures/demo/bench-1.toml");
const OVERDUE: &str = include_str!("../../fixtures/demo/bench-2.toml");

/// A brisk type: the tubes of `bench.rs` have τ = 20 s, so that a whole run takes some 300 happenings.
fn texts(spacing_mhz: f64, polarization: &str) -> Texts {
    let recipe = format!(
        r#"
revision = 1
nominal_spacing = "{spacing_mhz} MHz"
wavelength = "632.991 nm"
mode_floor = "2 %"
[[step]]
name = "strike"
do = "strike"
[[step]]
name = "warm"
do = "dwell"
early_every = "200 ms"
early_for = "20 s"
every = "250 ms"
longest = "3 min"
residual_walk = 1
horizon = "20 s"
cycles = 2
[[step]]
name = "sweep"
do = "sweep"
[[step]]
name = "comb"
do = "comb"
from = "warm"
[[step]]
name = "watching"
do = "watch"
from = "warm"
[[step]]
name = "rest"
do = "watch"
for = "5 s"
[[step]]
name = "power"
do = "power"
from = "warm"
[[step]]
name = "polarizer"
do = "polarizer"
polarization = "{polarization}"
[[step]]
name = "supply"
do = "supply"
dropout = true
[[step]]
name = "output_mirror"
do = "look"
ask = "Output mirror under the lamp"
choices = ["clean", "film", "burn", "crack"]
"#
    );
    let limits = format!(
        r#"
revision = 1
title = "Test type"
grades = ["prime", "alignment"]
rule = "guarded"
[[limit]]
measurand = "mode_spacing"
lower = "{} MHz"
upper = "{} MHz"
severity = "critical"
reject = "wrong-length"
[[limit]]
measurand = "warmup_ready"
upper = "2 min"
severity = "major"
reject = "slow"
[[limit]]
measurand = "visual.output_mirror"
wanted = "clean"
severity = "minor"
reject = "marked-mirror"
"#,
        0.98 * spacing_mhz,
        1.02 * spacing_mhz
    );
    Texts { recipe, limits, station: STATION.into() }
}

fn twin() -> (Texts, Tube) {
    (texts(999.3, "random"), Tube::twin())
}

fn plate() -> (Texts, Tube) {
    (texts(599.6, "linear"), Tube::plate())
}

fn quad() -> (Texts, Tube) {
    (texts(399.7, "random"), Tube::quad())
}

fn driven((texts, tube): (Texts, Tube), every: usize) -> Script {
    Driver::new(&texts, identity(), tube, every).to_the_end()
}

fn fresh(texts: &Texts, identity: Identity) -> Run {
    Run::open(Plan::from_texts(&texts.recipe, &texts.limits, &texts.station).unwrap(), identity)
}

fn row<'a>(sheet: &'a Sheet, key: &str) -> &'a Row {
    sheet.rows.iter().find(|row| row.measurand == key).unwrap_or_else(|| panic!("no row {key}"))
}

/// (value, standard uncertainty) of a row.
fn number(sheet: &Sheet, key: &str) -> (f64, f64) {
    match &row(sheet, key).value {
        Value::Number { value, u, .. } => (*value, *u),
        other => panic!("{key}: {other:?}"),
    }
}

fn absent<'a>(sheet: &'a Sheet, key: &str) -> &'a str {
    match &row(sheet, key).value {
        Value::Absent(reason) => reason,
        other => panic!("{key}: {other:?}"),
    }
}

/// A value agrees with the truth within three standard uncertainties (99.7 %, seeded).
fn agrees(sheet: &Sheet, key: &str, truth: f64) {
    let (value, u) = number(sheet, key);
    assert!((value - truth).abs() <= 3.0 * u, "{key}: {value} ± {u}, truth {truth}");
}

/// Through the stored form and back, then folded into a fresh run; nothing asked of it before the end of the prefix.
fn refolded(script: &Script, n: usize) -> Run {
    let mut run = fresh(&script.texts, script.identity.clone());
    for (happening, at) in &script.events[..n] {
        let stored = serde_json::to_string(happening).unwrap();
        run.take(&serde_json::from_str(&stored).unwrap(), *at);
    }
    run
}

/// Prefixes of each script that a run of their own is folded over, from the stored form.
const OWN_FOLDS: usize = 12;

#[test]
fn every_prefix_gives_the_same_wants_and_sheet() {
    for (what, case) in [("twin", twin()), ("plate", plate()), ("quad", quad())] {
        let script = driven(case, 1);
        // One fresh run, asked at every prefix.
        let mut run = fresh(&script.texts, script.identity.clone());
        for (n, (happening, at)) in script.events.iter().enumerate() {
            run.take(happening, *at);
            assert_eq!(run.wants(), script.wants[n], "{what}, after {} happenings", n + 1);
            assert_eq!(run.sheet(), script.sheets[n].1, "{what}, after {} happenings", n + 1);
        }
        // Runs of their own, asked at the end of their prefix alone.
        let mut noise = Noise(7);
        for _ in 0..OWN_FOLDS {
            let n = 1 + noise.below(script.events.len() as u64) as usize;
            let run = refolded(&script, n);
            assert_eq!(run.wants(), script.wants[n - 1], "{what}, after {n} happenings");
            assert_eq!(run.sheet(), script.sheets[n - 1].1, "{what}, after {n} happenings");
        }
    }
}

#[test]
fn stored_form_is_lossless() {
    for case in [twin(), plate(), quad()] {
        for (happening, _) in driven(case, 10_000).events {
            let text = serde_json::to_string(&happening).unwrap();
            let back: Happening = serde_json::from_str(&text).unwrap();
            assert_eq!(back, happening, "{text}");
        }
    }
}

#[test]
fn a_sound_twin_fills_its_sheet() {
    let script = driven(twin(), 10_000);
    let sheet = script.run.sheet();
    for key in ["mode_spacing", "mirror_spacing", "warmup_tau", "power", "run_voltage"] {
        assert!(!row(&sheet, key).budget.is_empty(), "{key}");
    }
    agrees(&sheet, "mode_spacing", 999.3e6);
    agrees(&sheet, "warmup_tau", 20.0);
    agrees(&sheet, "power", 0.9e-3 + 1.02e-6);
    agrees(&sheet, "run_voltage", 980.0);
    agrees(&sheet, "dropout_fraction", 0.75);
    assert_eq!(row(&sheet, "mode_count_min").value, Value::Count { value: 1, low: 1, high: 1 });
    assert!(matches!(row(&sheet, "mode_count_max").value, Value::Count { value: 2, .. }));
    assert!(matches!(row(&sheet, "hop_count").value, Value::Count { value: 0, .. }));
    assert_eq!(absent(&sheet, "start_voltage"), "no high-voltage probe");
    assert_eq!(row(&sheet, "visual.output_mirror").value, Value::Word("clean".into()));
    let ranks: Vec<_> = sheet.rows.iter().map(|row| tubewright::measurand::rank(&row.measurand)).collect();
    assert!(ranks.is_sorted());
    // Both watches keep their rows.
    assert_eq!(sheet.rows.iter().filter(|row| row.measurand == "hop_count").count(), 2);
    assert!(sheet.remarks[0].starts_with("Simulated bench"));
    assert!(sheet.measured_by.is_some() && sheet.ended_at.is_some() && sheet.dwell.is_some());
    assert!(sheet.sweep_chart.is_some() && sheet.gain_chart.is_some() && sheet.walk_chart.is_some());
    assert_eq!(script.run.progress().done_steps, 10);
    assert_eq!(sheet.verdict.outcome, Outcome::Pass, "{:?}", sheet.verdict);
}

#[test]
fn one_mode_at_rest_takes_the_spacing_from_the_dwell() {
    // With ± 0.55 GHz a twin shows two modes for a tenth of its walk only.
    let (texts, tube) = twin();
    let script = driven((texts, Tube { half_span: 0.55e9, ..tube }), 10_000);
    let sheet = script.run.sheet();
    assert_eq!(sheet.sweep_chart.as_ref().map(|chart| chart.modes.len()), Some(1), "the case that is meant");
    assert!(
        row(&sheet, "mode_spacing").note.contains("one mode alone at rest"),
        "{}",
        row(&sheet, "mode_spacing").note
    );
    agrees(&sheet, "mode_spacing", 999.3e6);
}

#[test]
fn a_twin_is_turned_until_both_families_were_seen() {
    let script = driven(twin(), 10_000);
    let sheet = script.run.sheet();
    agrees(&sheet, "mode_orthogonality", std::f64::consts::FRAC_PI_2);
    assert!(number(&sheet, "mode_orthogonality").1.to_degrees() < 2.0, "a limit of 5° must be decided by it");
}

#[test]
fn a_plate_has_one_axis() {
    let sheet = driven(plate(), 10_000).run.sheet();
    agrees(&sheet, "polarization_azimuth", 0.3);
    agrees(&sheet, "extinction", 801.0);
    assert!(number(&sheet, "extinction").1 < 20.0, "800:1 is far above the noise of this meter");
}

#[test]
fn neighbours_of_a_quad_are_at_right_angles() {
    let sheet = driven(quad(), 10_000).run.sheet();
    agrees(&sheet, "mode_orthogonality", std::f64::consts::FRAC_PI_2);
    assert!(number(&sheet, "mode_orthogonality").1.to_degrees() < 2.0);
}

#[test]
fn the_dwell_is_no_timer() {
    let ended = |tau: f64| {
        let (texts, tube) = quad();
        driven((texts, Tube { tau, ..tube }), 10_000).run.sheet()
    };
    let (short, long) = (ended(20.0), ended(26.0));
    agrees(&long, "warmup_tau", 26.0);
    // t = τ·ln(N∞(1 − e^(−h/τ))/bound) with h = 20 s, bound 1: 40.5 s and 49.2 s.
    let expected = |tau: f64| tau * (12.0 * (1.0 - (-20.0 / tau).exp())).ln();
    for (sheet, tau) in [(&short, 20.0), (&long, 26.0)] {
        let dwell = sheet.dwell.unwrap();
        // The upper prediction is later than the expected one, by a few captures with this noise.
        assert!((dwell - expected(tau)).abs() < 3.0, "τ {tau} s: {dwell} s, expected {}", expected(tau));
    }
}

#[test]
fn longest_reached_leaves_cycle_rows_empty() {
    let (mut texts, tube) = quad();
    texts.recipe = texts.recipe.replace("residual_walk = 1", "residual_walk = 0.001").replace("3 min", "40 s");
    texts.recipe = texts.recipe.replace("horizon = \"20 s\"", "horizon = \"10 min\"");
    let sheet = driven((texts, tube), 10_000).run.sheet();
    assert!(absent(&sheet, "warmup_ready").contains("not settled"));
    assert!(absent(&sheet, "power").contains("did not settle"));
    assert!(absent(&sheet, "mode_count_max").contains("did not settle"));
    assert!(sheet.remarks.iter().any(|remark| remark.contains("longest")), "{:?}", sheet.remarks);
    assert_eq!(sheet.verdict.outcome, Outcome::Hold, "warmup_ready is limited and empty");
}

#[test]
fn a_folder_at_its_end_ends_the_dwell() {
    let (texts, tube) = quad();
    let folder = Identity { from_captures: true, simulated: false, ..identity() };
    let script = Driver::new(&texts, folder, Tube { n_captures: 60, ..tube }, 10_000).to_the_end();
    let sheet = script.run.sheet();
    assert!(absent(&sheet, "warmup_ready").contains("ended before the walk settled"));
    agrees(&sheet, "mode_spacing", 399.7e6);
    assert!(row(&sheet, "mode_spacing").note.contains("dwell"));
    assert!(absent(&sheet, "power").contains("ended"));
    assert_eq!(sheet.verdict.outcome, Outcome::Hold);
    // None at all: every row says why.
    let (texts, tube) = quad();
    let sheet = driven((texts, Tube { n_captures: 0, ..tube }), 10_000).run.sheet();
    assert!(absent(&sheet, "walk_cycles").contains("at its end"));
    assert!(absent(&sheet, "mode_spacing").contains("at its end"));
}

#[test]
fn a_dark_tube_fails_as_dark() {
    let never_lit = Tube { tries: 0, ..Tube::twin() };
    let goes_out = Tube { dark_from: 10.0, ..Tube::twin() };
    let no_light = Tube { dark_from: 0.0, ..Tube::twin() };
    for (what, tube) in [("tries", never_lit), ("goes out", goes_out), ("captures", no_light)] {
        let script = driven((texts(999.3, "random"), tube), 10_000);
        let sheet = script.run.sheet();
        assert_eq!(sheet.verdict.outcome, Outcome::Fail, "{what}: {:?}", sheet.verdict);
        assert_eq!(sheet.verdict.reject_code.as_deref(), Some("dark"), "{what}");
        assert!(absent(&sheet, "mode_spacing").contains("no light"), "{what}");
        let made_safe = script.events.iter().filter(|(happening, _)| *happening == Happening::MadeSafe).count();
        assert_eq!(made_safe, 1, "{what}");
    }
}

#[test]
fn a_stop_makes_safe_and_keeps_the_sheet() {
    let (texts, tube) = twin();
    let mut driver = Driver::new(&texts, identity(), tube, 10_000);
    for _ in 0..40 {
        driver.one();
    }
    driver.happen(Happening::Stopped { reason: "fire drill".into() });
    assert_eq!(driver.run().wants(), Want::MakeSafe);
    let sheet = driver.to_the_end().run.sheet();
    assert_eq!((sheet.verdict.outcome, sheet.verdict.reason.as_str()), (Outcome::Stopped, "fire drill"));
    assert!(absent(&sheet, "power").contains("stopped"));
    assert!(matches!(row(&sheet, "start_delay").value, Value::Number { .. }));
    assert!(sheet.measured_by.is_none());
    // Before anything was switched on there is nothing to make safe.
    let (texts, tube) = twin();
    let mut driver = Driver::new(&texts, identity(), tube, 10_000);
    driver.happen(Happening::Stopped { reason: "wrong tube".into() });
    assert_eq!(driver.run().wants(), Want::Finished);
}

#[test]
fn high_voltage_asked_and_not_answered_is_made_safe_after_an_interruption() {
    let (texts, tube) = twin();
    let mut driver = Driver::new(&texts, identity(), tube, 10_000);
    let Want::Answer(question) = driver.run().wants() else { panic!("a strike asks first") };
    assert!(question.high_voltage);
    driver.happen(Happening::Asked { question: question.clone() });
    assert_eq!(driver.run().wants(), Want::Answer(question.clone()), "asked is still open");
    driver.happen(Happening::Resumed);
    assert_eq!(driver.run().wants(), Want::MakeSafe);
    driver.happen(Happening::MadeSafe);
    assert_eq!(driver.run().wants(), Want::Answer(question));
    // In the middle of the dwell nothing is open: it goes on.
    driver.until(|want| matches!(want, Want::Capture(request) if request.number == 20));
    let before = driver.run().wants();
    driver.happen(Happening::Resumed);
    assert_eq!(driver.run().wants(), before);
    assert_eq!(driver.to_the_end().run.sheet().verdict.outcome, Outcome::Pass);
}

#[test]
fn an_overdue_certificate_holds() {
    let (mut texts, tube) = quad();
    texts.station = OVERDUE.into();
    let sheet = driven((texts, tube), 10_000).run.sheet();
    assert_eq!(sheet.verdict.outcome, Outcome::Hold);
    let overdue: Vec<_> = sheet.instruments.iter().filter(|it| it.overdue).map(|it| it.role.as_str()).collect();
    assert_eq!(overdue, ["power meter"]);
}

#[test]
fn a_bench_without_instruments_leaves_rows_empty_with_the_reason() {
    let (mut texts, tube) = plate();
    texts.station = STATION.split("[power_meter]").next().unwrap().into();
    let sheet = driven((texts, tube), 10_000).run.sheet();
    assert!(absent(&sheet, "power").contains("no power meter"));
    assert!(absent(&sheet, "extinction").contains("no polarizer"));
    assert!(absent(&sheet, "run_voltage").contains("no supply"));
    assert!(sheet.caution.contains("not measured"));
    agrees(&sheet, "mode_spacing", 599.6e6);
}

#[test]
fn answers_out_of_bounds_are_asked_again() {
    let (texts, tube) = twin();
    let mut driver = Driver::new(&texts, identity(), tube, 10_000);
    let before = driver.run().wants();
    let answered =
        |answer| Happening::Answered { step: "strike".into(), word: "start_delay".into(), answer, by: "KT".into() };
    for answer in [Answer::Number(-1.0), Answer::Number(f64::NAN), Answer::Done] {
        driver.happen(answered(answer));
        assert_eq!(driver.run().wants(), before);
    }
}

/// Seeds of the fuzz: each shuffles, repeats, drops and damages the happenings of a sound run.
const FUZZ_SEEDS: u64 = 16;

#[test]
fn no_order_of_happenings_panics() {
    let script = driven(plate(), 10_000);
    for seed in 0..FUZZ_SEEDS {
        let mut noise = Noise(seed);
        let mut run = fresh(&script.texts, script.identity.clone());
        let mut next = 0;
        for _ in 0..400 {
            // Three in four in order, so that the run gets somewhere.
            let pick = if noise.below(4) > 0 { next } else { noise.below(script.events.len() as u64) as usize };
            next = if pick == next { next + 1 } else { next };
            let Some((happening, at)) = script.events.get(pick) else { break };
            run.take(&damaged(happening, &mut noise), *at);
            if noise.below(20) == 0 {
                run.take(&odd(&mut noise), *at);
            }
            run.wants();
            run.progress();
        }
        let sheet = run.sheet();
        assert_eq!(sheet, run.sheet(), "no NaN may stand on a sheet");
    }
}

/// Now and then with numbers that no engine gives.
fn damaged(happening: &Happening, noise: &mut Noise) -> Happening {
    let mut happening = happening.clone();
    let odd = [f64::NAN, f64::INFINITY, -1.0, 0.0, 1e300][noise.below(5) as usize];
    if noise.below(10) > 0 {
        return happening;
    }
    match &mut happening {
        Happening::Captured(captured) => match noise.below(8) {
            0 => captured.fact.taken_s = odd,
            1 => captured.fact.power = Some(odd),
            2 => captured.finding.free_spectral_range = odd,
            3 => captured.finding.mode_spacing = Some(odd),
            4 => captured.finding.modes.clear(),
            5 => captured.finding.modes.iter_mut().for_each(|mode| mode.position = odd),
            6 => captured.finding.modes.iter_mut().for_each(|mode| (mode.peak_height, mode.u_position) = (odd, odd)),
            _ => captured.finding.budget.iter_mut().for_each(|line| line.standard_uncertainty = odd),
        },
        Happening::Reading { value, .. } => *value = Some(odd),
        Happening::Answered { answer, .. } => *answer = Answer::Number(odd),
        _ => {}
    }
    happening
}

fn odd(noise: &mut Noise) -> Happening {
    match noise.below(4) {
        0 => Happening::Resumed,
        1 => Happening::MadeSafe,
        2 => Happening::Waited,
        _ => Happening::CaptureLost {
            step: "warm".into(),
            number: noise.below(100),
            reason: "noise".into(),
            for_good: noise.below(10) == 0,
        },
    }
}
