//! Captures of every layout: made-up ones in `fixtures/layouts/`, real ones beside the project, and bytes at random.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[path = "capture/faults.rs"]
mod faults;
#[path = "capture/layouts.rs"]
mod layouts;
#[path = "capture/real.rs"]
mod real;
