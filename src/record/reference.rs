//! Checks of a bench by its reference tubes, as they are frozen into the opening of a run.
//! Must not judge: bounds are the station file's.
//! Main type: [`ReferenceCheck`].

use serde::{Deserialize, Serialize};

/// One finished check: a run of kind `reference`, or one that is stored with a scenario.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ReferenceCheck {
    /// Serial of the reference tube.
    pub serial: String,
    /// Id of its run; empty where only values are stored.
    pub run_id: String,
    /// When the run was opened, RFC 3339 with offset.
    pub at: String,
    /// No run of this store: values that came with the scenario.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub stored: bool,
    /// What it read.
    pub values: Vec<CheckedValue>,
}

/// One measurand of a check.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CheckedValue {
    /// Measurand's key.
    pub measurand: String,
    /// SI.
    pub value: f64,
    /// Cumulative sums (up, down) after this check, in standard deviations; none while no standard deviation is known.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub sums: Option<(f64, f64)>,
}

impl ReferenceCheck {
    /// What it read of one measurand.
    pub fn value(&self, measurand: &str) -> Option<&CheckedValue> {
        self.values.iter().find(|value| value.measurand == measurand)
    }
}
