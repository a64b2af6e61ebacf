//! QC test station for helium-neon laser tubes: warm up, sweep, measure, judge, record.
//!
//! The map of the modules, and what each must not do, is in `DEVELOPERS.md`.

// L0
pub mod numerics;
pub mod quantity;
// L1
pub mod constants;
pub mod uncertainty;
// L2
pub mod capture;
pub mod measurand;
pub mod record;
// L4
pub mod station;
