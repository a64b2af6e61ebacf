//! scratch
use tubewright::{
    capture::{Capture, TimeBase},
    phantom::{Scenario, Setting},
    sweep,
};
fn main() {
    let a: Vec<String> = std::env::args().collect();
    let samples: usize = a[1].parse().unwrap();
    let seeds: u64 = a[2].parse().unwrap();
    let verbose = a.len() > 3;
    let sc = Scenario::demo();
    for serial in ["DEMO-0001", "DEMO-0002", "DEMO-0003"] {
        let (mut n2, mut nosp, mut bad, mut z2, mut nz, mut within, mut refused, mut nom) = (0, 0, 0, 0.0, 0, 0, 0, 0);
        let mut t = 0.0;
        let mut zs = Vec::new();
        for seed in std::env::var("SEED").ok().and_then(|s| s.parse().ok()).map_or(1..=seeds, |s: u64| s..=s) {
            let w = sc.world(serial, Some(seed)).unwrap();
            for k in 0..10 {
                let at = 20_000 + 34_567 * k;
                if std::env::var("AT").is_ok_and(|a| a != at.to_string()) {
                    continue;
                }
                let Some(tr) = w.capture(at, samples, Setting { lit: true, ..Default::default() }) else { continue };
                let c = Capture {
                    time: TimeBase { start: 0.0, step: tr.time_step, n: tr.photodiode.len() },
                    ramp: Some(tr.ramp.clone()),
                    photodiode: tr.photodiode.clone(),
                    crossed: tr.crossed.clone(),
                    head: Default::default(),
                    remarks: vec![],
                };
                let truth = w.comb().mode_spacing();
                let nominal = (truth / 1e6).round() * 1e6;
                let s = sweep::Settings {
                    free_spectral_range: 6.4e9,
                    u_free_spectral_range: 0.0,
                    nominal_spacing: Some(nominal),
                    mode_floor: 0.02,
                    fsr_source_id: "f".into(),
                };
                let t0 = std::time::Instant::now();
                let m = sweep::measure(&c, &s);
                t += t0.elapsed().as_secs_f64();
                let modes = w.modes(at);
                let top = modes.iter().map(|m| m.power).fold(0.0, f64::max);
                let clear = modes.iter().filter(|m| m.power > 0.04 * top).count();
                if m.refused.is_some() {
                    refused += 1;
                }
                if m.modes.len() != modes.iter().filter(|m| m.power > 0.02 * top).count() {
                    nom += 1;
                }
                if clear >= 2 {
                    n2 += 1;
                    match &m.mode_spacing {
                        None => {
                            nosp += 1;
                            if verbose {
                                println!(
                                    "{serial} seed {seed} at {at}: {:?} {:?} truth modes {:?}",
                                    m.refused.as_ref().map(|r| r.to_string()),
                                    m.no_spacing.as_ref().map(|r| r.to_string()),
                                    modes
                                        .iter()
                                        .map(|m| ((m.detuning / 1e6).round(), (m.power / top * 100.).round()))
                                        .collect::<Vec<_>>()
                                );
                            }
                        }
                        Some(v) => {
                            let z = (v.value - truth) / v.u();
                            if (v.value / truth - 1.0).abs() > 0.02 {
                                bad += 1;
                                if verbose {
                                    println!(
                                        "{serial} seed {seed} at {at} BAD {} truth {}",
                                        v.value / 1e6,
                                        truth / 1e6
                                    );
                                }
                            } else {
                                z2 += z * z;
                                nz += 1;
                                zs.push(z.abs());
                                if z.abs() < 1.96 {
                                    within += 1;
                                } else if verbose && z.abs() > 4.0 {
                                    println!(
                                        "{serial} seed {seed} at {at} z {z:.1} err {:.3} u {:.3} {:?}",
                                        (v.value - truth) / 1e6,
                                        v.u() / 1e6,
                                        v.budget.iter().map(|l| l.contribution() / 1e6).collect::<Vec<_>>()
                                    );
                                }
                            }
                        }
                    }
                }
            }
        }
        zs.sort_by(f64::total_cmp);
        println!(
            "{serial}: n2 {n2} refused {refused} nospacing {nosp} bad {bad} wrong-count {nom} coverage {:.3} rms z {:.2} median|z| {:.2} time {:.2} ms",
            within as f64 / nz as f64,
            (z2 / nz as f64).sqrt(),
            zs[zs.len() / 2],
            t / (seeds as f64 * 10.0) * 1e3
        );
    }
}
