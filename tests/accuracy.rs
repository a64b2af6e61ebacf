//! The engine against the Cramér-Rao bound, on captures made by formula: a small part of the table of `benches/accuracy.rs`.
//! Must not take a truth or a bound from the engine.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod bound;
#[path = "bound/table.rs"]
mod table;

/// Captures of each case.
const CAPTURES: usize = 60;
/// Root mean square error over the bound that is wanted; its own relative standard deviation is 1/√(2n).
const WANTED: f64 = 1.2;

#[test]
fn errors_stay_near_the_bound_and_inside_what_is_stated() {
    let names = ["plain 375 mm", "noise 0.1 %", "2,500 samples", "250 mm, 10 GHz FSR", "both ramps, 2 modes"];
    println!("{}", table::HEAD);
    for case in table::cases().iter().filter(|case| names.contains(&case.name)) {
        let score = table::score(case, CAPTURES, 7);
        println!("{}", table::row(case, &score));
        assert_eq!(score.none, 0, "{}: a spacing in every capture", case.name);
        let chance = 2.0 / (2.0 * CAPTURES as f64).sqrt();
        assert!(score.rms < WANTED * (1.0 + chance), "{}: {} of the bound", case.name, score.rms);
        // Three standard deviations of a mean over the captures, beyond a fifth of the bound.
        assert!(score.bias.abs() < 0.2 + 3.0 * score.u_bias, "{}: biased by {}", case.name, score.bias);
        // 95 % with a standard deviation of 2.8 % over 60 captures: three of them.
        assert!(score.covered > 0.865, "{}: covered {}", case.name, score.covered);
        assert!(score.stated < 1.5, "{}: states {} of the bound", case.name, score.stated);
    }
}
