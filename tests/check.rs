//! Every file of `limits/` and of the demo reads without a fault; planted faults are all reported.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::{fs, path::Path};

use tubewright::{limits::Limits, recipe::Recipe, station::file::StationFile};

fn text(path: &str) -> String {
    fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join(path)).unwrap()
}

const TYPES: [&str; 5] = ["twin-150", "plate-250", "quad-375", "open-500", "open-800"];

#[test]
fn the_types_of_the_demo_have_no_fault() {
    for tube_type in TYPES {
        let recipe = Recipe::parse("recipe.toml", &text(&format!("limits/{tube_type}/recipe.toml"))).unwrap();
        let limits = text(&format!("limits/{tube_type}/limits.toml"));
        let limits = Limits::parse_for("limits.toml", &limits, &recipe.fillable()).unwrap();
        // ± 2 % about the nominal spacing, written with one decimal of a megahertz.
        let bounds = (limits.limits[0].lower.of("").unwrap(), limits.limits[0].upper.of("").unwrap());
        assert!((bounds.0 / recipe.nominal_spacing - 0.98).abs() < 3e-4, "{tube_type}");
        assert!((bounds.1 / recipe.nominal_spacing - 1.02).abs() < 3e-4, "{tube_type}");
    }
}

#[test]
fn the_benches_of_the_demo_have_no_fault_and_one_is_overdue() {
    let day = chrono::NaiveDate::from_ymd_opt(2026, 3, 2).unwrap();
    let bench = |name: &str| StationFile::parse(name, &text(&format!("fixtures/demo/{name}.toml"))).unwrap();
    assert!(bench("bench-1").overdue_on(day).is_empty());
    let overdue = bench("bench-2").overdue_on(day);
    assert_eq!(overdue, ["The certificate SIM-0012 of the power meter was due 2026-03-01."]);
    assert!(bench("bench-2").overdue_on(day.pred_opt().unwrap()).is_empty(), "it holds on its last day");
}
