//! Texts of a brisk recipe and its limits for the tubes of `bench`.
//! Must not be taken for a real type.
//! Main functions: [`twin`], [`plate`], [`quad`].

use crate::bench::{Texts, Tube};

pub const STATION: &str = include_str!("../../fixtures/demo/bench-1.toml");
pub const OVERDUE: &str = include_str!("../../fixtures/demo/bench-2.toml");

/// A brisk type: the tubes of `bench.rs` have τ = 20 s, so that a whole run takes some 300 happenings.
pub fn texts(spacing_mhz: f64, polarization: &str) -> Texts {
    let recipe = format!(
        r#"
revision = 1
nominal_spacing = "{spacing_mhz} MHz"
wavelength = "632.991 nm"
mode_floor = "2 %"
[[step]]
name = "strike"
do = "strike"
[[step]]
name = "warm"
do = "dwell"
early_every = "200 ms"
early_for = "20 s"
every = "250 ms"
longest = "3 min"
residual_walk = 1
horizon = "20 s"
cycles = 2
[[step]]
name = "sweep"
do = "sweep"
[[step]]
name = "comb"
do = "comb"
from = "warm"
[[step]]
name = "watching"
do = "watch"
from = "warm"
[[step]]
name = "rest"
do = "watch"
for = "5 s"
[[step]]
name = "power"
do = "power"
from = "warm"
[[step]]
name = "polarizer"
do = "polarizer"
polarization = "{polarization}"
[[step]]
name = "supply"
do = "supply"
dropout = true
[[step]]
name = "output_mirror"
do = "look"
ask = "Output mirror under the lamp"
choices = ["clean", "film", "burn", "crack"]
"#
    );
    let limits = format!(
        r#"
revision = 1
title = "Test type"
grades = ["prime", "alignment"]
rule = "guarded"
[[limit]]
measurand = "mode_spacing"
lower = "{} MHz"
upper = "{} MHz"
severity = "critical"
reject = "wrong-length"
[[limit]]
measurand = "warmup_ready"
upper = "2 min"
severity = "major"
reject = "slow"
[[limit]]
measurand = "visual.output_mirror"
wanted = "clean"
severity = "minor"
reject = "marked-mirror"
"#,
        0.98 * spacing_mhz,
        1.02 * spacing_mhz
    );
    Texts { recipe, limits, station: STATION.into() }
}

pub fn twin() -> (Texts, Tube) {
    (texts(999.3, "random"), Tube::twin())
}

pub fn plate() -> (Texts, Tube) {
    (texts(599.6, "linear"), Tube::plate())
}

pub fn quad() -> (Texts, Tube) {
    (texts(399.7, "random"), Tube::quad())
}
