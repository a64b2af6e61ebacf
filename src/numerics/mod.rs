//! Plain maths on `f64` slices: least squares, line shapes, peaks, smoothing, spectra, summaries.
//! Must not know lasers, units or files; no input may panic.
//! Main entries: [`least_squares::fit`], [`linear::weighted`], [`peaks::find`].

pub mod cusum;
pub mod distributions;
pub mod least_squares;
pub mod linear;
pub mod peaks;
pub mod shapes;
pub mod smoothing;
pub mod spectra;
pub mod summary;
pub mod tones;
mod triangle;
