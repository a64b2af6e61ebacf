//! QC test station for helium-neon laser tubes: warm up, sweep, measure, judge, record.
//! Must not hold code of its own: the map of the modules, and what each must not do, is in `DEVELOPERS.md`.

// L0
pub mod numerics;
pub mod quantity;
// L1
pub mod constants;
pub mod phrase;
pub mod uncertainty;
// L2
pub mod behaviour;
pub mod capture;
pub mod measurand;
pub mod record;
pub mod sweep;
pub mod tube;
// L3
pub mod limits;
pub mod phantom;
pub mod recipe;
// L4
pub mod gauge;
pub mod report;
pub mod run;
pub mod station;
// L5
pub mod disk;
pub mod driver;
pub mod instruments;
// L6
pub mod cli;
