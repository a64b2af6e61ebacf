//! The program against numbers that were made without it: peaks found by scipy, and check values of the trade.
//! Must not take an expected value from the program. The source stands beside each check.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::fmt::Write as _;
use std::fs;
use std::path::Path;

use toml::{Table, Value};
use tubewright::capture::{Capture, read};
use tubewright::constants::{RED_LINE, SPEED_OF_LIGHT};
use tubewright::numerics::peaks;
use tubewright::sweep::{Measurement, Mode, Settings, measure};

/// Captures whose peaks `fixtures/peaks/peaks.py` found: (name, free spectral range in Hz).
const PEAKS: [(&str, f64); 5] =
    [("plain", 6.4e9), ("noisy", 6.4e9), ("two-modes", 6.4e9), ("off-axis", 6.4e9), ("walking", 6.4e9)];
/// Stated in each `.toml`: combined standard uncertainties, and samples beyond them.
const CENTRE_U: f64 = 3.0;
const CENTRE_SAMPLES: f64 = 0.05;

fn fixture(path: &str) -> Vec<u8> {
    fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures").join(path)).unwrap()
}

fn capture(name: &str) -> Capture {
    read(name, &fixture(&format!("independent/{name}.csv")), None).unwrap()
}

fn scipy(name: &str) -> Table {
    String::from_utf8(fixture(&format!("peaks/{name}.toml"))).unwrap().parse().unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    let number = |v: &Value| v.as_float().or_else(|| v.as_integer().map(|whole| whole as f64)).unwrap();
    value.as_array().map_or_else(|| vec![number(value)], |list| list.iter().map(number).collect())
}

fn settings(free_spectral_range: f64) -> Settings {
    Settings {
        free_spectral_range,
        u_free_spectral_range: 0.0,
        nominal_spacing: None,
        mode_floor: 0.02,
        fsr_source_id: "test".to_owned(),
    }
}

/// Source: scipy.signal.find_peaks, through `fixtures/peaks/peaks.py`; same definitions, so same samples.
#[test]
fn peaks_are_those_that_scipy_finds() {
    for (name, _) in PEAKS {
        let wanted = &scipy(name)["find_peaks"];
        let number = |key: &str| numbers(&wanted[key])[0];
        let light = capture(name).photodiode;
        let options = peaks::Options {
            min_height: Some(number("height")),
            min_prominence: Some(number("prominence")),
            min_distance: number("distance") as usize,
        };
        let found = peaks::find(&light[..number("samples") as usize], &options);
        let indices: Vec<f64> = found.iter().map(|peak| peak.index as f64).collect();
        assert_eq!(indices, numbers(&wanted["index"]), "{name}");
        for (peak, prominence) in found.iter().zip(numbers(&wanted["prominences"])) {
            // Differences of two samples, printed to all their digits.
            assert!((peak.prominence - prominence).abs() < 1e-12, "{name}: {peak:?} for {prominence}");
        }
    }
}

/// Every place on the ramp where the engine saw a mode, and its standard uncertainty, in samples.
fn places(measurement: &Measurement, samples_per_volt: f64) -> Vec<(f64, f64)> {
    let of = |mode: &Mode| {
        let u = mode.u_ramp * samples_per_volt;
        mode.places.iter().map(move |place| (place.ramp * samples_per_volt, u)).collect::<Vec<_>>()
    };
    measurement.modes.iter().chain(&measurement.off_axis).flat_map(of).collect()
}

/// Source: scipy.optimize.curve_fit of one Lorentzian at a time, through `fixtures/peaks/peaks.py`.
#[test]
fn modes_stand_where_scipy_fits_its_peaks() {
    for (name, free_spectral_range) in PEAKS {
        let wanted = &scipy(name)["curve_fit"];
        let (centres, us) = (numbers(&wanted["centre"]), numbers(&wanted["u_centre"]));
        let measurement = measure(&capture(name), &settings(free_spectral_range));
        // The script's ramp rises evenly by 20 V over 6800 samples.
        let ours = places(&measurement, 340.0);
        assert_eq!(ours.len(), centres.len(), "{name}: {ours:?}");
        for (centre, u) in centres.iter().zip(us) {
            let nearest = ours.iter().min_by(|a, b| (a.0 - centre).abs().total_cmp(&(b.0 - centre).abs())).unwrap();
            let within = CENTRE_U * u.hypot(nearest.1) + CENTRE_SAMPLES;
            assert!((nearest.0 - centre).abs() < within, "{name}: {nearest:?} for {centre} ± {u}");
        }
    }
}

/// Source: CIPM, *mise en pratique*: R(127) 11-5, a16 (f) of ¹²⁷I₂ at 473 612 353 604 kHz lies under the red line of neon, less
/// than the line's own stated uncertainty (1.5 × 10⁻⁶) from its middle.
#[test]
fn the_red_line_is_where_the_iodine_line_says() {
    let iodine = 473_612_353_604e3;
    let wavelength = SPEED_OF_LIGHT.value / iodine;
    // 632 991 212.58 fm: c/ν, eleven digits.
    assert!((wavelength - 632.991_212_58e-9).abs() < 0.5e-17, "{wavelength}");
    assert!((wavelength / RED_LINE.value - 1.0).abs() < RED_LINE.u_value / RED_LINE.value);
    // The type files write 632.991 nm.
    assert!((wavelength - 632.991e-9).abs() < 0.5e-12);
}

/// A straight ramp over ten divisions of 400 samples, 1 V a division, that modes (offset in divisions, height in V)
/// show on, once every `order` divisions from `first` on.
fn divisions(order: f64, first: f64, modes: &[(f64, f64)]) -> Capture {
    const SAMPLES: usize = 4_000;
    /// Half of the width at half maximum, in divisions.
    const HALF: f64 = 0.04;
    let mut text = "time_s,ramp_V,photodiode_V\n".to_owned();
    for i in 0..=SAMPLES {
        let division = 10.0 * i as f64 / SAMPLES as f64;
        let mut light = 0.0;
        for repeat in -1..=10 {
            for (offset, height) in modes {
                let x = (division - first - offset - order * f64::from(repeat)) / HALF;
                light += height / (1.0 + x * x);
            }
        }
        // Steps of 1 mV stand for noise.
        let _ = writeln!(text, "{:.6},{division:.6},{:.3}", division * 1e-3, light);
    }
    read("divisions", text.as_bytes(), None).unwrap()
}

/// Source: common practice. With 8 GHz of free spectral range shown at 1 GHz a division, orders stand 8 divisions apart
/// and modes 0.4 GHz apart 0.4 divisions.
#[test]
fn eight_divisions_an_order_at_one_gigahertz_a_division() {
    let measurement = measure(&divisions(8.0, 0.5, &[(0.0, 0.6), (0.4, 1.0), (0.8, 0.7)]), &settings(8e9));
    let spacing = measurement.mode_spacing.unwrap_or_else(|| panic!("{:?}", measurement.no_spacing));
    // Ten samples a width and steps of 1 ‰ of the height: 1 ‰ of the spacing is 0.16 samples.
    assert!((spacing.value / 0.4e9 - 1.0).abs() < 1e-3, "{spacing:?}");
    for mode in &measurement.modes {
        for pair in mode.places.windows(2) {
            // 1 V a division; a tenth of a sample.
            assert!(((pair[1].ramp - pair[0].ramp).abs() - 8.0).abs() < 2.5e-4 * 3.0, "{pair:?}");
        }
    }
}

/// Source: common practice. With the ramp reduced five times the same sweep is 0.2 GHz a division: modes 0.4 GHz apart
/// stand 2 divisions apart, and orders 40, so one screen has no scale and must be refused.
#[test]
fn a_ramp_reduced_five_times_shows_no_order_twice() {
    let measurement = measure(&divisions(40.0, 2.0, &[(0.0, 0.6), (2.0, 1.0), (4.0, 0.7)]), &settings(8e9));
    assert!(measurement.mode_spacing.is_none());
    let why = measurement.refused.or(measurement.no_spacing).map(|why| why.to_string()).unwrap_or_default();
    assert!(why.contains("one order") || why.contains("repeat"), "{why}");
}
