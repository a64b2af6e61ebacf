//! Bytes of a digitizer export → channels with a checked time base.
//! Must not open a file.
//! Main types: [`Capture`], [`Columns`]; main functions: [`read`], [`read_many`].

mod assemble;
mod columns;
mod decimal;
mod error;
mod head;
mod keys;
mod layout;
mod names;
mod remark;
mod roles;
mod table;
mod text;
mod timebase;
mod units;
mod write;

pub use columns::{Columns, Place};
pub use error::CaptureError;
pub use head::Head;
pub use names::{is_channel_name, natural_order, pair_names};
pub use remark::CaptureRemark;
pub use timebase::TimeBase;
pub use write::write_csv;

/// Fewer samples than this cannot hold two orders of resolved modes.
pub const FEWEST_SAMPLES: usize = 100;

/// One digitizer record: channels of equal length on an even time base.
#[derive(Debug, Clone, PartialEq)]
pub struct Capture {
    /// When the samples were taken, from the trigger.
    pub time: TimeBase,
    /// Volts of the ramp; `None` where no channel shows it.
    pub ramp: Option<Vec<f64>>,
    /// Volts of the photodiode.
    pub photodiode: Vec<f64>,
    /// Volts of the second photodiode, behind the crossed polarizer.
    pub crossed: Option<Vec<f64>>,
    /// What the capture says about the bench.
    pub head: Head,
    /// What a reader should know about how it was read.
    pub remarks: Vec<CaptureRemark>,
}

/// Reads one export that holds all its channels.
///
/// * `name`: the file's name, for messages and for `FILE:N` in `columns`.
/// * `bytes`: its whole content, in any layout: comma, semicolon, tab or blanks; any line end; key cells before or beside
///   the samples; start and increment instead of time stamps; codes with their scale; two records side by side.
/// * `columns`: which column is which; `None`: by the columns' names, else by the channels' shapes.
///
/// Returns seconds and volts; every sample is finite. Lines at the ends with a blank channel are dropped with a remark.
///
/// Errors: see [`CaptureError`].
pub fn read(name: &str, bytes: &[u8], columns: Option<&Columns>) -> Result<Capture, CaptureError> {
    assemble::assemble(&[(name, bytes)], columns)
}

/// Reads a capture whose channels are in files of their own, as (name, bytes). See [`read`].
///
/// Errors: as for [`read`], with the file's name; files of unequal length or of other times.
pub fn read_many(files: &[(&str, &[u8])], columns: Option<&Columns>) -> Result<Capture, CaptureError> {
    assemble::assemble(files, columns)
}
