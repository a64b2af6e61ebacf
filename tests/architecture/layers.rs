//! The layers of `src/`: imports go down, never sideways except as the table says.
//! Must not look at anything but paths of this crate.
//! Main items: [`LAYERS`], [`SIDEWAYS`], [`imports`].

use super::Breach;
use super::source::Source;
use super::tokens::paths;

/// Modules from the bottom up. Those that are still to come have their place.
pub const LAYERS: &[&[&str]] = &[
    &["numerics", "quantity"],
    &["constants", "uncertainty", "phrase"],
    &["measurand", "tube", "capture", "sweep", "behaviour", "record"],
    &["limits", "recipe", "phantom"],
    &["station", "run", "quality", "lots", "gauge", "seal", "report"],
    &["disk", "instruments", "store", "driver", "page"],
    &["cli"],
];

/// Who may look at whom in the same layer.
const SIDEWAYS: &[(&str, &[&str])] = &[
    ("sweep", &["capture", "measurand", "tube"]),
    ("behaviour", &["sweep", "tube"]),
    ("record", &["measurand"]),
    ("recipe", &["limits"]),
    // A plan holds the station file by value, and a want is the station's word for what is asked of the world.
    ("run", &["station"]),
    ("report", &["quality"]),
    // Whether the bench gives verdicts hangs on the sums of its reference checks, which gauge keeps.
    ("station", &["gauge"]),
];

/// The same, for unit tests only.
const SIDEWAYS_IN_TESTS: &[(&str, &[&str])] = &[
    // The loop is tried on a simulated bench, and against a folder that is really written.
    ("driver", &["disk", "instruments"]),
];

/// Modules that may look at nothing but these: the model must not share code with the engine that measures it, and
/// what stands low must not grow roots.
const ONLY: &[(&str, &[&str])] = &[
    ("numerics", &[]),
    ("quantity", &[]),
    ("constants", &["quantity"]),
    ("phrase", &[]),
    ("uncertainty", &["quantity", "numerics"]),
    ("phantom", &["quantity", "constants"]),
];

/// Layer of a module.
pub fn layer(module: &str) -> Option<usize> {
    LAYERS.iter().position(|modules| modules.contains(&module))
}

/// Whether one module may look at another.
fn may(from: &str, to: &str, in_test: bool) -> bool {
    let listed = |table: &[(&str, &[&'static str])]| {
        table.iter().find(|(module, _)| *module == from).map(|(_, others)| others.contains(&to))
    };
    if in_test && listed(SIDEWAYS_IN_TESTS) == Some(true) {
        return true;
    }
    match (listed(ONLY), layer(from), layer(to)) {
        _ if from == to => true,
        (Some(allowed), ..) => allowed,
        (None, Some(own), Some(other)) if own == other => listed(SIDEWAYS).unwrap_or(false),
        (None, Some(own), Some(other)) => other < own,
        _ => false,
    }
}

/// Rule: every module is in the table and looks only where it may. Tests within `src/` are held to it too.
pub fn imports(file: &Source) -> Vec<Breach> {
    if matches!(file.path.as_str(), "lib.rs" | "main.rs") {
        return Vec::new();
    }
    let own = file.module();
    let breach = |line, what| (file.path.clone(), line, what);
    if layer(own).is_none() {
        return vec![breach(1, format!("module `{own}` has no layer; give it one in tests/architecture/layers.rs"))];
    }
    let mut found = Vec::new();
    for (line, path) in paths(&file.code) {
        let Some(to) = target(file, line, &path) else { continue };
        if !may(own, to, file.is_test(line)) {
            found.push(breach(line, format!("`{own}` must not import `{to}`")));
        }
    }
    found
}

/// The module of this crate that a path leads to, if it starts at the root: by `crate`, or by enough `super`.
fn target<'a>(file: &Source, line: usize, path: &'a [String]) -> Option<&'a str> {
    if path[0] == "crate" {
        return path.get(1).map(String::as_str);
    }
    let supers = path.iter().take_while(|part| *part == "super").count();
    // A module of tests within a file is one deeper than the file.
    let inner = usize::from(file.is_test(line) && !file.test_only);
    (supers > 0 && supers == file.depth() + inner).then(|| path.get(supers).map(String::as_str)).flatten()
}
