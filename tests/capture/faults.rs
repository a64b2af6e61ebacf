//! Bytes that are no capture, or a broken one: the right error, and never a panic.

use rand_chacha::ChaCha8Rng;
use rand_core::{RngCore, SeedableRng};
use tubewright::capture::{CaptureError, Columns, FEWEST_SAMPLES, read, read_many};

use super::layouts::{N, files};

/// Any seed would do; this one makes a failure repeatable.
const SEED: u64 = 20_260_105;
/// Enough that every layout is broken at a hundred and more places in about a second.
const ROUNDS: usize = 2_000;

fn file(name: &str) -> Vec<u8> {
    files().into_iter().find(|(known, _)| *known == name).unwrap().1
}

/// `ours.csv` with one line changed.
fn with_line(line: usize, text: &str) -> String {
    let ours = String::from_utf8(file("ours.csv")).unwrap();
    ours.lines().enumerate().map(|(at, old)| format!("{}\n", if at + 1 == line { text } else { old })).collect()
}

fn fault(bytes: impl AsRef<[u8]>, columns: Option<&str>) -> String {
    let columns = columns.map(|text| text.parse::<Columns>().unwrap());
    read("a.csv", bytes.as_ref(), columns.as_ref()).map(|c| c.remarks).unwrap_err().to_string()
}

#[test]
fn errors_say_what_where_and_what_was_expected() {
    assert!(fault("", None).starts_with("the file is empty"));
    assert!(fault(" \r\n\t\n", None).starts_with("the file is empty"));
    assert!(fault("Dear all,\nthe tube is dim.\n", None).contains("no samples found in 2 lines"));
    assert!(fault(b"\xFF\xFE1\x002\x00", None).contains("UTF-16"));
    let few: String = (0..50).map(|i| format!("{i}e-3,0.5\n")).collect();
    assert!(fault(few, None).contains(&format!("only 50 samples; expected at least {FEWEST_SAMPLES}")));
    let time: String = (0..500).map(|i| format!("{}e-3,2\n", 500 - i)).collect();
    assert!(fault(format!("time,x\n{time}"), None).contains("time runs backward"));
    let stands: String = (0..500).map(|_| "0.5,2\n").collect();
    assert!(fault(format!("time,x\n{stands}"), None).contains("every time stamp is 0.5 s"));
    let lone: String = (0..500).map(|i| format!("{i}e-3,\n")).collect();
    assert!(
        fault(format!("time,x\n{lone}"), Some("time=1,photodiode=2")).contains("column 2 was named for photodiode")
    );
}

#[test]
fn a_bad_cell_between_samples_is_named_by_line_and_column() {
    for (cell, shown) in
        [("nan", "`nan`"), ("", "``"), ("-inf", "`-inf`"), ("9.9E+37", "`9.9E+37`"), ("oops", "`oops`")]
    {
        let text = fault(with_line(70, &format!("0.0001,2.0,{cell},0.1")), None);
        assert!(text.starts_with(&format!("line 70, column 3: {shown} between samples")), "{text}");
    }
    assert!(fault(with_line(70, "0.0001,2.0"), None).starts_with("line 70, column 3: ``"), "a short line");
    // Where no channel in use is touched, nothing is wrong.
    let columns = "time=1,ramp=2,photodiode=3".parse().unwrap();
    let text = with_line(70, "0.00006,6.3,0.020,oops");
    assert!(read("a.csv", text.as_bytes(), Some(&columns)).is_ok());
}

#[test]
fn named_columns_must_be_there() {
    let ours = file("ours.csv");
    let text = fault(&ours, Some("time=1,ramp=2,photodiode=7"));
    assert_eq!(text, "column 7 was named for photodiode, but there are 4 columns");
    let text = fault(file("beside-CH1.csv"), Some("time=4,photodiode=2"));
    assert_eq!(text, "column 2 was named for photodiode, but it holds no numbers; columns with numbers: 4, 5");
    assert!(fault(&ours, Some("photodiode=b.csv:1")).contains("the columns name a file `b.csv` for photodiode"));
}

#[test]
fn files_of_one_capture_must_fit_together() {
    let (a, b) = (file("C2segment.csv"), file("C3segment.csv"));
    let text = String::from_utf8_lossy(&b).into_owned();
    let shorter = text.trim_end().rsplit_once('\n').unwrap().0;
    let both = |second: &[u8]| read_many(&[("a", &a), ("b", second)], None).map(|c| c.remarks);
    assert_eq!(
        both(shorter.as_bytes()).unwrap_err().to_string(),
        format!("a has {N} samples, b has {} samples; expected equal lengths", N - 1).replace(" samples;", ";")
    );
    let late = text.replace("0.00", "1.00");
    assert!(both(late.as_bytes()).is_err());
    let elsewhere: Vec<u8> = (0..N).flat_map(|i| format!("{}e-5,{}\n", 2 * i, i % 7).into_bytes()).collect();
    assert!(matches!(both(&elsewhere), Err(CaptureError::UnequalTimes { .. })));
    assert!(both(b"").unwrap_err().to_string().starts_with("b: the file is empty"));
    assert_eq!(read_many(&[], None).map(|c| c.remarks), Err(CaptureError::NoFiles));
}

/// Whatever comes back, it must not be a panic, and what is read must keep its promises.
fn survives(bytes: &[u8], second: &[u8]) {
    let columns: Columns = "time=1,ramp=2,photodiode=3".parse().unwrap();
    for result in
        [read("a", bytes, None), read("a", bytes, Some(&columns)), read_many(&[("a", bytes), ("b", second)], None)]
    {
        match result {
            Ok(capture) => {
                let channels = [Some(&capture.photodiode), capture.ramp.as_ref(), capture.crossed.as_ref()];
                for channel in channels.into_iter().flatten() {
                    assert_eq!(channel.len(), capture.time.n);
                    assert!(channel.iter().all(|v| v.is_finite()));
                }
                assert!(capture.time.step > 0.0 && capture.time.at(capture.time.n).is_finite(), "{:?}", capture.time);
                capture.remarks.iter().for_each(|remark| assert!(!remark.to_string().is_empty()));
            }
            Err(error) => assert!(!error.to_string().is_empty()),
        }
    }
}

#[test]
fn random_bytes_never_panic() {
    let mut rng = ChaCha8Rng::seed_from_u64(SEED);
    let alphabet = b"0123456789.,;-+eE \t\r\n\"#=na";
    for round in 0..ROUNDS {
        let mut bytes = vec![0_u8; rng.next_u32() as usize % 3_000];
        rng.fill_bytes(&mut bytes);
        if round % 2 == 0 {
            bytes.iter_mut().for_each(|b| *b = alphabet[usize::from(*b) % alphabet.len()]);
        }
        survives(&bytes, &bytes);
    }
}

#[test]
fn broken_exports_never_panic() {
    let mut rng = ChaCha8Rng::seed_from_u64(SEED);
    let files = files();
    let pieces: [&[u8]; 14] =
        [b",", b"\n", b"\r", b"e", b"-", b"nan", b"1e308", b"-1e308", b"\"", b"#", b"\xFF", b"\t", b";", b"1e-320"];
    for _ in 0..ROUNDS {
        let mut pick = |n: usize| rng.next_u32() as usize % n;
        let mut bytes = files[pick(files.len())].1.clone();
        for _ in 0..1 + pick(6) {
            let at = pick(bytes.len() + 1);
            let end = bytes.len().min(at + pick(40));
            match pick(4) {
                0 => drop(bytes.splice(at..at, pieces[pick(pieces.len())].iter().copied())),
                1 => drop(bytes.drain(at..end)),
                2 => bytes.truncate(at.max(1)),
                _ => {
                    let piece = pieces[pick(pieces.len())];
                    bytes.splice(at..end, piece.iter().copied());
                }
            }
        }
        survives(&bytes, &files[pick(files.len())].1);
    }
}
