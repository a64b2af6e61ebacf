//! Real captures beside the project, against values read by an independent script (Python: split, float, numpy).
//! Must not hold samples.

use std::path::{Path, PathBuf};

use tubewright::capture::{Capture, CaptureRemark, Columns, pair_names, read_many};

/// Files, samples, start and step in seconds, allowed distance of either end of the time base in steps, least and greatest
/// ramp and photodiode volts. Distances: 0.02 steps where stamps are exact to their digits (0.1 at four digits), one to
/// five steps where an export rounds them to two or three digits and the start is only known to that. `-`: not checked.
const TABLE: &str = include_str!("real.txt");

fn folder() -> Option<PathBuf> {
    let beside = || Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/data");
    let folder = std::env::var_os("TUBEWRIGHT_REAL_DATA").map_or_else(beside, PathBuf::from);
    folder.is_dir().then_some(folder)
}

fn files_below(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let extension = path.extension().unwrap_or_default().to_string_lossy().to_lowercase();
        if path.is_dir() {
            files_below(&path, found);
        } else if extension == "csv" || extension == "txt" {
            found.push(path);
        }
    }
}

fn read_group(folder: &Path, names: &[&str], columns: Option<&Columns>) -> Result<Capture, String> {
    let bytes: Vec<Vec<u8>> = names.iter().map(|name| std::fs::read(folder.join(name)).unwrap()).collect();
    let files: Vec<(&str, &[u8])> = names.iter().copied().zip(bytes.iter().map(Vec::as_slice)).collect();
    read_many(&files, columns).map_err(|error| error.to_string())
}

fn close(found: (f64, f64), wanted: [&str; 2]) -> bool {
    // Scaled codes differ in the last bit; all else is the same double.
    let near = |a: f64, b: &str| b == "-" || (a - b.parse::<f64>().unwrap()).abs() < 1e-12;
    near(found.0, wanted[0]) && near(found.1, wanted[1])
}

fn range(volts: &[f64]) -> (f64, f64) {
    volts.iter().fold((f64::MAX, f64::MIN), |(low, high), &v| (low.min(v), high.max(v)))
}

fn faults_of(row: &str, folder: &Path) -> Vec<String> {
    let cells: Vec<&str> = row.split(' ').collect();
    let &[files, n, start, step, steps_off, ramp_low, ramp_high, low, high] = cells.as_slice() else {
        return vec![format!("bad row {row}")];
    };
    let names: Vec<&str> = files.split('+').collect();
    let capture = match read_group(folder, &names, None) {
        Ok(capture) => capture,
        Err(error) => return vec![format!("{files}: {error}")],
    };
    let number = |text: &str| text.parse::<f64>().unwrap();
    let time = capture.time;
    let mut faults = Vec::new();
    if time.n != n.parse::<usize>().unwrap() || capture.photodiode.len() != time.n {
        faults.push(format!("{files}: {} samples, wanted {n}", time.n));
    }
    let end = number(start) + number(step) * time.n as f64;
    let off = (time.start - number(start)).abs().max((time.at(time.n) - end).abs()) / number(step);
    if off > number(steps_off) {
        faults.push(format!("{files}: time base {time:?} is {off} steps off, wanted {start} in steps of {step}"));
    }
    let ramp = capture.ramp.as_deref().map_or((f64::NAN, f64::NAN), range);
    if !close(ramp, [ramp_low, ramp_high]) || !close(range(&capture.photodiode), [low, high]) {
        faults.push(format!("{files}: ramp {ramp:?}, photodiode {:?}; wanted {row}", range(&capture.photodiode)));
    }
    faults
}

#[test]
#[ignore = "needs the real captures beside the project: ../shared/data"]
fn every_real_capture_is_read_as_an_independent_script_reads_it() {
    let Some(folder) = folder() else { return println!("real captures: absent") };
    let faults: Vec<String> = TABLE.lines().flat_map(|row| faults_of(row, &folder)).collect();
    assert!(faults.is_empty(), "{}", faults.join("\n"));
    let count = TABLE.lines().count();
    println!("real captures: {count} read");
}

#[test]
#[ignore = "needs the real captures beside the project: ../shared/data"]
fn every_file_below_the_real_captures_pairs_and_reads() {
    let Some(folder) = folder() else { return println!("real captures: absent") };
    let mut paths = Vec::new();
    files_below(&folder, &mut paths);
    let names: Vec<String> =
        paths.iter().map(|path| path.strip_prefix(&folder).unwrap().to_string_lossy().into_owned()).collect();
    for group in pair_names(&names) {
        let group: Vec<&str> = group.iter().map(|&index| names[index].as_str()).collect();
        let capture = read_group(&folder, &group, None).unwrap_or_else(|error| panic!("{group:?}: {error}"));
        let lone = group.len() == 1;
        assert_eq!(lone, !(group[0].contains("CH1") || group[0].contains("CH2") || group[0].contains("calib")));
        if group[0].contains("warm-up") {
            assert!(capture.head.captured_at.is_some() && capture.crossed.is_some(), "{group:?}");
            assert_eq!((capture.time.n, capture.remarks), (1500, vec![]), "{group:?}");
        }
    }
    println!("real captures: {} files read", names.len());
}

#[test]
#[ignore = "needs the real captures beside the project: ../shared/data"]
fn oddities_of_real_exports_are_remarked() {
    let Some(folder) = folder() else { return println!("real captures: absent") };
    let remarks = |names: &[&str]| read_group(&folder, names, None).unwrap().remarks;
    let open = remarks(&["open-cavity/F0028CH1.CSV", "open-cavity/F0028CH2.CSV"]);
    assert!(open.contains(&CaptureRemark::UnitOdd { channel: "ramp", unit: "A".into() }), "{open:?}");
    let clutter = remarks(&["clutter/2018-2-27-11.56-73.4Hz-50.6V-OC1.5cm.csv"]);
    assert!(clutter.contains(&CaptureRemark::StampsWrong { count: 1, line: 2091, stamp: 0.0 }), "{clutter:?}");
    let narrow = remarks(&["narrow-lines/scope_15.csv"]);
    assert!(narrow.contains(&CaptureRemark::EndsDropped { first: 40, last: 0 }), "{narrow:?}");
    let codes = remarks(&["dialects/dialect-03.csv"]);
    assert!(codes.contains(&CaptureRemark::RawCodes { channel: "photodiode" }), "{codes:?}");
    let columns = "ramp=ramp.csv:2,photodiode=transmission.csv:2,time=ramp.csv:1".parse().unwrap();
    let named = read_group(&folder, &["inverted/ramp.csv", "inverted/transmission.csv"], Some(&columns)).unwrap();
    let guessed = read_group(&folder, &["inverted/ramp.csv", "inverted/transmission.csv"], None).unwrap();
    assert_eq!((named.ramp, named.photodiode), (guessed.ramp, guessed.photodiode));
}
