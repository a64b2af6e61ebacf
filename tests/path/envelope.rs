//! The envelope of the gain line: truths of tubes to the rows of the sheet, against the model's own physics.
//! Must not fit anything: the true curve is evaluated densely.

use tubewright::{phantom::Comb, record::sheet::Value};

use crate::bench::Brisk;

/// True (span, full width at half height, dip) of what a tube shows: heights of all modes over a whole walk cycle.
fn truth(brisk: &Brisk) -> (f64, f64, f64) {
    let comb = Comb::new(&brisk.truth, 0.0);
    let mut curve: Vec<(f64, f64)> = Vec::new();
    // The walk over one spacing, at rest: places are stepped by the cold comb's phase.
    for k in 0..400 {
        let at = Comb::new(&brisk.truth, f64::from(k) / 400.0);
        curve.extend(at.modes(&brisk.truth, -1.0).iter().map(|mode| (mode.detuning, mode.power)));
    }
    curve.sort_by(|a, b| a.0.total_cmp(&b.0));
    let top = curve.iter().map(|p| p.1).fold(0.0, f64::max);
    let above: Vec<&(f64, f64)> = curve.iter().filter(|p| p.1 >= 0.5 * top).collect();
    let fwhm = above.last().unwrap().0 - above[0].0;
    let greatest =
        |side: f64| curve.iter().filter(|p| side * p.0 > 0.0).max_by(|a, b| a.1.total_cmp(&b.1)).copied().unwrap();
    let (left, right) = (greatest(-1.0), greatest(1.0));
    let between = curve.iter().filter(|p| p.0 > left.0 && p.0 < right.0).map(|p| p.1);
    let least = between.fold(f64::INFINITY, f64::min);
    (2.0 * comb.line().half_range(), fwhm, 1.0 - least / (0.5 * (left.1 + right.1)))
}

fn with_envelope(brisk: Brisk) -> Brisk {
    // Behind the dwell alone: the rest of a recipe takes time and adds nothing here.
    let end = brisk.recipe.find("name = \"sweep\"").unwrap();
    let end = brisk.recipe[..end].rfind("[[step]]").unwrap();
    let mut recipe = brisk.recipe[..end].to_owned();
    recipe.push_str("[[step]]\nname = \"envelope\"\ndo = \"envelope\"\nfrom = \"warm\"\n");
    Brisk { recipe, ..brisk }
}

#[test]
fn every_type_reads_its_envelope_within_the_stated_uncertainty() {
    let mut pulls: Vec<(&str, f64)> = Vec::new();
    for brisk in [Brisk::twin(), Brisk::plate(), Brisk::quad()] {
        let brisk = with_envelope(brisk);
        let (span, fwhm, dip) = truth(&brisk);
        for seed in 1..=6 {
            let driven = brisk.drive(seed);
            // A dwell of a minute shows 100 modes of the twin to 600 of the quad, a tenth of a real one, their heights
            // scattering by 1 %: a curve through 16 of them at a time is good to 0.4 %, a depth of three such places
            // with the doubt about extremes to 1 %, and the flanks to 5 MHz each. Twice that is still of use.
            for (key, truth) in [("lasing_span", span), ("envelope_fwhm", fwhm), ("dip_depth", dip)] {
                let (value, u, _) = driven.number(key);
                pulls.push((key, (value - truth) / u));
                let useful = match key {
                    "lasing_span" => 0.015 * truth,
                    "envelope_fwhm" => 0.01 * truth,
                    _ => 0.02,
                };
                assert!(u < useful, "{key} of {}: {value} ± {u}", brisk.name);
                assert!(value > 0.0, "no dip seen of {truth} in {}", brisk.name);
            }
            let (gain, u, _) = driven.number("gain_ratio");
            assert!((gain - brisk.truth.gain_ratio).abs() < 2.0 * u, "{gain} ± {u}");
        }
    }
    let far: Vec<_> = pulls.iter().filter(|(_, pull)| pull.abs() > 2.0).collect();
    // 54 rows, 4.6 % of them beyond two standard uncertainties: 2.5 wanted, seven or more has a chance of 1 %.
    assert!(far.len() <= 6 && pulls.iter().all(|(_, pull)| pull.abs() < 4.0), "{far:?}");
}

#[test]
fn without_whole_cycles_the_rows_are_empty_with_the_reason() {
    let mut brisk = with_envelope(Brisk::quad());
    brisk.truth.draught_cycles = 6.0;
    brisk.truth.draught_period = 40.0;
    match &brisk.drive(1).row("lasing_span").value {
        Value::Absent(why) => {
            let why = why.english();
            assert!(why.contains("settle") || why.contains("cycles"), "{why}");
        }
        other => panic!("{other:?}"),
    }
}
