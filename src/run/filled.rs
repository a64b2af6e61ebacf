//! One filled row as a step hands it over, before label, bounds and verdict are put to it.
//! Must not judge.
//! Main type: [`Filled`].

use crate::{
    measurand,
    phrase::{Saying, name, opening, reasons},
    record::sheet::{Row, Value},
    uncertainty::{BudgetLine, Measured},
};

/// A row's content.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Filled {
    /// Measurand's key, or `visual.<step>`.
    pub measurand: String,
    /// What was found.
    pub value: Value,
    /// Budget, SI.
    pub budget: Vec<BudgetLine>,
    /// One line of words, or empty.
    pub note: Saying,
}

impl Filled {
    /// A number with its budget; a result that is not finite is absent.
    pub fn number(measurand: &str, measured: &Measured) -> Self {
        let (value, u, dof) = (measured.value, measured.u(), measured.dof());
        let k = measured.coverage_factor();
        if !(value.is_finite() && u.is_finite() && k.is_finite() && !dof.is_nan()) {
            return Self::absent(measurand, &reasons::NOT_FINITE);
        }
        let value = Value::Number { value, u, expanded: k * u, k, dof };
        Self { measurand: measurand.into(), value, budget: measured.budget.clone(), note: Saying::none() }
    }

    /// A whole number known exactly or within an interval.
    pub fn count(measurand: &str, value: u64, low: u64, high: u64) -> Self {
        Self::plain(measurand, Value::Count { value, low, high })
    }

    /// No value, and why.
    pub fn absent(measurand: &str, reason: impl Into<Saying>) -> Self {
        Self::plain(measurand, Value::Absent(reason.into()))
    }

    /// Any value without a budget.
    pub fn plain(measurand: &str, value: Value) -> Self {
        Self { measurand: measurand.into(), value, budget: Vec::new(), note: Saying::none() }
    }

    /// The same with a note.
    pub fn noted(mut self, note: impl Into<Saying>) -> Self {
        self.note = note.into();
        self
    }

    /// Whether it holds a value.
    pub fn is_absent(&self) -> bool {
        matches!(self.value, Value::Absent(_))
    }

    /// The row of a sheet, not yet judged.
    pub fn into_row(self, step: &str) -> Row {
        Row {
            step: step.into(),
            label: label(&self.measurand),
            measurand: self.measurand,
            value: self.value,
            budget: self.budget,
            judged: Vec::new(),
            deciding: false,
            note: self.note,
        }
    }
}

/// Name of a row on the sheet: the catalogue's, or the look's step in words.
fn label(key: &str) -> Saying {
    match measurand::find(key) {
        Some(measurand) => (&measurand.name).into(),
        None => {
            let words = key.strip_prefix("visual.").unwrap_or(key).replace('_', " ");
            Saying::of(opening(Saying::of(name(words))))
        }
    }
}
