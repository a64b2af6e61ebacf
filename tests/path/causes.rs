//! The verdict's sentence names the likely cause, from judged rows alone.
//! Must not measure: rows are made by hand, limits are those of the demo types.

use tubewright::{
    limits::{Judging, Limits, judge},
    phrase::Saying,
    record::sheet::{Row, TubeVerdict, Value},
};

fn row(measurand: &str, value: Value) -> Row {
    Row {
        step: "step".into(),
        measurand: measurand.into(),
        label: tubewright::measurand::find(measurand).map_or(Saying::outside(measurand), |m| (&m.name).into()),
        value,
        budget: Vec::new(),
        judged: Vec::new(),
        deciding: false,
        note: Saying::none(),
    }
}

fn number(value: f64) -> Value {
    let u = 1e-4 * value.abs();
    Value::Number { value, u, expanded: 2.0 * u, k: 2.0, dof: f64::INFINITY }
}

/// Every row of a sound tube of a type; those given replace it.
fn judged(tube_type: &str, found: &[(&str, Value)]) -> TubeVerdict {
    let text =
        std::fs::read_to_string(format!("{}/limits/{tube_type}/limits.toml", env!("CARGO_MANIFEST_DIR"))).unwrap();
    let limits = Limits::parse("limits.toml", &text).unwrap();
    let sound = |key: &str| match key {
        "hop_count" | "swap_count" => Value::Count { value: 0, low: 0, high: 0 },
        _ => {
            let limit = limits.limits.iter().find(|limit| limit.measurand == key).unwrap();
            if let Some(word) = limit.wanted.first() {
                return Value::Word(word.clone());
            }
            match (limit.lower.of("prime"), limit.upper.of("prime")) {
                (Some(lower), Some(upper)) => number(0.5 * (lower + upper)),
                (Some(lower), None) => number(1.5 * lower),
                (None, upper) => number(0.3 * upper.unwrap()),
            }
        }
    };
    let mut rows: Vec<Row> = limits.limits.iter().map(|l| row(&l.measurand, sound(&l.measurand))).collect();
    for (key, value) in found {
        rows.retain(|row| row.measurand != *key);
        rows.push(row(key, value.clone()));
    }
    judge(Judging { limits: &limits, rows: &mut rows, bench_holds: &[], finished: true, dark: false })
}

fn word(word: &str) -> Value {
    Value::Word(word.into())
}

#[test]
fn the_demo_tubes_name_their_cause() {
    let told = |tube_type, found: &[(&str, Value)]| judged(tube_type, found).reason.english();
    assert_eq!(
        told("twin-150", &[("power", number(0.22e-3)), ("visual.discharge", word("deep red-orange"))]),
        "Power 0.220000 mW is below 0.30 mW; likely cause: helium lost."
    );
    let off_axis = told("quad-375", &[("off_axis_ratio", number(0.09))]);
    assert!(
        off_axis.ends_with("likely cause: bore too wide or bent, or a mirror tilted: realign and repeat."),
        "{off_axis}"
    );
    let long = told("quad-375", &[("mode_spacing", number(428e6))]);
    assert!(long.ends_with("likely cause: wrong type or label."), "{long}");
    let pressed = told("plate-250", &[("power", number(0.8e-3)), ("visual.press_test", word("rises"))]);
    assert!(pressed.ends_with("likely cause: mirror walked off: realign warm."), "{pressed}");
    let swaps = judged("twin-150", &[("swap_count", Value::Count { value: 57, low: 57, high: 57 })]);
    assert_eq!(swaps.grade.as_deref(), Some("alignment"));
    assert!(
        swaps.reason.english().ends_with("likely cause: axes swap at a fixed place under the gain line, for life."),
        "{swaps:?}"
    );
}

#[test]
fn no_cause_is_named_without_its_signature() {
    let dim = judged("twin-150", &[("power", number(0.22e-3))]).reason.english();
    assert_eq!(dim, "Power 0.220000 mW is below 0.30 mW.");
    // A press test that does nothing, and power in doubt.
    let still =
        judged("plate-250", &[("power", number(0.8e-3)), ("visual.press_test", word("stays"))]).reason.english();
    assert!(!still.contains("likely"), "{still}");
    let doubt = Value::Number { value: 0.505e-3, u: 8e-6, expanded: 16e-6, k: 2.0, dof: f64::INFINITY };
    let doubt = judged("twin-150", &[("power", doubt), ("visual.discharge", word("deep red-orange"))]).reason.english();
    assert!(!doubt.contains("likely"), "inside, though not by U: {doubt}");
    // The voltage's sign alone never says contamination, nor does it keep colour from saying it.
    let volts = judged("twin-150", &[("power", number(0.22e-3)), ("run_voltage", number(1.2e3))]).reason.english();
    assert!(!volts.contains("contamination"), "{volts}");
    for kilovolts in [0.8, 1.0, 1.2] {
        let found = [
            ("power", number(0.22e-3)),
            ("run_voltage", number(kilovolts * 1e3)),
            ("visual.discharge", word("pinkish")),
        ];
        let air = judged("twin-150", &found).reason.english();
        assert!(air.contains("likely cause: contamination"), "{air}");
    }
}

#[test]
fn ripple_of_the_supply_is_not_the_tubes() {
    let held = judged("twin-150", &[("line_ripple", number(0.014))]).reason.english();
    assert!(held.contains("repeat on another supply") && !held.contains("likely cause"), "{held}");
}
