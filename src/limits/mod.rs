//! The limits file of a tube type, the decision rules, and the verdict.
//! Must not measure anything, and must not know recipes or runs: what a recipe fills comes in as [`Fillable`].
//! Main types: [`Limits`], [`Fault`]; main function: [`judge`].

mod conformance;
mod decide;
mod fault;
mod judge;
mod parse;
pub mod reading;
mod signs;
mod words;

use std::fmt;

pub use conformance::{conformance_probability, zone};
pub use fault::{Fault, nearest};
pub use judge::{DARK, Judging, judge};

/// A limits file.
#[derive(Debug, Clone, PartialEq)]
pub struct Limits {
    /// `revision =`, from 1.
    pub revision: u64,
    /// SHA-256 of the text, hexadecimal.
    pub sha256: String,
    /// What the type is, in words.
    pub title: String,
    /// Grades, best first; at least one.
    pub grades: Vec<String>,
    /// Decision rule of limits that name none.
    pub rule: Rule,
    /// The limits, in the order of the file.
    pub limits: Vec<Limit>,
}

/// How a value near its bound is decided (JCGM 106:2012, clause 8).
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Rule {
    /// Inside is inside: the doubt is shared.
    Shared,
    /// Inside by the expanded uncertainty.
    Guarded,
    /// Conformance probability of at least this, inside (0.5, 1).
    Probability(f64),
}

impl fmt::Display for Rule {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Shared => f.write_str("shared"),
            Self::Guarded => f.write_str("guarded"),
            // 99.9 % must not print as 99.90000000000001 %.
            Self::Probability(p) => write!(f, "{} %", (p * 1e8).round() / 1e6),
        }
    }
}

/// One limit.
#[derive(Debug, Clone, PartialEq)]
pub struct Limit {
    /// Measurand's key, or `visual.<step>`.
    pub measurand: String,
    /// Lower bound, SI.
    pub lower: Bound,
    /// Upper bound, SI.
    pub upper: Bound,
    /// Words that pass, for a look; empty for a number.
    pub wanted: Vec<String>,
    /// Decision rule, if not the file's.
    pub rule: Option<Rule>,
    /// What a failure costs.
    pub severity: Severity,
    /// Reject code.
    pub reject: Option<String>,
    /// What outside means.
    pub outside: Outside,
    /// It does not bind a tube that a rack warmed, where the rack is why there is no value; else that gives hold.
    pub rack_skips: bool,
}

/// A bound of a limit.
#[derive(Debug, Clone, PartialEq)]
pub enum Bound {
    /// No bound.
    None,
    /// The same for every grade, SI.
    All(f64),
    /// (grade, SI), in the order of the file's grades; a grade not named has no bound.
    PerGrade(Vec<(String, f64)>),
}

impl Bound {
    /// The bound for one grade.
    pub fn of(&self, grade: &str) -> Option<f64> {
        match self {
            Self::None => None,
            Self::All(bound) => Some(*bound),
            Self::PerGrade(bounds) => bounds.iter().find(|(name, _)| name == grade).map(|(_, bound)| *bound),
        }
    }
}

/// What a failed limit costs; the worst first.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// No grade is left.
    Critical,
    /// The grades whose bound it breaks are lost.
    Major,
    /// The grade stays; the row is marked and counts in lots.
    Minor,
}

/// What a value outside gives.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outside {
    /// A failure, by severity.
    Fail,
    /// Hold: it points at the bench, not at the tube.
    Hold,
}

/// A measurand that a recipe fills, for checking that every limit can be met by a value.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fillable {
    /// Measurand's key, or `visual.<step>`.
    pub measurand: String,
    /// The words a look may give; empty for a number.
    pub choices: Vec<String>,
}

impl Limits {
    /// Reads a limits file.
    ///
    /// * `name`: name of the file, for the faults.
    ///
    /// Errors: every fault, in the order of the file.
    pub fn parse(name: &str, text: &str) -> Result<Self, Vec<Fault>> {
        parse::limits(name, text, None)
    }

    /// Reads a limits file beside its recipe: a limit that no step fills is a fault too.
    pub fn parse_for(name: &str, text: &str, fillable: &[Fillable]) -> Result<Self, Vec<Fault>> {
        parse::limits(name, text, Some(fillable))
    }
}
