//! README.md and DEVELOPERS.md say what is there: paths that exist, every folder of `src/`, every exit status.
//! Must not judge their words.
//! Main function: `missing`.

use std::fs;
use std::path::Path;

use tubewright::cli::Ending;

use super::layers::LAYERS;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn page(name: &str) -> String {
    fs::read_to_string(root().join(name)).unwrap()
}

/// What a path of the project begins with.
const STARTS: &[&str] = &[
    "src/",
    "tests/",
    "limits/",
    "fixtures/",
    "benches/",
    ".ci/",
    "reports/samples/",
    "README.md",
    "DEVELOPERS.md",
    "CHANGELOG.md",
];

/// Paths of the project in back quotes or links that are not there.
///
/// Left alone: places of the reader's own (`<type>`, `…`), and sample records until there are any.
fn missing(text: &str) -> Vec<String> {
    let quoted = text.split(['`', '(', ')', ' ', '\n']);
    let paths = quoted.map(|word| word.trim_end_matches(['.', ',', ';', ':']));
    let ours =
        paths.filter(|word| STARTS.iter().any(|start| word.starts_with(start)) && !word.contains(['<', '…', '*']));
    let to_come = |word: &str| word.starts_with("reports/samples/") && !root().join("reports/samples").exists();
    ours.filter(|word| !root().join(word).exists() && !to_come(word)).map(str::to_owned).collect()
}

#[test]
fn a_path_that_is_not_there_is_found() {
    assert_eq!(missing("see `src/sweep/nothing.rs`, `src/lib.rs` and [it](tests/all)."), ["src/sweep/nothing.rs"]);
}

#[test]
fn pages_name_paths_that_exist() {
    for name in ["README.md", "DEVELOPERS.md", "CHANGELOG.md"] {
        assert_eq!(missing(&page(name)), [""; 0], "{name}");
    }
}

#[test]
fn the_map_names_every_folder_and_no_other() {
    let map = page("DEVELOPERS.md");
    let row = |module: &str| map.lines().any(|line| line.starts_with('|') && line.contains(&format!("| `{module}` |")));
    for module in LAYERS.iter().copied().flatten() {
        let is_there = root().join("src").join(module).is_dir();
        assert_eq!(row(module), is_there, "row of `{module}` in DEVELOPERS.md, folder in src/");
    }
}

#[test]
fn readme_has_every_exit_status() {
    let readme = page("README.md");
    let all = [
        Ending::Accepted,
        Ending::NotAccepted,
        Ending::Hold,
        Ending::Unfinished,
        Ending::Unusable,
        Ending::Instrument,
        Ending::Store,
        Ending::Proof,
        Ending::NotAllowed,
    ];
    for ending in all {
        let status = ending.status();
        assert!(readme.lines().any(|line| line.starts_with(&format!("| {status} |"))), "{status} is not in README.md");
    }
}
