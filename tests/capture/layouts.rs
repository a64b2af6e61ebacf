//! One made-up capture, written in every layout that exports are met in, and read back.
//! Set `TUBEWRIGHT_MAKE_FIXTURES=1` to write `fixtures/layouts/` again.

use std::{fmt::Write, path::PathBuf};

use tubewright::capture::{Capture, CaptureRemark, TimeBase, read, read_many, write_csv};

/// Samples of the made-up capture.
pub const N: i32 = 160;
/// Microseconds between samples, and of the first.
const STEP_US: i32 = 20;
const START_US: i32 = -1200;

/// Millivolts of the ramp: a triangle from 0 to 8 V and back.
fn ramp_mv(i: i32) -> i32 {
    100 * if i <= N / 2 { i } else { N - i }
}

/// Millivolts of a photodiode: peaks at two pairs of ramp voltages, one and the next order.
fn light_mv(i: i32, heights: [i32; 2]) -> i32 {
    let peak = |at: i32, height: i32| {
        let x = (ramp_mv(i) - at) / 50;
        height / (1 + x * x)
    };
    20 + peak(1000, heights[0]) + peak(1700, heights[1]) + peak(5000, heights[0]) + peak(5700, heights[1])
}

pub fn photodiode_mv(i: i32) -> i32 {
    light_mv(i, [900, 500])
}

fn time_us(i: i32) -> i32 {
    START_US + STEP_US * i
}

/// A whole number of thousandths as a decimal.
fn milli(value: i32) -> String {
    format!("{}{}.{:03}", if value < 0 { "-" } else { "" }, value.abs() / 1000, value.abs() % 1000)
}

fn seconds(i: i32) -> String {
    let us = time_us(i);
    format!("{}0.{:06}", if us < 0 { "-" } else { "" }, us.abs())
}

/// Header, then one line for each sample.
fn table(header: &str, end: &str, line: impl Fn(i32) -> String) -> Vec<u8> {
    let mut text = header.replace('\n', end);
    for i in 0..N {
        text += &line(i);
        text += end;
    }
    text.into_bytes()
}

/// Key rows beside the samples.
fn beside(source: &str, unit: &str, value: impl Fn(i32) -> i32) -> Vec<u8> {
    let keys = [
        format!("Record Length,{N}.0e+00,"),
        "Sample Interval,2.0e-05,".into(),
        ",,".into(),
        format!("Source,{source},"),
        format!("Vertical Units,{unit},"),
        "Horizontal Units,s,".into(),
    ];
    table("", "\r\n", |i| {
        let key = usize::try_from(i).ok().and_then(|i| keys.get(i)).map_or(",,", String::as_str);
        // From the seventh line on the stamp fills its field to the comma.
        let stamp = if i < 6 { format!("  {}", seconds(i)) } else { seconds(i).replacen("0.", "00.", 1) };
        format!("{key},{stamp},{:>10},", milli(value(i)))
    })
}

fn rearranged(value: impl Fn(i32) -> i32) -> Vec<u8> {
    table("col 1,col 2,,,Memory Length,160\n", "\n", |i| {
        let keys = ["Probe,1.0X", "Vertical Units,V", "Sampling Period,2.00E-05", "Time, "];
        let key = usize::try_from(i).ok().and_then(|i| keys.get(i)).copied().unwrap_or(",");
        // Three significant digits, as a spreadsheet leaves them.
        format!("{:.2E},{},,,{key}", f64::from(STEP_US * i) * 1e-6, milli(value(i)))
    })
}

fn segment(value: impl Fn(i32) -> i32) -> Vec<u8> {
    let mut bytes = b"BENCH \xB5SCOPE,7,Waveform\r\nSegments,1,SegmentSize,160\r\nSegment,TrigTime\r\n".to_vec();
    bytes.extend(table("#1,02-Jan-2026 10:00:00,0      \nTime,Ampl\n", "\r\n", |i| {
        format!("{},{}", seconds(i), milli(value(i)))
    }));
    bytes
}

/// Every made-up file: name and bytes.
pub fn files() -> Vec<(&'static str, Vec<u8>)> {
    let volts = |i| milli(photodiode_mv(i));
    let ramp = |i| milli(ramp_mv(i));
    let crossed = |i| milli(light_mv(i, [400, 800]));
    vec![
        (
            "ours.csv",
            table(
                "# captured_at = 2026-01-05T06:00:00.250Z\n# capture = 17\n# polarizer = 45 deg\n# power = 0.884 mW\n\
             # run_current = 4.0 mA\ntime_s,ramp_V,photodiode_V,crossed_V\n",
                "\n",
                |i| format!("{},{},{},{}", seconds(i), ramp(i), volts(i), crossed(i)),
            ),
        ),
        ("beside-CH1.csv", beside("CH1", "V", photodiode_mv)),
        ("beside-CH2.csv", beside("CH2", "A", ramp_mv)),
        (
            "side-by-side.csv",
            table("", "\r\n", |i| {
                let key = |channel: &str| match i {
                    0 => "Record Length,160,Points".into(),
                    1 => "Sample Interval,20.0E-6,s".into(),
                    2 => format!("Source,{channel},"),
                    3 => "Vertical Units,Volts,".into(),
                    _ => ",,".to_owned(),
                };
                let stamp = if i == 110 { "0.0E-3".into() } else { format!("{}.00E-6", time_us(i)) };
                let millivolts = |value: i32| format!("{value}.0E-3");
                format!(
                    "{},{stamp},{},,{},{stamp},{},",
                    key("CH1"),
                    millivolts(ramp_mv(i)),
                    key("CH2"),
                    millivolts(photodiode_mv(i))
                )
            }),
        ),
        (
            "keys-before.csv",
            table(
                "Format,1.0B,\nMemory Length,160,\nSource,CH1,\nLabel, ,\nVertical Units,V,\nSampling Period,2.000E-05,\n\
             Mode,Detail,\nWaveform Data,\n",
                "\r\n",
                |i| format!("{:.6e},{},", f64::from(time_us(i)) * 1e-6, volts(i)),
            ),
        ),
        (
            "codes.csv",
            table(
                "Memory Length,160,\nSource,CH1,\nVertical Units,V,\nVertical Scale,1.0e-01,\nSampling Period,2.0e-05,\n\
             Time, ,\nWaveform Data,\n",
                "\r\n",
                |i| format!("{},", photodiode_mv(i)),
            ),
        ),
        (
            "start-increment.csv",
            table("X,CH1,CH2,Start,Increment,\nSequence,Volt,Volt,-1.2e-03,2.0e-05\n", "\r\n", |i| {
                format!("{i},{},{},", ramp(i), volts(i))
            }),
        ),
        (
            "lone-cr.csv",
            table("TIME,CH2\n", "\r", |i| {
                format!("{},{}", format_args!("{:.1}", f64::from(time_us(i)) * 1e-3), volts(i))
            }),
        ),
        (
            "blanks.txt",
            table("", "\n", |i| {
                format!(
                    "{:>9.2E}   {:.2E}   {:.3E}",
                    f64::from(time_us(i)) * 1e-6,
                    f64::from(ramp_mv(i)) * 1e-3,
                    f64::from(photodiode_mv(i)) * 1e-3
                )
            }),
        ),
        (
            "comments.csv",
            table(
                "#Bench digitizer\n#Sample rate: 50kHz\n#Samples: 160\n#Trigger: Source: Channel 1\n\n\
             Time (s),Channel 1 (V),Channel 2 (V)\n",
                "\n",
                |i| format!("{},{},{}", seconds(i), volts(i), ramp(i)),
            ),
        ),
        (
            "units-row.csv",
            table("x-axis,1,2\nsecond,Volt,Volt\n", "\n", |i| {
                let cells = if (5..N - 3).contains(&i) { format!("+{},+{}", volts(i), ramp(i)) } else { ",".into() };
                format!("{:+}.00000E-06,{cells}", time_us(i))
            }),
        ),
        (
            "trailing-blank.csv",
            table(",CH1,CH2\nSecond,Volt,Volt\n", "\r\n", |i| {
                format!("{:.5e},{},{}, ", f64::from(time_us(i)) * 1e-6, ramp(i), volts(i))
            }),
        ),
        (
            "scaled-codes.txt",
            table(
                "sec,Volt,sec,ch1\nDataType\tPoints\tXincrement\tXorigin\tXreference\tYincrement\tYorigin\tYreference\t\n\
             5\t160\t0,00002\t-0,0012\t0\t0,001\t0,5\t100\t1\npoint\tch1\n",
                "\n",
                |i| format!("{i}\t{}", photodiode_mv(i) - 500 + 100),
            ),
        ),
        ("latin-units.csv", {
            let text = table("Time (@s),Ramp (V),Photodiode (mV)\n", "\n", |i| {
                format!("{},{},{}", time_us(i), ramp(i), photodiode_mv(i))
            });
            text.into_iter().map(|b| if b == b'@' { 0xB5 } else { b }).collect()
        }),
        (
            "semicolons.csv",
            table("t [ms];ramp [V];photodiode [V]\n", "\r\n", |i| {
                format!("{};{};{}", milli(time_us(i)), ramp(i), volts(i)).replace('.', ",")
            }),
        ),
        ("rearranged-CH1.csv", rearranged(ramp_mv)),
        ("rearranged-CH2.csv", rearranged(photodiode_mv)),
        ("C2segment.csv", segment(photodiode_mv)),
        ("C3segment.csv", segment(ramp_mv)),
    ]
}

fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("fixtures/layouts")
}

fn fixture(name: &str) -> Vec<u8> {
    std::fs::read(folder().join(name)).unwrap()
}

#[test]
fn the_files_are_what_this_test_makes() {
    for (name, bytes) in files() {
        let (path, note) = (folder().join(name), folder().join(format!("{name}.toml")));
        if std::env::var_os("TUBEWRIGHT_MAKE_FIXTURES").is_some() {
            std::fs::write(&path, &bytes).unwrap();
            std::fs::write(&note, note_of(name)).unwrap();
        }
        assert_eq!(fixture(name), bytes, "{name}: made otherwise; see the head of this file");
        let note: toml::Table = std::fs::read_to_string(note).unwrap().parse().unwrap();
        for key in ["origin", "licence", "made_by", "expected", "tolerance", "reason"] {
            assert!(note.contains_key(key), "{name}.toml has no `{key}`");
        }
    }
}

/// The note beside each file, with what a reader must find.
fn note_of(name: &str) -> String {
    let expected = wanted(name);
    let mut text = String::from("origin = \"made up: a triangle of 8 V and peaks of two modes over two orders\"\n");
    text += "licence = \"as the project\"\nmade_by = \"tests/capture/layouts.rs\"\n";
    writeln!(text, "tolerance = {{ time_steps = {:?}, volts = {:?} }}", expected.steps_off, expected.volts_off)
        .unwrap();
    writeln!(text, "reason = \"{}\"", expected.reason).unwrap();
    let TimeBase { start, step, n } = expected.time;
    writeln!(text, "[expected]\nsamples = {n}\nstart_s = {start:?}\nstep_s = {step:?}\nramp = {}", expected.ramp)
        .unwrap();
    text
}

struct Wanted {
    time: TimeBase,
    /// Index of the first sample in the made-up capture.
    first: i32,
    ramp: bool,
    steps_off: f64,
    volts_off: f64,
    reason: &'static str,
}

fn wanted(name: &str) -> Wanted {
    let exact = "decimals are written exactly: double rounding alone";
    let whole = TimeBase { start: -1.2e-3, step: 2e-5, n: N as usize };
    let usual = Wanted { time: whole, first: 0, ramp: true, steps_off: 1e-6, volts_off: 1e-12, reason: exact };
    match name {
        "keys-before.csv" | "scaled-codes.txt" => Wanted { ramp: false, ..usual },
        "codes.csv" => Wanted { time: TimeBase { start: 0.0, ..whole }, ramp: false, ..usual },
        "lone-cr.csv" => Wanted {
            time: TimeBase { start: -1.2, step: 0.02, n: N as usize },
            ramp: false,
            steps_off: 5.0,
            reason: "stamps are rounded to five steps, in a file that does not name its unit",
            ..usual
        },
        "blanks.txt" => Wanted {
            steps_off: 0.5,
            volts_off: 5.1e-3,
            reason: "three digits: stamps to half a step, ramp to 5 mV",
            ..usual
        },
        "units-row.csv" => Wanted {
            time: TimeBase { start: -1.1e-3, n: N as usize - 8, ..whole },
            first: 5,
            reason: "the blank ends are dropped; else exact",
            ..usual
        },
        _ if name.starts_with("rearranged") => Wanted {
            time: TimeBase { start: 0.0, ..whole },
            steps_off: 0.5,
            reason: "three digits, half a step from 1 ms on",
            ..usual
        },
        _ => usual,
    }
}

fn check(name: &str, capture: &Capture) {
    let wanted = wanted(name);
    assert_eq!(capture.time.n, wanted.time.n, "{name}");
    let off = |i: usize| (capture.time.at(i) - wanted.time.at(i)).abs() / wanted.time.step;
    assert!(off(0).max(off(wanted.time.n)) <= wanted.steps_off, "{name}: {:?}", capture.time);
    let near = |found: &[f64], truth: &dyn Fn(i32) -> i32, what: &str| {
        for (k, value) in found.iter().enumerate() {
            let truth = f64::from(truth(k as i32 + wanted.first)) * 1e-3;
            assert!((value - truth).abs() <= wanted.volts_off, "{name}, {what} {k}: {value} for {truth}");
        }
    };
    // Raw codes stay codes: here they are millivolts.
    let scale = if name == "codes.csv" { 1000 } else { 1 };
    near(&capture.photodiode, &|i| photodiode_mv(i) * scale, "photodiode");
    assert_eq!(capture.ramp.is_some(), wanted.ramp, "{name}");
    near(capture.ramp.as_deref().unwrap_or_default(), &ramp_mv, "ramp");
}

#[test]
fn every_layout_is_read() {
    for (name, bytes) in files() {
        if !(name.contains("CH") || name.contains("segment")) {
            check(name, &read(name, &bytes, None).unwrap_or_else(|error| panic!("{name}: {error}")));
        }
    }
    for pair in [
        ["beside-CH1.csv", "beside-CH2.csv"],
        ["rearranged-CH1.csv", "rearranged-CH2.csv"],
        ["C2segment.csv", "C3segment.csv"],
    ] {
        let bytes = pair.map(fixture);
        let capture = read_many(&[(pair[0], &bytes[0]), (pair[1], &bytes[1])], None);
        check(pair[0], &capture.unwrap_or_else(|error| panic!("{pair:?}: {error}")));
    }
}

#[test]
fn what_is_odd_is_remarked() {
    let remarks = |name: &str| read(name, &fixture(name), None).unwrap().remarks;
    assert_eq!(remarks("ours.csv"), []);
    assert!(remarks("side-by-side.csv").contains(&CaptureRemark::StampsWrong { count: 1, line: 111, stamp: 0.0 }));
    assert!(remarks("codes.csv").contains(&CaptureRemark::RawCodes { channel: "photodiode" }));
    assert!(remarks("units-row.csv").contains(&CaptureRemark::EndsDropped { first: 5, last: 3 }));
    assert!(matches!(remarks("lone-cr.csv")[..], [CaptureRemark::StampsRepeated { .. }, ..]));
    let (a, b) = (fixture("beside-CH1.csv"), fixture("beside-CH2.csv"));
    let odd = read_many(&[("CH1", &a), ("CH2", &b)], None).unwrap().remarks;
    assert!(odd.contains(&CaptureRemark::UnitOdd { channel: "ramp", unit: "A".into() }), "{odd:?}");
}

#[test]
fn our_head_is_read_and_written_again() {
    let bytes = fixture("ours.csv");
    let capture = read("ours.csv", &bytes, None).unwrap();
    assert_eq!(capture.head.captured_at.unwrap().to_rfc3339(), "2026-01-05T06:00:00.250+00:00");
    assert_eq!(capture.head.capture, Some(17));
    assert!((capture.head.polarizer.unwrap().to_degrees() - 45.0).abs() < 1e-12);
    assert!((capture.head.power.unwrap() - 0.884e-3).abs() < 1e-15);
    assert_eq!(capture.head.run_current, Some(0.004));
    let written = write_csv(&capture);
    assert_eq!(written, write_csv(&capture), "the same capture gives the same bytes");
    let again = read("again.csv", &written, None).unwrap();
    assert_eq!((again.photodiode, again.ramp, again.crossed), (capture.photodiode, capture.ramp, capture.crossed));
    // Ten digits of the last stamp, 2 ms: 1e-13 s of a 20 µs step.
    assert!((again.time.step / capture.time.step - 1.0).abs() < 1e-9);
    assert_eq!(again.head.captured_at, capture.head.captured_at);
}
