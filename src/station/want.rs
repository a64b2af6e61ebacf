//! What a run asks of the world, one thing at a time.
//! Must not say how it is done.
//! Main type: [`Want`].

use crate::record::question::Question;

/// The one thing a run waits for. It depends on stored events alone, so asking again after a crash is harmless.
#[derive(Debug, Clone, PartialEq)]
pub enum Want {
    /// A capture.
    Capture(CaptureRequest),
    /// A fast trace of the total light.
    Light(LightRequest),
    /// A meter's reading.
    Reading(ReadingRequest),
    /// An answer. The driver stores `Asked` first; for a question with high voltage it must be on disk before the question is shown.
    Answer(Question),
    /// Nothing until this monotonic time, ms since the run was opened.
    WaitUntil {
        /// Step that waits.
        step: String,
        /// When.
        elapsed_ms: u64,
    },
    /// High voltage off.
    MakeSafe,
    /// Nothing more: the sheet can be frozen.
    Finished,
}

/// A capture as a run wants it.
#[derive(Debug, Clone, PartialEq)]
pub struct CaptureRequest {
    /// Step that wants it.
    pub step: String,
    /// Its number in the run, from 1.
    pub number: u64,
    /// Not before this monotonic time, ms since the run was opened.
    pub not_before_ms: u64,
    /// Samples wanted.
    pub samples: usize,
    /// A verdict leans on it singly: keep the bytes.
    pub keep: bool,
    /// Keep a thinned trace for the chart.
    pub trace: bool,
}

/// A fast trace of the total light, from a photodiode on the output beam, as a run wants it.
#[derive(Debug, Clone, PartialEq)]
pub struct LightRequest {
    /// Step that wants it.
    pub step: String,
    /// Its number in the run, from 1; traces and sweeps are counted together.
    pub number: u64,
    /// Light let through; else the beam is blocked.
    pub lit: bool,
    /// Samples a second, each the mean of the light over its interval, so that nothing folds down from above.
    pub sample_rate: f64,
    /// Samples wanted.
    pub samples: usize,
    /// Band in which noise is wanted, Hz.
    pub band: (f64, f64),
    /// Band in which a slow and a fast trace are compared, Hz.
    pub overlap: (f64, f64),
}

/// What a meter can be asked.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ReadingKind {
    /// Power meter, W, averaged over one second, before any correction.
    Power,
    /// Power meter with the beam blocked, W.
    DarkPower,
    /// Tube current, A.
    RunCurrent,
    /// Supply voltage, V.
    RunVoltage,
}

impl ReadingKind {
    /// The word in events.
    pub fn word(self) -> &'static str {
        match self {
            Self::Power => "power",
            Self::DarkPower => "dark_power",
            Self::RunCurrent => "run_current",
            Self::RunVoltage => "run_voltage",
        }
    }
}

/// A reading as a run wants it.
#[derive(Debug, Clone, PartialEq)]
pub struct ReadingRequest {
    /// Step that wants it.
    pub step: String,
    /// What to read.
    pub what: ReadingKind,
    /// Not before this monotonic time, ms since the run was opened.
    pub not_before_ms: u64,
}
