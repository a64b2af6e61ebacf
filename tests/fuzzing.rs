//! Random input with a seed, for a time: bytes to the reader, numbers to `measure`. No panic, promises kept, nothing slow.
//! Must not need a nightly compiler: `fuzz/` does, and sees which lines were reached. Two seconds each unless
//! `TUBEWRIGHT_FUZZ_SECONDS` says more.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::fs;
use std::path::Path;
use std::time::{Duration, Instant};

use rand_chacha::ChaCha8Rng;
use rand_core::{RngCore, SeedableRng};
use tubewright::capture::{Capture, Columns, TimeBase, read, read_many};
use tubewright::sweep::{Settings, measure};

/// A hang, on an idle machine; where others work beside it a case may take ten times as long.
const HANG: Duration = Duration::from_secs(1);
const BUSY: u32 = 10;

fn lasts() -> Duration {
    let seconds = std::env::var("TUBEWRIGHT_FUZZ_SECONDS").ok().and_then(|s| s.parse().ok()).unwrap_or(2);
    Duration::from_secs(seconds)
}

fn seed() -> u64 {
    std::env::var("TUBEWRIGHT_FUZZ_SEED").ok().and_then(|s| s.parse().ok()).unwrap_or(20_261_201)
}

/// Runs cases of rising seed until the time is over; prints how many, and the slowest.
fn run(what: &str, case: impl Fn(&mut ChaCha8Rng)) {
    let (begun, mut n, mut slowest) = (Instant::now(), 0_u64, (Duration::ZERO, 0));
    while begun.elapsed() < lasts() {
        let seed = seed() + n;
        let one = Instant::now();
        case(&mut ChaCha8Rng::seed_from_u64(seed));
        let took = one.elapsed();
        slowest = slowest.max((took, seed));
        assert!(took < BUSY * HANG, "{what}: seed {seed} took {took:?}");
        n += 1;
    }
    println!(
        "{what}: {n} cases in {:.0} s, the slowest {:?} (seed {})",
        begun.elapsed().as_secs_f64(),
        slowest.0,
        slowest.1
    );
}

fn pick(rng: &mut ChaCha8Rng, n: usize) -> usize {
    rng.next_u32() as usize % n.max(1)
}

fn layouts() -> Vec<Vec<u8>> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/layouts");
    let mut paths: Vec<_> = fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    paths.sort();
    paths
        .iter()
        .filter(|path| path.extension().is_some_and(|e| e != "toml"))
        .map(|path| fs::read(path).unwrap())
        .collect()
}

/// Cuts, doubles, overwrites and mixes exports; now and then only noise.
fn broken(rng: &mut ChaCha8Rng, files: &[Vec<u8>]) -> Vec<u8> {
    const PIECES: [&[u8]; 18] = [
        b",",
        b";",
        b"\n",
        b"\r",
        b"\t",
        b" ",
        b"e",
        b"-",
        b".",
        b"nan",
        b"1e308",
        b"-1e-320",
        b"\"",
        b"#",
        b"\xFF",
        b"0,0,0\n",
        b"YIncrement,1e-3\n",
        b"# capture = 1\n",
    ];
    let mut bytes = files[pick(rng, files.len())].clone();
    for _ in 0..1 + pick(rng, 12) {
        let at = pick(rng, bytes.len() + 1);
        let end = bytes.len().min(at + pick(rng, 400));
        match pick(rng, 6) {
            0 => drop(bytes.splice(at..at, PIECES[pick(rng, PIECES.len())].iter().copied())),
            1 => drop(bytes.drain(at..end)),
            2 => bytes.truncate(at),
            3 => {
                let part = bytes[at..end].to_vec();
                (0..1 + pick(rng, 8)).for_each(|_| drop(bytes.splice(at..at, part.iter().copied())));
            }
            4 => {
                let other = &files[pick(rng, files.len())];
                let from = pick(rng, other.len());
                bytes.splice(at..end, other[from..other.len().min(from + 300)].iter().copied());
            }
            _ => rng.fill_bytes(&mut bytes[at..end.min(at + 3)]),
        }
    }
    bytes
}

fn keeps_promises(capture: &Capture) {
    for channel in [Some(&capture.photodiode), capture.ramp.as_ref(), capture.crossed.as_ref()].into_iter().flatten() {
        assert_eq!(channel.len(), capture.time.n);
        assert!(channel.iter().all(|v| v.is_finite()));
    }
    assert!(capture.time.step > 0.0 && capture.time.at(capture.time.n).is_finite());
}

#[test]
fn the_reader_survives_broken_exports() {
    let files = layouts();
    let columns: Columns = "time=1,ramp=2,photodiode=3".parse().unwrap();
    run("reader", |rng| {
        let (bytes, second) = (broken(rng, &files), broken(rng, &files));
        for result in [
            read("a.csv", &bytes, None),
            read("a.csv", &bytes, Some(&columns)),
            read_many(&[("aCH1.csv", &bytes), ("aCH2.csv", &second)], None),
        ] {
            match result {
                Ok(capture) => keeps_promises(&capture),
                Err(error) => assert!(!error.to_string().is_empty()),
            }
        }
    });
}

/// Peaks in some order or none, noise from none to all, steps, spikes, huge and tiny units.
fn signal(rng: &mut ChaCha8Rng, n: usize) -> Vec<f64> {
    let mut unit = || f64::from(rng.next_u32()) / f64::from(u32::MAX);
    let period = n as f64 * (0.05 + unit());
    let width = n as f64 * 10_f64.powf(-4.0 + 3.5 * unit());
    let peaks: Vec<(f64, f64)> =
        (0..(unit() * 9.0) as usize).map(|_| (unit() * period, unit().powi(3) - 0.1)).collect();
    let (noise, bend) = (10_f64.powf(-6.0 + 6.0 * unit()), unit() - 0.5);
    let scale = 10_f64.powf(if unit() < 0.8 { 0.0 } else { 40.0 * unit() - 20.0 });
    let step = if unit() < 0.3 { unit() * 0.2 } else { 0.0 };
    let sign = if unit() < 0.2 { -1.0 } else { 1.0 };
    (0..n)
        .map(|i| {
            let x = i as f64 * (1.0 + bend * i as f64 / n as f64);
            let line = |(at, height): &(f64, f64)| {
                let d = (x - at).rem_euclid(period);
                let q = 2.0 * d.min(period - d) / width;
                height / (1.0 + q * q)
            };
            let v = peaks.iter().map(line).sum::<f64>() + noise * (unit() - 0.5);
            let v = if step > 0.0 { (v / step).round() * step } else { v };
            sign * scale * if unit() < 1e-4 { v * 1e3 } else { v }
        })
        .collect()
}

fn ramp(rng: &mut ChaCha8Rng, n: usize) -> Option<Vec<f64>> {
    let turns = (1 + pick(rng, 6)) as f64 * f64::from(1 + rng.next_u32() % 100) / 100.0;
    let at = move |i: usize| (i as f64 / n as f64 * turns).fract();
    match pick(rng, 6) {
        0 => None,
        1 => Some((0..n).map(at).collect()),
        2 => Some((0..n).map(|i| (at(i) - 0.5).abs()).collect()),
        3 => Some((0..n).map(|i| f64::from(at(i) > 0.5)).collect()),
        4 => Some((0..n).map(|i| (at(i) * 8.0).floor()).collect()),
        _ => Some(signal(rng, n)),
    }
}

#[test]
fn measure_survives_any_numbers() {
    run("measure", |rng| {
        let n = [100, 101, 333, 1_000, 2_500, 8_000][pick(rng, 6)];
        let photodiode = signal(rng, n);
        let crossed = (pick(rng, 3) == 0).then(|| signal(rng, n));
        let time = TimeBase { start: 0.0, step: 1e-6, n };
        let ramp = ramp(rng, n);
        let capture = Capture { time, ramp, photodiode, crossed, head: Default::default(), remarks: Vec::new() };
        let settings = Settings {
            free_spectral_range: [1.5e9, 6.4e9, 10e9, 1e-3, 1e300][pick(rng, 5)],
            u_free_spectral_range: 0.003,
            nominal_spacing: (pick(rng, 2) == 0).then_some([4e8, 1e-9, 1e30][pick(rng, 3)]),
            mode_floor: 0.02,
            fsr_source_id: "fuzz".to_owned(),
        };
        let found = measure(&capture, &settings);
        assert!(found.refused.is_none_or(|why| !why.to_string().is_empty()));
        if let Some(spacing) = &found.mode_spacing {
            assert!(spacing.value.is_finite() && spacing.value > 0.0 && spacing.u() >= 0.0, "{spacing:?}");
        }
        for mode in found.modes.iter().chain(&found.off_axis) {
            assert!(mode.offset.is_finite() && mode.relative_height.is_finite(), "{mode:?}");
        }
        found.warnings.iter().for_each(|warning| assert!(!warning.to_string().is_empty()));
    });
}
