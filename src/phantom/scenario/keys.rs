//! The keys of a scenario's tubes and benches: word, dimension, bounds, place in the truth.
//! Must not read text.
//! Main tables: [`TUBE`], [`BENCH`].

use super::{
    super::{bench::BenchTruth, tube::TubeTruth},
    reader::Key,
};
use crate::quantity::Dimension::{
    self, Angle, Current, Frequency, FrequencyRate, Length, Power, Ratio, Resistance, Temperature, Time, Voltage,
};

const fn key<T>(word: &'static str, dimension: Dimension, bounds: (f64, f64), set: fn(&mut T, f64)) -> Key<T> {
    Key { word, dimension, bounds, set }
}

/// Angles of any turn.
const TURN: (f64, f64) = (-7.0, 7.0);

/// Keys of a type and of a tube.
pub(super) const TUBE: &[Key<TubeTruth>] = &[
    // 20 mm to 2 m: at either end the comb has no mode, or hundreds.
    key("mirror_spacing", Length, (0.02, 2.0), |t, v| t.mirror_spacing = v),
    key("gain_ratio", Ratio, (0.0, 20.0), |t, v| t.gain_ratio = v),
    key("gas_temperature", Temperature, (200.0, 1000.0), |t, v| t.gas_temperature = v),
    key("homogeneous_half_width", Frequency, (1e6, 1e9), |t, v| t.homogeneous_half_width = v),
    key("power", Power, (0.0, 1.0), |t, v| t.power = v),
    key("power_at_start", Ratio, (0.0, 2.0), |t, v| t.power_at_start = v),
    key("power_tau", Time, (1.0, 1e5), |t, v| t.power_tau = v),
    key("walk_cycles", Ratio, (-1e4, 1e4), |t, v| t.walk_cycles = v),
    key("warmup_tau", Time, (1.0, 1e5), |t, v| t.warmup_tau = v),
    key("fast_cycles", Ratio, (-1e3, 1e3), |t, v| t.fast_cycles = v),
    key("fast_tau", Time, (0.1, 1e5), |t, v| t.fast_tau = v),
    key("draught_cycles", Ratio, (0.0, 1e3), |t, v| t.draught_cycles = v),
    key("draught_period", Time, (1.0, 1e5), |t, v| t.draught_period = v),
    key("comb_phase", Ratio, (0.0, 1.0), |t, v| t.comb_phase = Some(v)),
    key("azimuth", Angle, TURN, |t, v| t.azimuth = v),
    key("orthogonality", Angle, TURN, |t, v| t.orthogonality = v),
    key("extinction", Ratio, (1.0, 1e9), |t, v| t.extinction = v),
    key("swap_detuning", Frequency, (-2e9, 2e9), |t, v| t.swap_detuning = Some(v)),
    key("off_axis_share", Ratio, (0.0, 1.0), |t, v| t.off_axis_share = v),
    key("off_axis_offset", Frequency, (-1e10, 1e10), |t, v| t.off_axis_offset = v),
    key("run_current", Current, (1e-4, 0.1), |t, v| t.run_current = v),
    key("run_voltage", Voltage, (100.0, 2e4), |t, v| t.run_voltage = v),
    key("voltage_exponent", Ratio, (0.0, 1.0), |t, v| t.voltage_exponent = v),
    key("dropout_current", Current, (1e-5, 0.1), |t, v| t.dropout_current = v),
    key("start_delay", Time, (0.0, 600.0), |t, v| t.start_delay = v),
    key("line_ripple", Ratio, (0.0, 0.5), |t, v| t.line_ripple = v),
    key("discharge_noise", Ratio, (0.0, 0.5), |t, v| t.discharge_noise = v),
    key("tone_level", Ratio, (0.0, 0.5), |t, v| t.tone_level = v),
    key("tone_frequency", Frequency, (1.0, 1e8), |t, v| t.tone_frequency = v),
    key("beat_level", Ratio, (0.0, 0.5), |t, v| t.beat_level = v),
];

/// Keys of a bench.
pub(super) const BENCH: &[Key<BenchTruth>] = &[
    key("fsr", Frequency, (1e8, 1e12), |b, v| b.free_spectral_range = v),
    key("finesse", Ratio, (2.0, 1e5), |b, v| b.finesse = v),
    key("orders", Ratio, (0.1, 50.0), |b, v| b.orders = v),
    key("ramp_period", Time, (1e-4, 100.0), |b, v| b.ramp_period = v),
    key("rising_share", Ratio, (0.01, 0.99), |b, v| b.rising_share = v),
    key("ramp_low", Voltage, (-1e3, 1e3), |b, v| b.ramp_low = v),
    key("ramp_high", Voltage, (-1e3, 1e3), |b, v| b.ramp_high = v),
    key("ramp_curvature", Ratio, (-0.5, 2.0), |b, v| b.ramp_curvature = v),
    key("ramp_loop", Ratio, (0.0, 1.0), |b, v| b.ramp_loop = v),
    key("detector_time", Time, (0.0, 1.0), |b, v| b.detector_time = v),
    key("noise", Ratio, (0.0, 1.0), |b, v| b.noise = v),
    key("dark_level", Voltage, (-0.1, 1.0), |b, v| b.dark_level = v),
    key("analyser", Angle, TURN, |b, v| b.analyser = Some(v)),
    key("polarizer_extinction", Ratio, (1.0, 1e9), |b, v| b.polarizer_extinction = v),
    key("drift", FrequencyRate, (-1e9, 1e9), |b, v| b.drift = v),
    key("meter_factor", Ratio, (0.1, 10.0), |b, v| b.meter_factor = v),
    key("meter_noise", Ratio, (0.0, 1.0), |b, v| b.meter_noise = v),
    key("meter_dark", Power, (-1.0, 1.0), |b, v| b.meter_dark = v),
    key("ballast", Resistance, (0.0, 1e7), |b, v| b.ballast = v),
    key("mains", Frequency, (10.0, 1e3), |b, v| b.mains = v),
    key("supply_ripple", Ratio, (0.0, 0.5), |b, v| b.supply_ripple = v),
    key("light_noise", Ratio, (0.0, 0.5), |b, v| b.light_noise = v),
    key("light_bandwidth", Frequency, (1e3, 1e9), |b, v| b.light_bandwidth = v),
];
