//! The certificate an instrument stands on.
//! Must not decide what an overdue one means.

use chrono::NaiveDate;

/// Number, date and due date of a calibration.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Certificate {
    /// As printed on it.
    pub number: String,
    /// Day of the calibration.
    pub date: NaiveDate,
    /// Last day on which it holds.
    pub due: NaiveDate,
    /// For an interferometer: `air` or `vacuum`; else empty.
    pub medium: String,
}

impl Certificate {
    /// Whether it no longer holds on a day.
    pub fn overdue_on(&self, day: NaiveDate) -> bool {
        day > self.due
    }
}
