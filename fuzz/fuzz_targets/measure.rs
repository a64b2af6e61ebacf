//! Any numbers as a capture: a result whose numbers are finite, or a refusal in words; never a panic, never slow.
//! Run with `cargo +nightly fuzz run measure -s none -- -max_total_time=600 -timeout=1 -max_len=8192`.
#![no_main]

use libfuzzer_sys::fuzz_target;
use tubewright::capture::{Capture, TimeBase};
use tubewright::sweep::{Settings, measure};

fuzz_target!(|bytes: &[u8]| {
    let Some((&[kind, size, ramp, fsr], rest)) = bytes.split_first_chunk::<4>() else { return };
    let n = 100 + 16 * usize::from(size);
    let photodiode = if kind & 1 == 0 { raw(rest, kind) } else { peaks(rest, n) };
    let n = photodiode.len();
    let capture = Capture {
        time: TimeBase { start: 0.0, step: 1e-6, n },
        ramp: ramp_of(ramp, n, rest),
        crossed: (kind & 2 != 0).then(|| photodiode.iter().rev().copied().collect()),
        photodiode,
        head: Default::default(),
        remarks: Vec::new(),
    };
    let settings = Settings {
        free_spectral_range: f64::from(fsr) * 1e8,
        u_free_spectral_range: 0.003,
        nominal_spacing: (kind & 4 != 0).then_some(4e8),
        mode_floor: 0.02,
        fsr_source_id: "fuzz".to_owned(),
    };
    let found = measure(&capture, &settings);
    if let Some(why) = &found.refused {
        assert!(!why.to_string().is_empty());
    }
    if let Some(spacing) = &found.mode_spacing {
        assert!(spacing.value.is_finite() && spacing.value > 0.0, "{}", spacing.value);
        assert!(spacing.u() > 0.0 && !spacing.u().is_nan(), "{}", spacing.u());
    }
    for mode in found.modes.iter().chain(&found.off_axis) {
        assert!(mode.offset.is_finite() && mode.relative_height.is_finite());
    }
    found.warnings.iter().for_each(|warning| assert!(!warning.to_string().is_empty()));
});

/// Bytes as they are: doubles, sixteen bits, or eight.
fn raw(bytes: &[u8], kind: u8) -> Vec<f64> {
    match kind & 24 {
        0 => bytes.chunks_exact(8).filter_map(|b| b.try_into().ok().map(f64::from_le_bytes)).collect(),
        8 => bytes.chunks_exact(2).map(|b| f64::from(i16::from_le_bytes([b[0], b[1]])) / 1000.0).collect(),
        _ => bytes.iter().map(|b| f64::from(*b)).collect(),
    }
}

/// Peaks, three bytes each: place, height, width; a little noise.
fn peaks(bytes: &[u8], n: usize) -> Vec<f64> {
    let mut noise = 1_u32;
    (0..n)
        .map(|i| {
            noise = noise.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            let peak = |p: &[u8]| {
                let q = (i as f64 / n as f64 * 256.0 - f64::from(p[0])) / (0.05 + f64::from(p[2]) / 64.0);
                (f64::from(p[1]) - 32.0) / (1.0 + q * q)
            };
            bytes.chunks_exact(3).take(40).map(peak).sum::<f64>() + f64::from(noise >> 16) / 65_536.0
        })
        .collect()
}

fn ramp_of(kind: u8, n: usize, bytes: &[u8]) -> Option<Vec<f64>> {
    let at = |i: usize| i as f64 / n as f64;
    match kind % 6 {
        0 => None,
        1 => Some((0..n).map(at).collect()),
        2 => Some((0..n).map(|i| (at(i) * f64::from(kind)).fract()).collect()),
        3 => Some((0..n).map(|i| ((at(i) * f64::from(kind / 8)).fract() - 0.5).abs()).collect()),
        4 => Some((0..n).map(|i| f64::from((at(i) * f64::from(kind)).fract() > 0.5)).collect()),
        _ => Some((0..n).map(|i| bytes.get(i).map_or(0.0, |b| f64::from(*b))).collect()),
    }
}
