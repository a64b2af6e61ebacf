//! Placeholder of the ground: see `DEVELOPERS.md`.
