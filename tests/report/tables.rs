//! record.csv, budget.csv and their metadata.

use super::sheets;
use tubewright::{
    record::sheet::{Sheet, Value},
    report::{RECORD_COLUMNS, budget_csv, csv_metadata, record_csv, restore},
};

/// The file read back by an independent reader: one vector a line, the header apart.
fn read(bytes: &[u8]) -> (Vec<String>, Vec<Vec<String>>) {
    let mut reader = csv::ReaderBuilder::new().from_reader(bytes);
    let header = reader.headers().unwrap().iter().map(str::to_owned).collect();
    let lines = reader.records().map(|line| line.unwrap().iter().map(str::to_owned).collect()).collect();
    (header, lines)
}

fn cell<'a>(line: &'a [String], column: &str) -> &'a str {
    &line[RECORD_COLUMNS.iter().position(|&name| name == column).unwrap()]
}

fn every_sheet() -> Vec<Sheet> {
    use sheets::*;
    vec![pass(), fail(), hold(), doubt(), stopped(), empty(), long(), glyphless()]
}

/// The columns that differ from line to line, from `measurand` on; the run's own are in the first test.
fn short(sheet: &Sheet) -> String {
    let (_, lines) = read(&record_csv(sheet));
    let columns = |line: &Vec<String>| [&line[3..4], &line[8..21], &line[24..]].concat().join(",");
    lines.iter().map(columns).collect::<Vec<_>>().join("\n")
}

#[test]
fn first_lines_as_they_leave_the_house() {
    let text = String::from_utf8(record_csv(&sheets::fail())).unwrap();
    let head: Vec<_> = text.split("\r\n").take(3).collect();
    insta::assert_snapshot!(head.join("\n"), @r#"
    run_id,serial,tube_type,grade,lot,station,technician,started_at,step,measurand,value,unit,expanded_uncertainty,coverage_factor,lower,upper,wanted,rule,conformance_probability,verdict,reject_code,recipe_revision,limits_revision,program_version,note
    019cad3e-6f10-7c51-a2d4-3b1f0c9e7a55,DEMO-0004,twin-150,,A-twin-01,bench-1,KT,2026-03-02T10:12:40.000+00:00,,tube,,,,,,,,guarded,,fail,dim,1,1,0.1.0,"Simulated bench: not a measurement of a tube; Power 0.220 mW is below 0.30 mW. Likely cause: helium lost (0.8; deeper red-orange, lasing span short); next: air leak (0.1)."
    019cad3e-6f10-7c51-a2d4-3b1f0c9e7a55,DEMO-0004,twin-150,,A-twin-01,bench-1,KT,2026-03-02T10:12:40.000+00:00,comb,mode_spacing,998.7,MHz,3,2,979.3,1019.3,,guarded,0.99999,pass,,1,1,0.1.0,
    "#);
}

#[test]
fn rows_of_every_kind() {
    insta::assert_snapshot!(short(&sheets::fail()), @r#"
    ,,tube,,,,,,,,guarded,,fail,dim,Simulated bench: not a measurement of a tube; Power 0.220 mW is below 0.30 mW. Likely cause: helium lost (0.8; deeper red-orange, lasing span short); next: air leak (0.1).
    ,comb,mode_spacing,998.7,MHz,3,2,979.3,1019.3,,guarded,0.99999,pass,,
    ,comb,mirror_spacing,150.05,mm,0.46,2,,,,,,not judged,,
    ,comb,mode_count_min,1,1,,,1,,,guarded,,pass,,
    ,comb,mode_count_max,2,1,,,,2,,guarded,,pass,,
    ,comb,off_axis_ratio,0.4,%,0.2,2,,2,,guarded,0.99999,pass,,
    ,comb,finesse,61.2,1,2.4,2,,,,,,not judged,,
    ,polarizer,mode_orthogonality,89.6,deg,1.1,2,85,95,,guarded,0.99999,pass,,
    prime,output,power,0.22,mW,0.015,2,0.5,,,guarded,1.2e-26,fail,dim,dim: below 0.30 mW, the last grade's bound
    alignment,output,power,0.22,mW,0.015,2,0.3,,,guarded,1.2e-26,fail,dim,dim: below 0.30 mW, the last grade's bound
    ,output,power_ripple,7.1,%,0.6,2,,20,,guarded,0.99999,pass,,
    ,warm,warmup_tau,6.3,min,0.3,2,,12,,guarded,0.99999,pass,,
    ,warm,warmup_ready,28.61,min,0.41,2,,,,,,not judged,,
    ,warm,walk_growth,18.6,um,0.1,2,,,,,,not judged,,
    ,warm,walk_rate,-41.2,MHz/min,2.2,2,,,,,,not judged,,
    ,watching,hop_count,0,1,,,,0,,guarded,,pass,,
    ,watching,swap_count,2,1,,,,0,,guarded,,fail,axis-swaps,
    ,watching,cycles_watched,57.9,1,0.1,2,,,,,,not judged,,
    ,strike,start_delay,0.6,s,0.1,2,,2,,guarded,0.99999,pass,,
    ,strike,start_tries,1,1,,,,2,,guarded,,pass,,
    ,supply,run_voltage,0.98,kV,0.01,2,0.9,1.02,,guarded,0.99999,pass,,
    ,supply,dropout_fraction,74,%,3,2,,90,,guarded,0.99999,pass,,
    ,output_mirror,visual.output_mirror,clean,,,,,,clean,guarded,,pass,,
    "#);
}

#[test]
fn a_stopped_run_says_why_values_are_absent() {
    let (_, lines) = read(&record_csv(&sheets::stopped()));
    let spacing = lines.iter().find(|line| cell(line, "measurand") == "mode_spacing").unwrap();
    assert_eq!(cell(spacing, "value"), "");
    assert_eq!(cell(spacing, "verdict"), "hold");
    assert_eq!(cell(spacing, "note"), "absent: the run was stopped before");
}

#[test]
fn every_sheet_is_a_sound_table() {
    for sheet in every_sheet() {
        let bytes = record_csv(&sheet);
        let text = String::from_utf8(bytes.clone()).unwrap();
        assert!(text.ends_with("\r\n") && !text.replace("\r\n", "").contains('\n'));
        let (header, lines) = read(&bytes);
        assert_eq!(header, RECORD_COLUMNS);
        assert_eq!(cell(&lines[0], "measurand"), "tube");
        assert_eq!(cell(&lines[0], "value"), "");
        assert_eq!(cell(&lines[0], "verdict"), sheet.verdict.outcome.word());
        let expected: usize = sheet.rows.iter().map(|row| row.judged.len().max(1)).sum();
        assert_eq!(lines.len(), expected + 1, "no row is lost");
        assert!(lines.iter().flatten().all(|cell| !matches!(cell.as_str(), "NaN" | "inf" | "-inf")));
        let simulated = "Simulated bench: not a measurement of a tube";
        assert_eq!(cell(&lines[0], "note").contains(simulated), sheet.identity.simulated);
    }
}

#[test]
fn no_text_runs_as_a_formula_and_all_come_back() {
    let nasty = ["=1+1", "+cmd", "-2", "@SUM(A1)", "\t=x", "\r=x", "'quoted", "a,\"b\"\r\nc", "  =x"];
    for text in nasty {
        let mut sheet = sheets::fail();
        sheet.identity.serial = text.into();
        sheet.identity.lot = text.into();
        sheet.identity.technician = text.into();
        sheet.station = text.into();
        sheets::row_mut(&mut sheet, "visual.output_mirror").value = Value::Word(text.into());
        let (_, lines) = read(&record_csv(&sheet));
        for column in ["serial", "lot", "technician", "station"] {
            let written = cell(&lines[1], column);
            assert_eq!(restore(written), text);
            assert!(!written.trim_start().starts_with(['=', '+', '-', '@']), "{written:?}");
        }
        let last = lines.last().unwrap();
        assert_eq!(restore(cell(last, "value")), text, "a word stands in the column of values");
    }
}

#[test]
fn negative_numbers_stay_numbers() {
    let (_, lines) = read(&record_csv(&sheets::pass()));
    let walk = lines.iter().find(|line| cell(line, "measurand") == "walk_rate").unwrap();
    assert_eq!(cell(walk, "value"), "-41.2");
    assert_eq!(cell(walk, "unit"), "MHz/min");
}

#[test]
fn odd_numbers_are_empty() {
    let mut sheet = sheets::pass();
    let odd = Value::Number { value: f64::NAN, u: f64::INFINITY, expanded: f64::INFINITY, k: f64::NAN, dof: 0.0 };
    sheets::row_mut(&mut sheet, "power").value = odd;
    let (_, lines) = read(&record_csv(&sheet));
    let power = lines.iter().find(|line| cell(line, "measurand") == "power").unwrap();
    for column in ["value", "expanded_uncertainty", "coverage_factor"] {
        assert_eq!(cell(power, column), "");
    }
    assert_eq!(cell(power, "note"), "not a finite number");
}

#[test]
fn budget_lines_in_si() {
    let text = String::from_utf8(budget_csv(&sheets::pass())).unwrap();
    insta::assert_snapshot!(text.replace("\r\n", "\n"), @r#"
    measurand,source_id,line,type,standard_uncertainty,dof,sensitivity,note
    mode_spacing,scatter,scatter of the slope,A,400000,57,1,
    mode_spacing,SIM-0001,free spectral range,B,1440000,,1,
    "#);
}

#[test]
fn metadata_describes_both_tables() {
    let bytes = csv_metadata(&sheets::pass(), &"b".repeat(64), &"a".repeat(64));
    let json: serde_json::Value = serde_json::from_slice(&bytes).unwrap();
    assert_eq!(json["tables"][0]["url"], "record.csv");
    assert_eq!(json["tables"][0]["notes"][0]["sha256"], "a".repeat(64));
    assert_eq!(json["tables"][1]["notes"][0]["sha256"], "b".repeat(64));
    let columns = json["tables"][0]["tableSchema"]["columns"].as_array().unwrap();
    assert!(columns.iter().map(|column| column["name"].as_str().unwrap()).eq(RECORD_COLUMNS));
    assert_eq!(json["notes"][0]["supplier"], "A");
    assert_eq!(json["notes"][0]["limits"]["sha256"], "2".repeat(64));
    assert_eq!(json["notes"][0]["simulated"], true);
    assert_eq!(json["notes"][0]["caution"], sheets::pass().caution.english());
}

#[test]
fn every_optical_row_states_the_run_current() {
    let sheet = Sheet { run_current: Some(4.0e-3), ..sheets::fail() };
    let csv = String::from_utf8(record_csv(&sheet)).unwrap();
    let line = |key: &str| csv.lines().find(|line| line.contains(key)).unwrap().to_owned();
    assert!(line(",mode_spacing,").ends_with("at 4.00 mA"));
    assert!(line(",power,").contains("; at 4.00 mA"), "beside what the row says already");
    assert!(!line(",start_delay,").contains("mA"), "not an optical row");
}
