//! What real benches deliver, simulated: each defect is measured within its stated uncertainty, or refused in words.
//! Must not look inside the engine: a capture goes in, a result comes out.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod defects;

use std::collections::BTreeMap;

use defects::{Bench, Case, FSR};
use tubewright::sweep::{Measurement, Settings, measure};

fn settings(fsr: f64) -> Settings {
    Settings {
        free_spectral_range: fsr,
        u_free_spectral_range: 0.0,
        nominal_spacing: Some(399.7e6),
        mode_floor: 0.02,
        fsr_source_id: "none".to_owned(),
    }
}

fn bench(change: impl Fn(&mut Bench)) -> impl Fn(u64) -> Bench {
    move |seed| {
        let mut bench = Bench::new(seed);
        change(&mut bench);
        bench
    }
}

/// Name and how one capture is made of a seed.
type Defect = (&'static str, Box<dyn Fn(u64) -> Case>);

fn defects() -> Vec<Defect> {
    let mut all: Vec<Defect> = Vec::new();
    let mut add = |name: &'static str, make: Box<dyn Fn(u64) -> Case>| all.push((name, make));
    let triangle = bench(|b| {
        b.bench.rising_share = 0.5;
        b.bench.ramp_loop = 1.0;
    });
    let one = |seed: u64| Bench::new(seed).one();
    add("none", Box::new(move |s| one(s).digitized(12)));
    add("clipped at 90 %", Box::new(move |s| one(s).clipped(0.9).digitized(12)));
    add("clipped at 60 %", Box::new(move |s| one(s).clipped(0.6).digitized(12)));
    add("clipped at 30 %", Box::new(move |s| one(s).clipped(0.3).digitized(12)));
    add("clipped at 10 %", Box::new(move |s| one(s).clipped(0.1).digitized(12)));
    // One line is 1 / (2.5 · 150) of the ramp of 23.75 ms: 63 µs.
    add("detector 0.3 lines slow", Box::new(move |s| one(s).slowed(19e-6).digitized(12)));
    add("detector 1 line slow", Box::new(move |s| one(s).slowed(63e-6).digitized(12)));
    add("detector 3 lines slow", Box::new(move |s| one(s).slowed(190e-6).digitized(12)));
    add("detector 10 lines slow", Box::new(move |s| one(s).slowed(630e-6).digitized(12)));
    add("triangle with full hysteresis", Box::new(move |s| triangle(s).one().digitized(12)));
    let triangle = bench(|b| {
        b.bench.rising_share = 0.5;
        b.bench.ramp_loop = 1.0;
    });
    add("triangle, falling first", Box::new(move |s| triangle(s).several(2).part(0.25, 0.75).digitized(12)));
    let falling = bench(|b| b.bench.rising_share = 0.05);
    add("sawtooth that falls", Box::new(move |s| falling(s).one().digitized(12)));
    for (name, ramps) in [("trigger wave, 1 ramp", 1), ("trigger wave, 3 ramps", 3)] {
        add(
            name,
            Box::new(move |s| {
                let case = Bench::new(s).several(ramps).digitized(12);
                case.ramp(|place, _| if (place * ramps as f64).fract() < 0.5 { 5.0 } else { 0.0 })
            }),
        );
    }
    for (name, ramps) in
        [("no ramp channel, 1 ramp", 1), ("no ramp channel, 3 ramps", 3), ("no ramp channel, 6 ramps", 6)]
    {
        add(name, Box::new(move |s| Bench::new(s).several(ramps).without_ramp().digitized(12)));
    }
    let triangle = |s: u64| {
        let mut b = Bench::new(s);
        b.bench.rising_share = 0.5;
        b
    };
    add("no ramp channel, 1 triangle", Box::new(move |s| triangle(s).one().without_ramp().digitized(12)));
    add("no ramp channel, 3 triangles", Box::new(move |s| triangle(s).several(3).without_ramp().digitized(12)));
    add(
        "no ramp, flyback inside",
        Box::new(move |s| Bench::new(s).several(2).part(0.2, 0.7).without_ramp().digitized(12)),
    );
    for (name, levels) in
        [("ramp in 40 levels", 40.0), ("ramp in 16 levels", 16.0), ("ramp in 8 levels", 8.0), ("ramp in 4 levels", 4.0)]
    {
        add(name, Box::new(move |s| one(s).digitized(12).ramp_levels(levels)));
    }
    add("ramp in millivolts", Box::new(move |s| one(s).digitized(12).ramp(|_, v| v * 1e3)));
    add("ramp upside down", Box::new(move |s| one(s).digitized(12).ramp(|_, v| -v)));
    for (name, share) in [("hum 2 %", 0.02), ("hum 5 %", 0.05), ("hum 20 %", 0.2), ("hum 50 %", 0.5)] {
        add(name, Box::new(move |s| one(s).hum(share, 50.0).digitized(12)));
    }
    add("hum 5 % at 300 Hz", Box::new(move |s| one(s).hum(0.05, 300.0).digitized(12)));
    for (name, share) in [("lamp 3 %", 0.03), ("lamp 10 %", 0.1), ("lamp 30 %", 0.3)] {
        add(name, Box::new(move |s| one(s).lamp(0.43, share).digitized(12)));
    }
    for (name, bits) in [("6 bits", 6), ("5 bits", 5), ("4 bits", 4), ("3 bits", 3)] {
        add(
            name,
            Box::new(move |s| {
                let mut b = Bench::new(s);
                b.bench.noise = 0.0005;
                b.one().digitized(bits)
            }),
        );
    }
    add("behind a polarizer", Box::new(move |s| Bench::new(s).swapping(1.0).digitized(12)));
    for (name, share) in [("swap at 30 %", 0.3), ("swap at 50 %", 0.5), ("swap at 70 %", 0.7)] {
        add(name, Box::new(move |s| Bench::new(s).swapping(share).digitized(12)));
    }
    for (name, share, size) in [
        ("hop 100 MHz at 30 %", 0.3, 100e6),
        ("hop 100 MHz at 50 %", 0.5, 100e6),
        ("hop 100 MHz at 70 %", 0.7, 100e6),
        ("hop 200 MHz at 50 %", 0.5, -200e6),
        ("hop 30 MHz at 50 %", 0.5, 30e6),
        ("hop 10 MHz at 50 %", 0.5, 10e6),
        ("hop 3 MHz at 50 %", 0.5, 3e6),
    ] {
        add(name, Box::new(move |s| Bench::new(s).hopping(share, size).digitized(12)));
    }
    add("spliced at 40 %", Box::new(move |s| Bench::new(s).spliced(0.4).digitized(12)));
    add("spliced at 60 %", Box::new(move |s| Bench::new(s).spliced(0.6).digitized(12)));
    add("starts at 30 %", Box::new(move |s| one(s).part(0.3, 1.0).digitized(12)));
    add("starts at 45 %", Box::new(move |s| one(s).part(0.45, 1.0).digitized(12)));
    add("starts at 60 %", Box::new(move |s| one(s).part(0.6, 1.0).digitized(12)));
    for (name, share, offset) in [
        ("off axis 0.1 %, below", 0.001, -130e6),
        ("off axis 0.1 %, above", 0.001, 130e6),
        ("off axis 1 %, below", 0.01, -130e6),
        ("off axis 10 %, below", 0.1, -130e6),
        ("off axis 10 %, above", 0.1, 130e6),
        ("off axis 30 %, below", 0.3, -130e6),
        ("off axis 50 %, below", 0.5, -130e6),
        ("off axis 50 %, above", 0.5, 130e6),
        ("off axis 50 %, near", 0.5, 50e6),
        ("off axis 50 %, half-way", 0.5, 199.6e6),
    ] {
        add(
            name,
            Box::new(move |s| {
                let mut b = Bench::new(s);
                b.tube.off_axis_share = share;
                b.tube.off_axis_offset = offset;
                b.one().digitized(12)
            }),
        );
    }
    add(
        "2 kHz, 1,000 samples",
        Box::new(move |s| {
            let mut b = Bench::new(s);
            (b.bench.ramp_period, b.samples, b.bench.detector_time) = (5e-4, 1_000, 2e-7);
            b.one().digitized(12)
        }),
    );
    add(
        "2 kHz, 1,000 samples, 2 us detector",
        Box::new(move |s| {
            let mut b = Bench::new(s);
            (b.bench.ramp_period, b.samples) = (5e-4, 1_000);
            b.one().digitized(12)
        }),
    );
    for (name, multiple) in [("soft saturation, 3", 3.0), ("soft saturation, 1", 1.0), ("soft saturation, 0.5", 0.5)] {
        add(name, Box::new(move |s| one(s).saturated(multiple).digitized(12)));
    }
    add("inverted", Box::new(move |s| one(s).inverted().digitized(12)));
    for (name, time) in [("coupled, 25 ms", 25e-3), ("coupled, 2.5 ms", 2.5e-3), ("coupled, 0.25 ms", 2.5e-4)] {
        add(name, Box::new(move |s| one(s).coupled(time).digitized(12)));
    }
    for (name, share) in
        [("crosstalk 5 %", 0.05), ("crosstalk 30 %", 0.3), ("crosstalk 100 %", 1.0), ("crosstalk -30 %", -0.3)]
    {
        add(name, Box::new(move |s| one(s).crosstalk(share).digitized(12)));
    }
    all
}

fn first_words(text: &str) -> String {
    text.split([':', ',', ';']).next().unwrap_or_default().chars().filter(|c| !c.is_ascii_digit()).take(40).collect()
}

#[test]
fn survey() {
    let skip = std::env::var("SKIP").map_or(0, |n| n.parse().unwrap());
    for (name, make) in defects().into_iter().skip(skip) {
        let only = std::env::var("ONLY").unwrap_or_default();
        if !name.contains(&only) {
            continue;
        }
        let (mut inside, mut wrong) = (0, Vec::new());
        let mut refused: BTreeMap<String, u32> = BTreeMap::new();
        let mut warned: BTreeMap<String, u32> = BTreeMap::new();
        let mut us = Vec::new();
        for seed in 1..=9 {
            let case = make(seed);
            let found: Measurement = measure(&case.capture, &settings(FSR));
            for warning in &found.warnings {
                let words = first_words(&warning.to_string());
                if !words.starts_with("no uncertainty") {
                    *warned.entry(words).or_default() += 1;
                }
            }
            match (&found.mode_spacing, found.refused.as_ref().or(found.no_spacing.as_ref())) {
                (Some(spacing), _) => {
                    let off = spacing.value - case.mode_spacing;
                    us.push(spacing.u());
                    if off.abs() <= 3.5 * spacing.u() {
                        inside += 1;
                    } else {
                        wrong.push(format!(
                            "{seed}: {:+.0} kHz, {:+.1} u, {} modes, {} off",
                            off / 1e3,
                            off / spacing.u(),
                            found.modes.len(),
                            found.off_axis.len()
                        ));
                    }
                }
                (None, Some(why)) => *refused.entry(first_words(&why.to_string())).or_default() += 1,
                _ => panic!("{name}: neither"),
            }
        }
        us.sort_by(f64::total_cmp);
        let u = us.get(us.len() / 2).copied().unwrap_or(0.0) / 1e3;
        println!(
            "{name:<36} ok {inside:>2} wrong {:>2} u {u:>5.0} kHz refused {refused:?} warned {warned:?}",
            wrong.len()
        );
        wrong.iter().take(4).for_each(|line| println!("      {line}"));
    }
}
