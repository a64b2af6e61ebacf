//! Sample records of three demo tubes, made by the built program and compared byte by byte with `reports/samples`; one of
//! them in German too, from the same events.
//! Must not write there unless asked: `TUBEWRIGHT_MAKE_SAMPLES=1 cargo test --test samples` makes them anew.
//! The picture in the README is the first page of one of them, made by
//! `pdftoppm -r 100 -png -singlefile reports/samples/DEMO-0003/record.pdf reports/samples/DEMO-0003/record`.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::{
    fs,
    path::{Path, PathBuf},
    process::Command,
};

use chrono::DateTime;
use sha2::{Digest as _, Sha256};
use tubewright::{
    disk::read_chain,
    record::event::{Happening, Identity},
    report,
    run::{At, Plan, Run},
};

const SERIALS: [&str; 3] = ["DEMO-0001", "DEMO-0002", "DEMO-0003"];
/// The one whose page is kept in German beside the English one: the other files are the same.
const GERMAN: (&str, &str) = ("DEMO-0003", "record.de.pdf");
const FILES: [&str; 4] = ["record.csv", "record.pdf", "budget.csv", "record.csv-metadata.json"];
/// Exit statuses of a run that was finished: pass, fail, hold.
const FINISHED: [i32; 3] = [0, 20, 21];

/// The one run folder beneath a folder: where record.csv lies.
fn run_folder(folder: &Path) -> Option<PathBuf> {
    if folder.join("record.csv").is_file() {
        return Some(folder.to_owned());
    }
    let inside = fs::read_dir(folder).ok()?.filter_map(|entry| Some(entry.ok()?.path()));
    inside.filter(|path| path.is_dir()).find_map(|path| run_folder(&path))
}

/// Runs the demo tube on the simulated bench as fast as it goes, and returns the folder of its records.
fn inspected(serial: &str, reports: &Path) -> PathBuf {
    let output = Command::new(env!("CARGO_BIN_EXE_tubewright"))
        .args(["inspect", serial, "--pace", "1000000x", "--reports"])
        .arg(reports)
        .output()
        .unwrap();
    let said = String::from_utf8_lossy(&output.stderr).into_owned();
    assert!(output.status.code().is_some_and(|code| FINISHED.contains(&code)), "{serial}: {} {said}", output.status);
    run_folder(reports).unwrap_or_else(|| panic!("{serial} left no record: {said}"))
}

/// The page of a run in German.
fn in_german(folder: &Path) -> Vec<u8> {
    let events = read_chain(&fs::read(folder.join("events.jsonl")).unwrap()).unwrap().events;
    let Happening::Opened(opened) = &events[0].what else { panic!("opened first") };
    let plan = Plan::from_texts(&opened.recipe, &opened.limits, &opened.station).unwrap();
    let mut run = Run::open(plan, Identity { language: "de".into(), ..opened.identity.clone() });
    for event in &events {
        let wall = DateTime::parse_from_rfc3339(&event.at).unwrap();
        run.take(&event.what, At { wall, elapsed_ms: (event.elapsed_s * 1e3).round() as u64 });
    }
    let sheet = run.sheet();
    let csv = report::record_csv(&sheet);
    assert_eq!(csv, fs::read(folder.join("record.csv")).unwrap(), "the CSV does not know the language");
    let sha256 = Sha256::digest(&csv).iter().map(|byte| format!("{byte:02x}")).collect::<String>();
    report::record_pdf(&sheet, &sha256).unwrap()
}

/// Where two files part, in words: byte counts would tell nobody what changed.
fn difference(name: &str, kept: &[u8], made: &[u8]) -> String {
    let (kept, made) = (String::from_utf8_lossy(kept), String::from_utf8_lossy(made));
    let lines = kept.lines().zip(made.lines()).enumerate();
    match lines.into_iter().find(|(_, (kept, made))| kept != made) {
        Some((i, (kept, made))) if !name.ends_with(".pdf") => format!("line {}:\n  kept {kept}\n  made {made}", i + 1),
        _ => "other bytes".to_owned(),
    }
}

#[test]
fn records_of_the_demo_tubes_are_as_kept() {
    let samples = Path::new(env!("CARGO_MANIFEST_DIR")).join("reports/samples");
    let make = std::env::var("TUBEWRIGHT_MAKE_SAMPLES").is_ok_and(|value| value == "1");
    let mut differences = Vec::new();
    for serial in SERIALS {
        let reports = tempfile::tempdir().unwrap();
        let folder = inspected(serial, reports.path());
        let kept = samples.join(serial);
        if make {
            fs::create_dir_all(&kept).unwrap();
        }
        let mut made: Vec<(&str, Vec<u8>)> =
            FILES.iter().map(|name| (*name, fs::read(folder.join(name)).unwrap())).collect();
        if serial == GERMAN.0 {
            made.push((GERMAN.1, in_german(&folder)));
        }
        for (name, made) in made {
            if make {
                fs::write(kept.join(name), made).unwrap();
                continue;
            }
            match fs::read(kept.join(name)) {
                Ok(bytes) if bytes == made => {}
                Ok(bytes) => differences.push(format!("{serial}/{name}, {}", difference(name, &bytes, &made))),
                Err(error) => differences.push(format!("{serial}/{name} is not there: {error}")),
            }
        }
    }
    assert!(differences.is_empty(), "TUBEWRIGHT_MAKE_SAMPLES=1 makes them anew\n{}", differences.join("\n"));
}
