//! The module against captures made by an independent script, as peaks found by another.
//! Must not compute positions itself.
//! Main function: `glimpses`.
#![allow(clippy::unwrap_used)]

use super::*;

const FREE_SPECTRAL_RANGE: f64 = 6.4e9;
/// Of the type; the tube's own is 599.585 MHz.
const NOMINAL: f64 = 596e6;

fn glimpses() -> Vec<Glimpse> {
    let mut glimpses: Vec<Glimpse> = Vec::new();
    for line in include_str!("../../fixtures/warm-up/glimpses.csv").lines().skip(1) {
        let cells: Vec<f64> = line.split(',').map(|cell| cell.parse().unwrap()).collect();
        if glimpses.last().is_none_or(|g| g.at != cells[0]) {
            glimpses.push(Glimpse { at: cells[0], free_spectral_range: FREE_SPECTRAL_RANGE, ..Glimpse::default() });
        }
        glimpses.last_mut().unwrap().modes.push(GlimpseMode {
            position: cells[1],
            u_position: cells[2],
            height: cells[3],
            u_height: cells[4],
            crossed: Some(cells[5]),
        });
    }
    for glimpse in &mut glimpses {
        let n = glimpse.modes.len();
        glimpse.modes.sort_by(|a, b| a.position.total_cmp(&b.position));
        let span = glimpse.modes[n - 1].position - glimpse.modes[0].position;
        glimpse.mode_spacing = (n > 1).then(|| span / (n - 1) as f64);
    }
    glimpses
}

#[test]
fn walk_tau_hop_and_swap() {
    let glimpses = glimpses();
    let mut warmup =
        Warmup::new(WarmupSettings { nominal_spacing: NOMINAL, residual_walk: 2.0, horizon: 600.0, cycles: 2.0 });
    for glimpse in &glimpses {
        warmup.take(glimpse);
    }
    warmup.finish();
    let state = warmup.state();
    let tau = state.tau.unwrap();
    assert!((state.walked - 22.30437).abs() < 0.02);
    assert!((tau.value - 90.0).abs() < (3.0 * tau.u()).min(0.9), "{} ± {}", tau.value, tau.u());

    let watched = watch(&glimpses, NOMINAL);
    assert_eq!((watched.hops.len(), watched.swaps.len()), (1, 1));
    assert!(watched.unattributed.is_empty() && watched.interferometer.is_empty());
    assert!((watched.hops[0].at - 150.2).abs() <= 3.0 && (watched.swaps[0].at - 200.3).abs() <= 3.0);
    assert!((watched.hops[0].size - 210e6).abs() < 12e6);
    assert!((watched.cycles - 22.304).abs() < 0.02);
}
