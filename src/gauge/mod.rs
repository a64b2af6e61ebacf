//! Statistics of the bench itself: the chart of its reference tubes.
//! Must not know a station file, a run or a clock.
//! Main function: [`reference::chart`].

pub mod reference;
