//! Why bytes are no capture.
//! Must not hold anything that a capture can carry as a remark.
//! Main type: [`CaptureError`].

/// Why bytes cannot be read as a capture. Reads after "failed to read …: ".
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum CaptureError {
    /// The error is in one file of several.
    #[error("{file}: {error}")]
    In {
        /// Name of the file as given.
        file: String,
        /// What is wrong there.
        error: Box<CaptureError>,
    },
    /// No bytes, or blanks alone.
    #[error("the file is empty; expected a digitizer export with one sample a line")]
    Empty,
    /// Text coded two bytes a character.
    #[error("the text is UTF-16, two bytes a character; expected ASCII or UTF-8: export it again as plain CSV")]
    Utf16,
    /// No line holds numbers, or no three successive lines do.
    #[error(
        "no samples found in {lines} lines; expected lines of numbers separated by comma, semicolon, tab or blanks"
    )]
    NoNumbers {
        /// Lines looked at.
        lines: usize,
    },
    /// Too short to hold a sweep.
    #[error("only {found} samples; expected at least {}", super::FEWEST_SAMPLES)]
    TooFew {
        /// Samples found after blank ends were dropped.
        found: usize,
    },
    /// A column was named that is not there.
    #[error("column {column} was named for {role}, but there are {there} columns")]
    NoSuchColumn {
        /// From 1.
        column: usize,
        /// What it was to be.
        role: &'static str,
        /// How many cells a line of samples has.
        there: usize,
    },
    /// A column was named that holds no numbers.
    #[error("column {column} was named for {role}, but it holds no numbers; columns with numbers: {numeric}")]
    NotNumeric {
        /// From 1.
        column: usize,
        /// What it was to be.
        role: &'static str,
        /// The columns that would do, as text.
        numeric: String,
    },
    /// A file was named in the columns that is not among the files given.
    #[error("the columns name a file `{wanted}` for {role}, but the files are {there}")]
    NoSuchFile {
        /// As written in the columns.
        wanted: String,
        /// What it was to be.
        role: &'static str,
        /// The names given.
        there: String,
    },
    /// There is a time and nothing else.
    #[error("no photodiode: the only column with numbers is the time; expected at least one column of volts")]
    NoPhotodiode,
    /// A cell between samples has no number.
    #[error("line {line}, column {column}: `{text}` between samples; expected a finite number")]
    NotANumber {
        /// From 1.
        line: usize,
        /// From 1.
        column: usize,
        /// What stands there, cut short.
        text: String,
    },
    /// Channels in files of their own have unequal lengths.
    #[error("{first} has {first_samples} samples, {second} has {second_samples}; expected equal lengths")]
    UnequalLengths {
        /// Name of the first file.
        first: String,
        /// Its rows.
        first_samples: usize,
        /// Name of the other file.
        second: String,
        /// Its rows.
        second_samples: usize,
    },
    /// Channels in files of their own were not taken together.
    #[error(
        "{second} was not recorded together with the first file: its time starts at {second_start} s in steps of \
         {second_step} s, expected {start} s in steps of {step} s"
    )]
    UnequalTimes {
        /// Name of the other file.
        second: String,
        /// Start of the first, seconds.
        start: f64,
        /// Step of the first, seconds.
        step: f64,
        /// Start of the other, seconds.
        second_start: f64,
        /// Step of the other, seconds.
        second_step: f64,
    },
    /// Time falls.
    #[error("time runs backward, by {step} s a sample; expected rising time stamps")]
    TimeBackward {
        /// Seconds, negative.
        step: f64,
    },
    /// Time does not change.
    #[error("every time stamp is {stamp} s; expected rising time stamps")]
    TimeStands {
        /// Seconds.
        stamp: f64,
    },
    /// Samples are not evenly spaced.
    #[error(
        "line {line}: {count} time stamps are more than {allowed} s off an even step of {step} s; expected evenly \
         spaced samples"
    )]
    TimeUneven {
        /// Line of the first, from 1.
        line: usize,
        /// How many.
        count: usize,
        /// Seconds.
        allowed: f64,
        /// Seconds.
        step: f64,
    },
    /// The text that names columns cannot be read.
    #[error("columns `{text}`: {fault}; expected such as `time=1,ramp=2,photodiode=3,crossed=4` or `ramp=FILE:2`")]
    Columns {
        /// As given.
        text: String,
        /// What is wrong with it.
        fault: String,
    },
    /// No files at all.
    #[error("no files given; expected at least one")]
    NoFiles,
}

impl CaptureError {
    /// The same error, with the name of the file it is in.
    pub(super) fn within(self, file: &str) -> Self {
        Self::In { file: file.to_owned(), error: Box::new(self) }
    }
}
