//! A sheet turned into what leaves the house: record.csv, budget.csv with their metadata, and record.pdf.
//! Must not open a file, read a clock or decide anything: every verdict comes in with the sheet.
//! Main functions: [`record_csv`], [`budget_csv`], [`csv_metadata`], [`value_text`].

mod csv;
mod escape;
mod metadata;
mod text;

pub use self::csv::{BUDGET_COLUMNS, RECORD_COLUMNS, budget_csv, record_csv};
pub use self::escape::{neutralise, restore};
pub use self::metadata::csv_metadata;
pub use self::text::{ValueText, bound_text, probability_text, row_line, value_text};

/// Said in the head, the CSV and the PDF title of every record of a simulated bench.
pub const SIMULATED: &str = "Simulated bench: not a measurement of a tube";
