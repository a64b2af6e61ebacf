//! The faulty tubes of the demo scenario end as they should, for the right reason, by the shipped limits.
//! Must not test the physics of a fault (`phantom` does) nor the whole day: tubes warm in a minute here.

use super::bench::{Brisk, Driven, text};
use tubewright::{
    phantom::Scenario,
    record::sheet::{Outcome, Value},
};

/// Pace of the dwell for tubes that warm in a minute; all other steps and all limits as shipped.
const PACE: [(&str, &str); 7] = [
    ("early_every", "\"100 ms\""),
    ("early_for", "\"20 s\""),
    ("every", "\"250 ms\""),
    ("longest", "\"100 s\""),
    ("residual_walk", "1"),
    ("horizon", "\"30 s\""),
    ("samples", "6_000"),
];

/// A demo tube, warm in a minute, through the shipped recipe at that pace.
fn brisk(serial: &str, name: &'static str) -> Brisk {
    let scenario = Scenario::demo();
    let tube = scenario.tube(serial).unwrap();
    assert_eq!(tube.tube_type, name);
    let line = |line: &str| {
        let new = PACE.iter().find(|(key, _)| line.starts_with(&format!("{key} ")));
        new.map_or_else(|| line.to_owned(), |(key, value)| format!("{key} = {value}")) + "\n"
    };
    let recipe: String = text(&format!("../limits/{name}/recipe.toml")).lines().map(line).collect();
    Brisk {
        name,
        recipe,
        limits: text(&format!("../limits/{name}/limits.toml")),
        station: text("demo/bench-1.toml"),
        truth: tube.truth.clone(),
        bench: scenario.benches[&tube.bench].clone(),
        lit_for_s: None,
    }
    .with(|tube| {
        (tube.walk_cycles, tube.warmup_tau, tube.fast_cycles) = (12.0, 20.0, 0.0);
        tube.power_tau = 8.0;
        // Everything is some thirty times as fast as on the demo bench: so is its draught.
        tube.draught_period /= 30.0;
    })
}

fn ending(driven: &Driven) -> (Outcome, &str) {
    (driven.sheet.verdict.outcome, driven.sheet.verdict.reject_code.as_deref().unwrap_or_default())
}

fn word<'a>(driven: &'a Driven, key: &str) -> &'a str {
    match &driven.row(key).value {
        Value::Word(word) => word,
        other => panic!("{key}: {other:?}"),
    }
}

#[test]
fn helium_lost_is_dim_and_deeper_red() {
    let driven = brisk("DEMO-0004", "twin-150").drive(4);
    assert_eq!(ending(&driven), (Outcome::Fail, "dim"), "{:?}", driven.sheet.verdict);
    let (power, _, expanded) = driven.number("power");
    assert!((power - 0.22e-3).abs() < 0.01e-3, "{power}");
    assert!(power + expanded < 0.30e-3, "outside by more than U: {power} ± {expanded}");
    assert_eq!(word(&driven, "visual.discharge"), "deep red-orange");
}

#[test]
fn a_wide_bore_gives_off_axis_light_at_ordinary_power() {
    let driven = brisk("DEMO-0005", "quad-375").drive(5);
    assert_eq!(ending(&driven), (Outcome::Fail, "off-axis"), "{:?}", driven.sheet.verdict);
    assert!(driven.number("power").0 > 6e-3);
    let (ratio, _, expanded) = driven.number("off_axis_ratio");
    assert!((ratio - 0.0935).abs() < expanded.max(0.01), "{ratio} ± {expanded}");
}

#[test]
fn a_tube_that_swaps_its_axes_loses_its_grade() {
    let driven = brisk("DEMO-0006", "twin-150").drive(6);
    assert_eq!(ending(&driven), (Outcome::Pass, ""), "{:?}", driven.sheet.verdict);
    assert_eq!(driven.sheet.verdict.grade.as_deref(), Some("alignment"));
    assert!(driven.count("swap_count") >= 5, "one a cycle of some ten: {}", driven.count("swap_count"));
}

#[test]
fn mirrors_nearer_than_they_should_be_are_the_wrong_length() {
    let driven = brisk("DEMO-0007", "quad-375").drive(7);
    assert_eq!(ending(&driven), (Outcome::Fail, "wrong-length"), "{:?}", driven.sheet.verdict);
    // c/2L of 350 mm, less 1 ‰ of pulling.
    let (spacing, _, expanded) = driven.number("mode_spacing");
    assert!((spacing - 427.85e6).abs() < expanded, "{spacing} ± {expanded}");
}

#[test]
fn a_mirror_that_walked_off_is_dim_and_its_power_rises_in_the_press_test() {
    let driven = brisk("DEMO-0008", "plate-250").drive(8);
    assert_eq!(ending(&driven), (Outcome::Fail, "dim"), "{:?}", driven.sheet.verdict);
    let (power, _, expanded) = driven.number("power");
    assert!(power + expanded < 0.9e-3, "outside by more than U: {power} ± {expanded}");
    assert_eq!(word(&driven, "visual.press_test"), "rises");
    assert_eq!(word(&driven, "visual.discharge"), "salmon");
}

#[test]
fn a_sound_plate_is_steady_in_the_press_test() {
    let driven = brisk("DEMO-0002", "plate-250").drive(2);
    assert_eq!(word(&driven, "visual.press_test"), "steady");
    assert_eq!(ending(&driven).0, Outcome::Pass, "{:?}", driven.sheet.verdict);
}

#[test]
fn in_a_draught_nothing_settles_and_nothing_is_decided() {
    let driven = brisk("DEMO-0010", "quad-375").drive(10);
    assert_eq!(ending(&driven).0, Outcome::Hold, "{:?}", driven.sheet.verdict);
    assert!(driven.sheet.verdict.reason.english().contains("did not settle"), "{:?}", driven.sheet.verdict);
}
