//! The sheet: the very page that will be signed, as plain data. Values are in SI; who shows them converts.
//! Must not decide anything: every verdict, bound and sentence is copied in.
//! Main types: [`Sheet`], [`Row`].

use chrono::{DateTime, FixedOffset, NaiveDate};

use super::event::Identity;
use super::finding::Trace;
use crate::phrase::{Language, Saying};
use crate::uncertainty::BudgetLine;

/// A sheet, at any moment of its run.
#[derive(Debug, Clone, PartialEq)]
pub struct Sheet {
    /// Who and what.
    pub identity: Identity,
    /// Title of the type from the limits file.
    pub title: Saying,
    /// Station's name.
    pub station: String,
    /// When the run was opened.
    pub started_at: Option<DateTime<FixedOffset>>,
    /// When it finished or was stopped; none while it is open.
    pub ended_at: Option<DateTime<FixedOffset>>,
    /// Length of the dwell, s, once it ended.
    pub dwell: Option<f64>,
    /// Recipe.
    pub recipe: Revision,
    /// Limits.
    pub limits: Revision,
    /// Station file; its revision is 0.
    pub station_file: Revision,
    /// Decision rule of the limits file, in words.
    pub rule: String,
    /// Instruments with their certificates.
    pub instruments: Vec<Instrument>,
    /// Tube current at which the optical rows were measured, A, where it is known.
    pub run_current: Option<f64>,
    /// The verdict.
    pub verdict: TubeVerdict,
    /// The rows, in the order of the catalogue, looks last.
    pub rows: Vec<Row>,
    /// Chart of one sweep.
    pub sweep_chart: Option<SweepChart>,
    /// Chart of peak height against walked detuning.
    pub gain_chart: Option<GainChart>,
    /// Chart of the walk.
    pub walk_chart: Option<WalkChart>,
    /// Things a reader must know that belong to no row.
    pub remarks: Vec<Saying>,
    /// The line on laser class and cautions.
    pub caution: Saying,
    /// Who measured: initials, when, meaning.
    pub measured_by: Option<MeasuredBy>,
}

impl Sheet {
    /// The language in which page and terminal show it; files for programs are English.
    pub fn language(&self) -> Language {
        self.identity.language()
    }
}

/// Revision and hash of a file frozen into the plan.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Revision {
    /// `revision =` of the file.
    pub revision: u64,
    /// SHA-256 of its text, hexadecimal.
    pub sha256: String,
}

/// One instrument of the bench.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Instrument {
    /// `interferometer`, `power meter`, `supply`.
    pub role: Saying,
    /// What is said of it: "6.4 GHz ± 0.3 %".
    pub what: Saying,
    /// Certificate number, or empty where there is none.
    pub certificate: String,
    /// Last day on which the certificate holds.
    pub due: Option<NaiveDate>,
    /// It no longer held when the run started.
    pub overdue: bool,
}

/// How a tube ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outcome {
    /// Not finished.
    Open,
    /// Accepted, with a grade.
    Pass,
    /// Not accepted.
    Fail,
    /// No verdict on the tube.
    Hold,
    /// Stopped by a person.
    Stopped,
}

impl Outcome {
    /// The word in `record.csv`.
    pub fn word(self) -> &'static str {
        match self {
            Self::Open => "open",
            Self::Pass => "pass",
            Self::Fail => "fail",
            Self::Hold => "hold",
            Self::Stopped => "stopped",
        }
    }
}

/// The verdict on the tube.
#[derive(Debug, Clone, PartialEq)]
pub struct TubeVerdict {
    /// How it ends.
    pub outcome: Outcome,
    /// Best grade left, for a pass.
    pub grade: Option<String>,
    /// First reject code, for a fail.
    pub reject_code: Option<String>,
    /// Filled into the head: "pass, grade prime." or "fail, dim."
    pub sentence: Saying,
    /// The reason beneath it, one or two sentences; may be empty.
    pub reason: Saying,
}

/// Verdict of a row for one grade.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RowVerdict {
    /// Inside by the rule.
    Pass,
    /// Outside by the rule.
    Fail,
    /// No verdict: no value, or a limit that says hold.
    Hold,
    /// No limit.
    NotJudged,
}

impl RowVerdict {
    /// The word in `record.csv`.
    pub fn word(self) -> &'static str {
        match self {
            Self::Pass => "pass",
            Self::Fail => "fail",
            Self::Hold => "hold",
            Self::NotJudged => "not judged",
        }
    }
}

/// Where a value lies against its bounds and its expanded uncertainty.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Zone {
    /// Inside by at least U.
    InsideByU,
    /// Inside, not by U.
    Inside,
    /// Outside, not by U.
    Outside,
    /// Outside by more than U.
    OutsideByU,
}

/// What a row holds.
#[derive(Debug, Clone, PartialEq)]
pub enum Value {
    /// A number in SI, with standard and expanded uncertainty.
    Number {
        /// Value.
        value: f64,
        /// Standard uncertainty.
        u: f64,
        /// Expanded uncertainty for 95.45 %.
        expanded: f64,
        /// Coverage factor.
        k: f64,
        /// Effective degrees of freedom; may be infinite.
        dof: f64,
    },
    /// A whole number, with the interval it may lie in.
    Count {
        /// As counted.
        value: u64,
        /// Lowest it may be.
        low: u64,
        /// Highest it may be.
        high: u64,
    },
    /// A lower bound (extinction under the noise), SI.
    AtLeast(f64),
    /// A word from a look.
    Word(String),
    /// No value, and why.
    Absent(Saying),
}

/// One row.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Name of the step that fills it.
    pub step: String,
    /// Measurand's key, or `visual.<step>`.
    pub measurand: String,
    /// Name on the sheet.
    pub label: Saying,
    /// What it holds.
    pub value: Value,
    /// Budget, in SI.
    pub budget: Vec<BudgetLine>,
    /// One entry for each grade tried, best first; one entry with an empty grade where all grades share the bounds; none without a limit.
    pub judged: Vec<Judged>,
    /// The row decides the verdict: it is opened by `note`.
    pub deciding: bool,
    /// One line of words: "prime lost in doubt; alignment, 0.30 mW, holds".
    pub note: Saying,
}

/// A row judged for one grade.
#[derive(Debug, Clone, PartialEq)]
pub struct Judged {
    /// Grade tried, or empty for all.
    pub grade: String,
    /// Lower bound, SI.
    pub lower: Option<f64>,
    /// Upper bound, SI.
    pub upper: Option<f64>,
    /// Words instead of bounds.
    pub wanted: Vec<String>,
    /// Rule in words: `guarded`.
    pub rule: String,
    /// Conformance probability; none for counts, words and absent values.
    pub conformance_probability: Option<f64>,
    /// Zone, for numbers.
    pub zone: Option<Zone>,
    /// Verdict.
    pub verdict: RowVerdict,
    /// Reject code, for a fail.
    pub reject_code: Option<String>,
}

/// A sweep with its fitted modes, on a hertz axis.
#[derive(Debug, Clone, PartialEq)]
pub struct SweepChart {
    /// When it was taken.
    pub taken_at: Option<DateTime<FixedOffset>>,
    /// Thinned trace.
    pub trace: Trace,
    /// Fitted modes: height of the strongest is not normalised; V.
    pub modes: Vec<ChartMode>,
    /// Free spectral range, Hz.
    pub free_spectral_range: f64,
}

/// One fitted mode of a sweep chart.
#[derive(Debug, Clone, PartialEq)]
pub struct ChartMode {
    /// Letter on the chart.
    pub name: String,
    /// Offset from the first mode, Hz.
    pub offset: f64,
    /// Fitted height, V.
    pub peak_height: f64,
    /// Fitted FWHM, Hz.
    pub fwhm: f64,
    /// It is off the comb.
    pub off_axis: bool,
}

/// Peak height against walked detuning, as points.
#[derive(Debug, Clone, PartialEq)]
pub struct GainChart {
    /// Walk cycles the points come from.
    pub cycles: f64,
    /// (detuning from the middle of the line Hz, height of the greatest = 1, u of that height).
    pub points: Vec<(f64, f64, f64)>,
}

/// The walk with its prediction.
#[derive(Debug, Clone, PartialEq)]
pub struct WalkChart {
    /// (seconds since first light, mode spacings walked), measured.
    pub points: Vec<(f64, f64)>,
    /// The same, fitted and predicted.
    pub prediction: Vec<(f64, f64)>,
    /// Time constant and its expanded uncertainty, s.
    pub tau: Option<(f64, f64)>,
    /// Ready at, with its expanded uncertainty, s since first light.
    pub ready: Option<(f64, f64)>,
    /// The dwell ended here, s since first light.
    pub dwell_end: Option<f64>,
    /// Hops: (s since first light, Hz).
    pub hops: Vec<(f64, f64)>,
    /// Swaps: s since first light.
    pub swaps: Vec<f64>,
}

/// The line at the foot.
#[derive(Debug, Clone, PartialEq)]
pub struct MeasuredBy {
    /// Initials.
    pub initials: String,
    /// When the last row was filled.
    pub at: DateTime<FixedOffset>,
    /// `measured`.
    pub meaning: Saying,
}
