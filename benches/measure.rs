//! Times reading and measuring of 200 simulated captures of 20,000 samples, on one core.
//! Must not gate: times depend on the machine, whose name is printed with them. Only ratios may gate.
//! A script in another language that does the same work on the same files is to stand beside this one; it is not there yet.
//! Main function: `main`. Run with `cargo bench --bench measure`.

use std::fs;
use std::hint::black_box;
use std::process::ExitCode;
use std::time::{Duration, Instant};

use tubewright::capture;
use tubewright::instruments::{CaptureHead, simulated_csv};
use tubewright::phantom::{Scenario, Setting, World};
use tubewright::sweep::{Settings, measure};

/// Captures, and samples of each.
const N_CAPTURES: usize = 200;
const N_SAMPLES: usize = 20_000;
/// A four-mode tube of the demo scenario.
const SERIAL: &str = "DEMO-0003";
/// First capture after first light, and time from one to the next, ms: a few walk cycles, so that the comb is seen at
/// many phases.
const FIRST_MS: i64 = 600_000;
const EVERY_MS: i64 = 1_000;

fn main() -> ExitCode {
    let scenario = Scenario::demo();
    let (Some(world), Some(tube)) = (scenario.world(SERIAL, None), scenario.tube(SERIAL)) else {
        eprintln!("the demo scenario has no tube {SERIAL}");
        return ExitCode::FAILURE;
    };
    let exports = exports(&scenario, &world);
    let settings = Settings {
        free_spectral_range: world.bench().free_spectral_range,
        u_free_spectral_range: 0.003,
        nominal_spacing: None,
        mode_floor: 0.02,
        fsr_source_id: "bench".to_owned(),
    };
    let (mut reading, mut measuring) = (Vec::new(), Vec::new());
    let (mut n_spacing, mut n_refused, mut n_modes) = (0, 0, 0);
    for (name, bytes) in &exports {
        let begun = Instant::now();
        let Ok(read) = black_box(capture::read(name, bytes, None)) else {
            eprintln!("{name} cannot be read");
            return ExitCode::FAILURE;
        };
        let read_at = Instant::now();
        let found = black_box(measure(&read, &settings));
        measuring.push(read_at.elapsed());
        reading.push(read_at - begun);
        n_spacing += usize::from(found.mode_spacing.is_some());
        n_refused += usize::from(found.refused.is_some());
        n_modes += found.modes.len();
    }
    let bytes: usize = exports.iter().map(|(_, bytes)| bytes.len()).sum();
    println!("machine   {}", machine());
    println!("captures  {} of {N_SAMPLES} samples, {SERIAL} ({}), {} bytes", exports.len(), tube.tube_type, bytes);
    println!("measured  {n_spacing} with a spacing, {n_refused} refused, {n_modes} modes");
    report("read", &reading, bytes);
    report("measure", &measuring, bytes);
    let both: Vec<Duration> = reading.iter().zip(&measuring).map(|(a, b)| *a + *b).collect();
    report("both", &both, bytes);
    ExitCode::SUCCESS
}

/// The captures as a digitizer's exports: (name, bytes).
fn exports(scenario: &Scenario, world: &World) -> Vec<(String, Vec<u8>)> {
    let setting = Setting { lit: true, ..Setting::default() };
    let export = |k: usize| {
        let at_ms = FIRST_MS + k as i64 * EVERY_MS;
        let trace = world.capture(at_ms, N_SAMPLES, setting)?;
        let head = CaptureHead {
            captured_at: scenario.started_at,
            number: k as u64,
            polarizer: None,
            power: world.power(at_ms, 100, setting),
            run_current: world.run_current(at_ms, setting),
        };
        Some((format!("c{k:05}.csv"), simulated_csv(&trace, &head)))
    };
    (0..N_CAPTURES).filter_map(export).collect()
}

/// One line: median, ninth decile and mean for one capture, and bytes a second.
fn report(what: &str, times: &[Duration], bytes: usize) {
    let mut sorted = times.to_vec();
    sorted.sort();
    let share = |share: f64| sorted.get((share * sorted.len() as f64) as usize).copied().unwrap_or_default();
    let total: Duration = times.iter().sum();
    let ms = |time: Duration| time.as_secs_f64() * 1e3;
    let rate = bytes as f64 / total.as_secs_f64() / 1e6;
    let mean = ms(total) / times.len().max(1) as f64;
    let (median, ninth) = (ms(share(0.5)), ms(share(0.9)));
    println!(
        "{what:<9} {median:.3} ms a capture (median), {ninth:.3} (9 of 10 below), {mean:.3} (mean), {rate:.0} MB/s"
    );
}

/// Name of the machine, its processor and how many of them, as far as the system says.
fn machine() -> String {
    let name = fs::read_to_string("/proc/sys/kernel/hostname").unwrap_or_default();
    let processors = fs::read_to_string("/proc/cpuinfo").unwrap_or_default();
    let model =
        processors.lines().find_map(|line| line.strip_prefix("model name")?.split(": ").nth(1)).unwrap_or("unknown");
    let n = std::thread::available_parallelism().map_or(0, usize::from);
    let name = if name.trim().is_empty() { "unnamed" } else { name.trim() };
    format!("{name}: {model}, {n} processors, {}", std::env::consts::OS)
}
