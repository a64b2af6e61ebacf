//! Errors of mode_spacing over the Cramér-Rao bound, bias and coverage, case by case, over simulated captures.
//! Must not gate: the seeded table of `tests/accuracy.rs` does.
//! Main function: `main`. Run with `cargo bench --bench accuracy -- [captures a case] [part of a case's name]`.
#![allow(clippy::print_stdout)]

#[path = "../tests/bound/mod.rs"]
mod bound;
#[path = "../tests/bound/table.rs"]
mod table;

fn main() {
    let mut words = std::env::args().skip(1).filter(|word| word != "--bench");
    let captures = words.next().and_then(|word| word.parse().ok()).unwrap_or(1000);
    let part = words.next().unwrap_or_default();
    println!("{}", table::HEAD);
    for case in table::cases().iter().filter(|case| case.name.contains(&part)) {
        println!("{}", table::row(case, &table::score(case, captures, 1)));
    }
}
