//! How the comb walks and how the output rises while a tube warms.
//! Must not know frequencies of modes.
//! Main functions: [`cycles`], [`output_share`].

use std::f64::consts::TAU;

use super::{gain::output_ratio, tube::TubeTruth};

/// Steps, s, and their number, in which the greatest output is looked for: half an hour.
const GRID: f64 = 5.0;
const N_GRID: u32 = 360;

/// Walk since first light in mode spacings, growing as the tube does: frequencies fall by one spacing for each.
///
/// N∞(1 − e^(−t/τ)), a fast part of the same form, and the wandering of a draught as two sines of unequal periods that
/// begin at zero. Zero before first light.
pub fn cycles(tube: &TubeTruth, seconds: f64) -> f64 {
    let t = seconds.max(0.0);
    let slow = tube.walk_cycles * -(-t / tube.warmup_tau).exp_m1();
    let fast = tube.fast_cycles * -(-t / tube.fast_tau).exp_m1();
    let turn = TAU * t / tube.draught_period;
    // The second period is no whole fraction of the first, so that the wandering does not repeat within a run.
    let draught = tube.draught_cycles * (0.7 * turn.sin() + 0.3 * (turn * 2.618).sin());
    slow + fast + draught
}

/// Output at a time over the output when warm: from `power_at_start` to 1, times what air that is still to come leaves.
pub fn output_share(tube: &TubeTruth, seconds: f64) -> f64 {
    let risen = 1.0 - (1.0 - tube.power_at_start) * (-seconds.max(0.0) / tube.power_tau).exp();
    let condition = &tube.condition;
    let gain_now = tube.gain_ratio * (condition.gain_in_air(seconds) / condition.gain_in_all_air());
    // Below threshold there is no output to take a share of.
    if tube.gain_ratio > 1.0 { risen * output_ratio(tube.gain_ratio, gain_now) } else { risen }
}

/// Greatest output while the tube warms over the output when warm, at least 1.
pub fn highest_output_share(tube: &TubeTruth) -> f64 {
    (0..N_GRID).map(|k| output_share(tube, GRID * f64::from(k))).fold(1.0, f64::max)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn walks_by_the_stated_number_with_the_stated_time_constant() {
        let tube = TubeTruth { walk_cycles: 58.0, warmup_tau: 378.0, ..TubeTruth::default() };
        assert_eq!(cycles(&tube, -3.0), 0.0);
        assert!((cycles(&tube, 378.0) / 58.0 - (1.0 - (-1_f64).exp())).abs() < 1e-12);
        assert!((cycles(&tube, 1e5) - 58.0).abs() < 1e-9);
    }

    #[test]
    fn output_rises_from_its_share_at_switch_on() {
        let tube = TubeTruth { power_at_start: 0.8, ..TubeTruth::default() };
        assert!((output_share(&tube, 0.0) - 0.8).abs() < 1e-12);
        assert!(output_share(&tube, 7200.0) > 0.999_999);
    }
}
