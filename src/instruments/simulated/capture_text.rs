//! A simulated digitizer's export: our own layout, digits at fixed places, quick to write.
//! Must not open a file: it returns bytes.
//! Main function: [`simulated_csv`].

use chrono::{DateTime, FixedOffset, SecondsFormat};

use crate::phantom::{LightTrace, RawTrace};

/// Decimals of times, s, and of voltages, V.
const TIME_DECIMALS: u32 = 10;
const VOLT_DECIMALS: u32 = 6;

/// What stands in the head of a simulated capture.
#[derive(Debug, Clone, PartialEq)]
pub struct CaptureHead {
    /// Begin of the capture.
    pub captured_at: DateTime<FixedOffset>,
    /// Number in the run.
    pub number: u64,
    /// Azimuth of the polarizer, rad.
    pub polarizer: Option<f64>,
    /// Reading of the power meter, W.
    pub power: f64,
    /// Tube current, A.
    pub run_current: f64,
}

/// Name of a capture's file: `c00017.csv`.
pub fn simulated_capture_name(number: u64) -> String {
    format!("c{number:05}.csv")
}

/// One capture as CSV: head lines `# key = value`, names with units, one sample a line.
///
/// The digits depend on the samples alone: equal traces give equal bytes.
pub fn simulated_csv(trace: &RawTrace, head: &CaptureHead) -> Vec<u8> {
    let mut text = format!("# captured_at = {}\n", head.captured_at.to_rfc3339_opts(SecondsFormat::Millis, true));
    text.push_str(&format!("# capture = {}\n", head.number));
    if let Some(angle) = head.polarizer {
        text.push_str(&format!("# polarizer = {:.1} deg\n", angle.to_degrees()));
    }
    text.push_str(&format!("# power = {:.6} mW\n", head.power * 1e3));
    text.push_str(&format!("# run_current = {:.3} mA\n", head.run_current * 1e3));
    let crossed = trace.crossed.as_deref();
    text.push_str("time_s,ramp_V,photodiode_V");
    text.push_str(if crossed.is_some() { ",crossed_V\n" } else { "\n" });
    let mut bytes = text.into_bytes();
    bytes.reserve(trace.photodiode.len() * 48);
    for (k, (ramp, photodiode)) in trace.ramp.iter().zip(&trace.photodiode).enumerate() {
        push_fixed(&mut bytes, k as f64 * trace.time_step, TIME_DECIMALS);
        let others = crossed.and_then(|channel| channel.get(k));
        for value in [ramp, photodiode].into_iter().chain(others) {
            bytes.push(b',');
            push_fixed(&mut bytes, *value, VOLT_DECIMALS);
        }
        bytes.push(b'\n');
    }
    bytes
}

/// One light trace as CSV: our own head lines, then one sample a line; the times follow from the interval in the head.
pub fn simulated_light_csv(trace: &LightTrace, captured_at: DateTime<FixedOffset>, number: u64, lit: bool) -> Vec<u8> {
    let mut text = format!("# captured_at = {}\n", captured_at.to_rfc3339_opts(SecondsFormat::Millis, true));
    let lit = if lit { "lit" } else { "dark" };
    text.push_str(&format!("# capture = {number}\n# light = {lit}\n"));
    text.push_str(&format!("# sample_rate = {:.0} Hz\nlight_V\n", 1.0 / trace.time_step));
    let mut bytes = text.into_bytes();
    bytes.reserve(trace.volts.len() * 10);
    for value in &trace.volts {
        push_fixed(&mut bytes, *value, VOLT_DECIMALS);
        bytes.push(b'\n');
    }
    bytes
}

/// Appends a number with a fixed count of decimals.
fn push_fixed(bytes: &mut Vec<u8>, value: f64, decimals: u32) {
    let scale = 10_u64.pow(decimals);
    let scaled = (value.abs() * scale as f64).round() as u64;
    if value < 0.0 && scaled > 0 {
        bytes.push(b'-');
    }
    bytes.extend_from_slice((scaled / scale).to_string().as_bytes());
    bytes.push(b'.');
    let mut rest = scaled % scale;
    let mut place = scale / 10;
    while place > 0 {
        // One decimal digit: below ten.
        bytes.push(b'0' + (rest / place) as u8);
        rest %= place;
        place /= 10;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_keep_their_sign_and_their_zeros() {
        let text = |value| {
            let mut bytes = Vec::new();
            push_fixed(&mut bytes, value, VOLT_DECIMALS);
            String::from_utf8(bytes).unwrap_or_default()
        };
        assert_eq!(text(-0.0203), "-0.020300");
        assert_eq!(text(8.999_999_6), "9.000000");
        assert_eq!(text(-1e-9), "0.000000");
    }
}
