//! The command line: one file per command; ending → exit status.
//! Must not decide anything.

pub mod check;
pub mod simulate;
