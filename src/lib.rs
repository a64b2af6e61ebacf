//! QC test station for helium-neon laser tubes: warm up, sweep, measure, judge, record.
//!
//! The map of the modules, and what each must not do, is in `DEVELOPERS.md`.

pub mod capture;
pub mod numerics;
pub mod quantity;
