//! Placeholder of the ground: see `DEVELOPERS.md`.

pub mod check;
