//! Reads `src/` and fails where a file breaks a rule of the house: layers, I/O, purpose lines, length, panics, serde, names.
//! Must not link the library (but for the table of exit statuses): the rules hold for the text, compiled or not.
//! Main function: `breaches`; every rule is tried on a planted breach in `planted`.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[path = "architecture/layers.rs"]
mod layers;
#[path = "architecture/map.rs"]
mod map;
#[path = "architecture/planted.rs"]
mod planted;
#[path = "architecture/rules.rs"]
mod rules;
#[path = "architecture/source.rs"]
mod source;
#[path = "architecture/tokens.rs"]
mod tokens;

use source::{Source, tree};

/// A broken rule: file, line (from 1), what was found and what is allowed.
type Breach = (String, usize, String);

/// A rule: everything in one file that breaks it.
type Rule = fn(&Source) -> Vec<Breach>;

/// Every rule, with its name.
const RULES: &[(&str, Rule)] = &[
    ("imports", layers::imports),
    ("io", rules::io),
    ("purpose", rules::purpose),
    ("length", rules::length),
    ("panics", rules::panics),
    ("unsafe", rules::unsafe_code),
    ("serde", rules::serde),
    ("names", rules::names),
    ("kinds", rules::kinds),
    ("sentences", rules::sentences),
];

/// Breaches of one rule over some files, each as a line of text.
fn breaches(rule: Rule, files: &[Source]) -> Vec<String> {
    let found = files.iter().flat_map(rule);
    found.map(|(path, line, what)| format!("src/{path}:{line}: {what}")).collect()
}

fn assert_rule(name: &str) {
    let (_, rule) = RULES.iter().find(|(known, _)| *known == name).expect("a rule of the table");
    let found = breaches(*rule, &tree());
    assert!(found.is_empty(), "rule `{name}` is broken {} times:\n{}", found.len(), found.join("\n"));
}

#[test]
fn the_tree_is_read() {
    let files = tree();
    // A walk that finds nothing would pass every rule.
    assert!(files.len() > 100, "only {} files found", files.len());
    assert!(files.iter().any(|file| file.test_only), "no file is known as a test");
    assert!(files.iter().any(|file| file.path == "sweep/measure.rs"));
}

#[test]
fn imports_go_down_only() {
    assert_rule("imports");
}

#[test]
fn no_io_and_no_clock_below_the_fifth_layer() {
    assert_rule("io");
}

#[test]
fn every_file_says_its_job_and_what_it_must_not_do() {
    assert_rule("purpose");
}

#[test]
fn no_file_is_too_long() {
    assert_rule("length");
}

#[test]
fn nothing_outside_tests_may_panic() {
    assert_rule("panics");
}

#[test]
fn nothing_is_unsafe() {
    assert_rule("unsafe");
}

#[test]
fn serde_stays_where_stored_forms_are() {
    assert_rule("serde");
}

#[test]
fn no_module_is_a_drawer_for_everything() {
    assert_rule("names");
}

#[test]
fn a_run_names_step_kinds_in_one_table_only() {
    assert_rule("kinds");
}

#[test]
fn every_sentence_of_a_sheet_stands_in_the_table() {
    assert_rule("sentences");
}
