//! Writes our own layout: head lines, names with units, one sample a line.
//! Must not open a file: it returns bytes.
//! Main function: [`write_csv`].

use std::fmt::Write;

use super::{Capture, Head};

/// A capture as CSV: lines `# key = value`, then `time_s,ramp_V,photodiode_V,crossed_V` (absent channels left out).
///
/// Times carry ten significant digits, volts seven, each in its shortest form: the same capture gives the same bytes.
/// Channels of unequal length are written as far as the time base says; a missing sample is a blank cell.
pub fn write_csv(capture: &Capture) -> Vec<u8> {
    let Capture { time, ramp, photodiode, crossed, head, .. } = capture;
    let mut text = String::with_capacity(64 + time.n * 48);
    write_head(&mut text, head);
    let channels: Vec<(&str, &[f64])> =
        [("ramp_V", ramp.as_deref()), ("photodiode_V", Some(photodiode.as_slice())), ("crossed_V", crossed.as_deref())]
            .into_iter()
            .filter_map(|(name, volts)| Some((name, volts?)))
            .collect();
    text.push_str("time_s");
    for (name, _) in &channels {
        text.push(',');
        text.push_str(name);
    }
    text.push('\n');
    for index in 0..time.n {
        push_number(&mut text, time.at(index), 10);
        for (_, volts) in &channels {
            text.push(',');
            if let Some(&value) = volts.get(index) {
                push_number(&mut text, value, 7);
            }
        }
        text.push('\n');
    }
    text.into_bytes()
}

fn write_head(text: &mut String, head: &Head) {
    let mut line = |key: &str, value: Option<String>| {
        if let Some(value) = value {
            text.extend(["# ", key, " = ", &value, "\n"]);
        }
    };
    let quantity = |si: Option<f64>, factor: f64, unit: &str| {
        si.map(|si| {
            let mut value = String::new();
            push_number(&mut value, si / factor, 9);
            format!("{value} {unit}")
        })
    };
    let at = head.captured_at.map(|at| at.to_rfc3339_opts(chrono::SecondsFormat::Millis, true));
    line("captured_at", at);
    line("capture", head.capture.map(|number| number.to_string()));
    line("polarizer", quantity(head.polarizer, std::f64::consts::PI / 180.0, "deg"));
    line("power", quantity(head.power, 1e-3, "mW"));
    line("run_current", quantity(head.run_current, 1e-3, "mA"));
}

/// Shortest decimal text of `value` rounded to `digits` significant digits; with an exponent below 1e-4.
fn push_number(text: &mut String, value: f64, digits: usize) {
    let rounded: f64 = format!("{value:.*e}", digits.saturating_sub(1)).parse().unwrap_or(value);
    // Writing into a String cannot fail.
    let _ =
        if rounded != 0.0 && rounded.abs() < 1e-4 { write!(text, "{rounded:e}") } else { write!(text, "{rounded}") };
}
