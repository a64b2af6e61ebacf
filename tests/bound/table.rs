//! The cases of the table, and how a case is scored.
//! Must not make captures: `bound` does.
//! Main functions: [`cases`], [`score`].
#![allow(dead_code)]

use std::time::Instant;

use tubewright::sweep::{Settings, measure};

use super::bound::{Case, Ramp, Score};

const FOUR: &[f64] = &[0.22, 1.0, 0.7, 0.9];
const THREE: &[f64] = &[0.4, 1.0, 0.6];
const TWO: &[f64] = &[0.8, 1.0];

/// A 375 mm tube on a 6.4 GHz interferometer of finesse 150, 2.6 orders on one rising ramp.
const PLAIN: Case = Case {
    name: "plain 375 mm",
    fsr: 6.4e9,
    spacing: 399.7e6,
    heights: FOUR,
    finesse: 150.0,
    noise: 0.01,
    samples: 20_000,
    orders: 2.6,
    up: Ramp::Polynomial(0.02, 0.0),
    down: None,
    pole: 0.0,
};

/// With the axis inside the fitted family.
pub fn cases() -> Vec<Case> {
    let triangle = Some(Ramp::Polynomial(-0.015, 0.0));
    let mut cases = inside(triangle);
    cases.extend([
        Case { name: "outside: power law 0.8", up: Ramp::PowerLaw(0.8, 0.5), ..PLAIN },
        Case { name: "outside: power law 1.3", up: Ramp::PowerLaw(1.3, 0.5), ..PLAIN },
        Case { name: "outside: creep 3 %", up: Ramp::Creep(0.03), orders: 3.4, ..PLAIN },
        Case { name: "outside: wiggle 0.3 %", up: Ramp::Wiggle(0.02, 0.003, 0.7), orders: 3.4, ..PLAIN },
        Case {
            name: "outside: power law, 600 MHz",
            up: Ramp::PowerLaw(0.85, 0.4),
            spacing: 599.6e6,
            heights: THREE,
            ..PLAIN
        },
    ]);
    cases
}

fn inside(triangle: Option<Ramp>) -> Vec<Case> {
    vec![
        PLAIN,
        Case { name: "curvature 20 %", up: Ramp::Polynomial(0.033, 0.0), ..PLAIN },
        Case { name: "cubic", up: Ramp::Polynomial(0.025, 0.008), orders: 3.4, ..PLAIN },
        Case { name: "noise 0.1 %", noise: 0.001, ..PLAIN },
        Case { name: "noise 5 %", noise: 0.05, ..PLAIN },
        Case { name: "2,500 samples", samples: 2_500, ..PLAIN },
        Case { name: "100,000 samples", samples: 100_000, ..PLAIN },
        Case { name: "finesse 10", finesse: 10.0, spacing: 999.3e6, heights: TWO, fsr: 3e9, ..PLAIN },
        Case { name: "finesse 30", finesse: 30.0, spacing: 599.6e6, heights: THREE, ..PLAIN },
        Case { name: "finesse 1,000", finesse: 1_000.0, samples: 100_000, ..PLAIN },
        Case { name: "150 mm, 2 modes", spacing: 999.3e6, heights: TWO, ..PLAIN },
        Case { name: "250 mm, 1.5 GHz FSR", spacing: 599.6e6, heights: THREE, fsr: 1.5e9, ..PLAIN },
        Case { name: "250 mm, 10 GHz FSR", spacing: 599.6e6, heights: THREE, fsr: 10e9, ..PLAIN },
        Case { name: "both ramps", down: triangle, ..PLAIN },
        Case {
            name: "both ramps, finesse 30",
            down: triangle,
            finesse: 30.0,
            spacing: 599.6e6,
            heights: THREE,
            ..PLAIN
        },
        Case { name: "both ramps, 2 modes", down: triangle, spacing: 999.3e6, heights: TWO, ..PLAIN },
        Case { name: "slow detector", pole: 30.0, ..PLAIN },
        Case { name: "slow detector, both ramps", pole: 15.0, down: triangle, ..PLAIN },
    ]
}

pub const HEAD: &str = "| case | captures (none) | bound, kHz | rms/bound | bias/bound | covered, % | u/bound | ms |\n|---|---|---|---|---|---|---|---|";

/// One line of the table.
pub fn row(case: &Case, score: &Score) -> String {
    format!(
        "| {} | {} ({}) | {:.2} | {:.3} | {:+.3} ± {:.3} | {:.1} | {:.2} | {:.2} |",
        case.name,
        score.n,
        score.none,
        score.bound / 1e3,
        score.rms,
        score.bias,
        score.u_bias,
        score.covered * 100.0,
        score.stated,
        score.time * 1e3
    )
}

/// Time of this thread on a processor, so that what else the machine does is not counted; else plain time.
struct Clock(Option<f64>, Instant);

impl Clock {
    fn on_processor() -> Option<f64> {
        // First number: nanoseconds on a processor.
        let text = std::fs::read_to_string("/proc/thread-self/schedstat").ok()?;
        Some(text.split_whitespace().next()?.parse::<f64>().ok()? * 1e-9)
    }

    fn now() -> Self {
        Self(Self::on_processor(), Instant::now())
    }

    fn elapsed(&self) -> f64 {
        match (self.0, Self::on_processor()) {
            (Some(from), Some(to)) => to - from,
            _ => self.1.elapsed().as_secs_f64(),
        }
    }
}

/// Measures captures of a case.
pub fn score(case: &Case, captures: usize, first_seed: u64) -> Score {
    let settings = Settings {
        free_spectral_range: case.fsr,
        u_free_spectral_range: 0.0,
        nominal_spacing: Some(case.spacing * 1.003),
        mode_floor: 0.02,
        fsr_source_id: "none".to_owned(),
    };
    let (mut errors, mut bounds, mut ratios, mut times) = (Vec::new(), Vec::new(), Vec::new(), Vec::new());
    let (mut none, mut inside) = (0, 0);
    for seed in 0..captures as u64 {
        let made = case.make(first_seed * 1_000_003 + seed, true);
        let begun = Clock::now();
        let found = measure(&made.capture, &settings);
        times.push(begun.elapsed());
        let Some(spacing) = found.mode_spacing else {
            none += 1;
            continue;
        };
        let error = spacing.value - case.spacing;
        inside += usize::from(error.abs() <= 1.96 * spacing.u());
        ratios.push(spacing.u() / made.bound);
        errors.push(error);
        bounds.push(made.bound);
    }
    let n = errors.len();
    let rms = |v: &[f64]| (v.iter().map(|x| x * x).sum::<f64>() / v.len().max(1) as f64).sqrt();
    let bound = rms(&bounds);
    let median = |v: &mut Vec<f64>| {
        v.sort_by(f64::total_cmp);
        v.get(v.len() / 2).copied().unwrap_or(f64::NAN)
    };
    Score {
        n,
        none,
        rms: rms(&errors) / bound,
        bias: errors.iter().sum::<f64>() / n.max(1) as f64 / bound,
        u_bias: rms(&errors) / bound / (n.max(1) as f64).sqrt(),
        covered: inside as f64 / n.max(1) as f64,
        stated: median(&mut ratios),
        bound,
        time: times.iter().sum::<f64>() / times.len().max(1) as f64,
    }
}
