//! The whole path: what is true of a tube → bytes of captures → engine → run → behaviour → sheet.
//! Must not look inside any part: only truths in, only the sheet out.

#![allow(clippy::unwrap_used, clippy::panic, missing_docs)]

mod bench;
mod causes;
mod envelope;
mod faults;
mod noise;
mod rack;
mod warmup;
mod watch;
