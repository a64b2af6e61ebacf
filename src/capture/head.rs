//! Our own lines `# key = value` before the samples.
//! Must not read other makers' headers.
//! Main type: [`Head`].

use chrono::{DateTime, FixedOffset};

use super::remark::CaptureRemark;
use crate::quantity::{Dimension, parse_as};

/// What a capture says about the bench at its moment.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Head {
    /// When it was captured, to the millisecond.
    pub captured_at: Option<DateTime<FixedOffset>>,
    /// Angle of the polarizer, radians.
    pub polarizer: Option<f64>,
    /// The power meter's reading, watts.
    pub power: Option<f64>,
    /// The tube's current, amperes.
    pub run_current: Option<f64>,
    /// Number of the capture in its run.
    pub capture: Option<u64>,
}

impl Head {
    /// Reads keys and values; unknown keys belong to others and are passed over. What cannot be read is a remark.
    pub(super) fn from_lines(lines: &[(String, String)], remarks: &mut Vec<CaptureRemark>) -> Self {
        let mut head = Self::default();
        for (key, value) in lines {
            if let Err(fault) = head.take(key, value) {
                remarks.push(CaptureRemark::HeadUnreadable { key: key.clone(), fault });
            }
        }
        head
    }

    fn take(&mut self, key: &str, value: &str) -> Result<(), String> {
        let quantity = |dimension| parse_as(value, dimension).map(Some).map_err(|error| error.to_string());
        match key {
            "captured_at" => {
                let at = DateTime::parse_from_rfc3339(value);
                self.captured_at = Some(at.map_err(|_| {
                    format!("`{value}` is no time; expected such as `2026-01-05T06:00:00.000Z` (RFC 3339)")
                })?);
            }
            "polarizer" => self.polarizer = quantity(Dimension::Angle)?,
            "power" => self.power = quantity(Dimension::Power)?,
            "run_current" => self.run_current = quantity(Dimension::Current)?,
            "capture" => {
                let number = value.parse();
                self.capture = Some(number.map_err(|_| format!("`{value}` is no number of a capture"))?);
            }
            _ => {}
        }
        Ok(())
    }
}
