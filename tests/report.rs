//! The report from outside: record.csv and its companions, and record.pdf, from made-up sheets.
//! Must not pin bytes that change with a version of a library.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[path = "report/paper.rs"]
mod paper;
#[path = "report/sheets.rs"]
mod sheets;
#[path = "report/tables.rs"]
mod tables;
