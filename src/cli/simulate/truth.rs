//! What is true of the simulated tube at each capture, as JSON beside the captures.
//! Must not touch the disk.
//! Main functions: [`shot`], [`truth_json`].

use serde::Serialize;

use super::SimulateArgs;
use crate::phantom::{Axis, Incident, Mode, World, discharge, getter, press_test};

/// What is true, as it is written beside the captures. SI.
#[derive(Serialize)]
struct TruthFile {
    note: &'static str,
    tube_type: String,
    seed: u64,
    mode_spacing_hz: f64,
    mirror_spacing_m: f64,
    gain_ratio: f64,
    lasing_span_hz: f64,
    power_w: f64,
    warmup_tau_s: f64,
    walk_cycles: f64,
    off_axis_ratio: f64,
    swap_detuning_hz: Option<f64>,
    draught_cycles: f64,
    line_ripple: f64,
    run_voltage_v: f64,
    run_current_a: f64,
    dropout_current_a: f64,
    start_delay_s: f64,
    tries: u64,
    helium_share: f64,
    air_share: f64,
    bore_over_design: f64,
    mirror_tilt_rad: f64,
    cathode_spent: f64,
    discharge: &'static str,
    getter: &'static str,
    press_test: Option<&'static str>,
    free_spectral_range_hz: f64,
    finesse: f64,
    noise: f64,
    hops: Vec<(f64, f64)>,
    swaps_s: Vec<f64>,
    captures: Vec<Shot>,
}

/// One capture, lost or not.
#[derive(Serialize)]
pub(super) struct Shot {
    capture: String,
    since_first_light_s: f64,
    pub lost: bool,
    /// Place of the comb in mode spacings, falling while the tube warms.
    comb_place: f64,
    modes: Vec<ShotMode>,
}

#[derive(Serialize)]
struct ShotMode {
    number: i64,
    detuning_hz: f64,
    power_w: f64,
    across: bool,
}

/// What is true at a capture.
pub(super) fn shot(world: &World, name: &str, at_ms: i64, lost: bool) -> Shot {
    let seconds = at_ms as f64 / 1e3;
    let mode = |mode: &Mode| ShotMode {
        number: mode.number,
        detuning_hz: mode.detuning,
        power_w: mode.power,
        across: mode.axis == Axis::Across,
    };
    Shot {
        capture: name.to_owned(),
        since_first_light_s: seconds,
        lost,
        comb_place: world.comb().place(world.tube(), seconds),
        modes: world.modes(at_ms).iter().map(mode).collect(),
    }
}

/// The whole file.
pub(super) fn truth_json(args: &SimulateArgs, world: &World, captures: Vec<Shot>) -> Vec<u8> {
    let (tube, bench, comb) = (world.tube(), world.bench(), world.comb());
    let condition = &tube.condition;
    let hops = tube
        .incidents
        .iter()
        .filter_map(|i| if let Incident::Hop { at, size } = i { Some((*at, *size)) } else { None });
    let swaps = tube.incidents.iter().filter_map(|i| if let Incident::Swap { at } = i { Some(*at) } else { None });
    let truth = TruthFile {
        note: "Simulated bench: not a measurement of a tube",
        tube_type: args.tube_type.clone(),
        seed: args.seed,
        mode_spacing_hz: comb.mode_spacing(),
        mirror_spacing_m: tube.mirror_spacing,
        gain_ratio: tube.gain_ratio,
        lasing_span_hz: 2.0 * comb.line().half_range(),
        power_w: tube.power,
        warmup_tau_s: tube.warmup_tau,
        walk_cycles: tube.walk_cycles,
        off_axis_ratio: tube.off_axis_share,
        swap_detuning_hz: tube.swap_detuning,
        draught_cycles: tube.draught_cycles,
        line_ripple: tube.line_ripple,
        run_voltage_v: tube.run_voltage,
        run_current_a: tube.run_current,
        dropout_current_a: tube.dropout_current,
        start_delay_s: tube.start_delay,
        tries: tube.tries,
        helium_share: condition.helium,
        air_share: condition.air,
        bore_over_design: condition.bore,
        mirror_tilt_rad: condition.mirror_tilt,
        cathode_spent: condition.cathode_spent,
        discharge: discharge(tube),
        getter: getter(tube),
        press_test: press_test(tube),
        free_spectral_range_hz: bench.free_spectral_range,
        finesse: bench.finesse,
        noise: bench.noise,
        hops: hops.collect(),
        swaps_s: swaps.collect(),
        captures,
    };
    // Numbers, texts and lists only, every number finite: this form cannot fail.
    let mut bytes = serde_json::to_vec_pretty(&truth).unwrap_or_default();
    bytes.push(b'\n');
    bytes
}
