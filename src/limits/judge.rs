//! The verdict: rows against limits, grades left, order of outcomes.
//! Must not round: verdicts take unrounded values.
//! Main function: [`judge`].

use super::Limits;
use crate::record::sheet::{Outcome, Row, TubeVerdict};

/// What is judged.
pub struct Judging<'a> {
    /// The limits.
    pub limits: &'a Limits,
    /// The rows; judged in place.
    pub rows: &'a mut [Row],
    /// Why the bench gives no verdicts, as sentences; empty if it is in order.
    pub bench_holds: &'a [String],
    /// Every step is done.
    pub finished: bool,
    /// The tube gave no light.
    pub dark: bool,
}

/// Judges every limited row and the tube.
pub fn judge(judging: Judging<'_>) -> TubeVerdict {
    let _ = judging;
    TubeVerdict {
        outcome: Outcome::Open,
        grade: None,
        reject_code: None,
        sentence: "open.".to_owned(),
        reason: String::new(),
    }
}
