//! The rules that look at one file at a time.
//! Must not know the layers' table by heart: [`super::layers`] does.
//! Main functions: one a rule, each returning its breaches.

use super::Breach;
use super::layers::layer;
use super::source::Source;
use super::tokens::{calls, macros, paths, words};

/// First layer that may do I/O and read a clock.
const FIRST_WITH_IO: usize = 5;
/// Most lines of code in a file: lines that are neither blank nor comment alone; unit tests count.
const MOST_LINES: usize = 400;
/// Files over that for now, and how long they may be until they are split. Only ever shorten this list.
const TOO_LONG: &[(&str, usize)] = &[];

/// Parts of the standard library that reach the world.
const STD_IO: &[&str] = &["fs", "net", "env", "io", "process", "thread", "os"];
/// Clocks and chance that is not seeded, wherever they come from.
const UNREPEATABLE: &[&str] = &["Instant", "SystemTime", "OsRng", "ThreadRng", "thread_rng", "getrandom"];
/// Crates that are I/O, or the reader of arguments.
const IO_CRATES: &[&str] = &["rusqlite", "postgres", "tokio", "axum", "serialport", "ureq", "tempfile", "clap"];
const PRINTS: &[&str] = &["print", "println", "eprint", "eprintln", "dbg"];
/// Questions to the disk that need no import.
const DISK_CALLS: &[&str] = &["is_file", "is_dir", "read_dir", "canonicalize", "try_exists", "symlink_metadata"];

/// Rule: no I/O and no clock below L5, but in tests.
pub fn io(file: &Source) -> Vec<Breach> {
    if layer(file.module()).is_none_or(|own| own >= FIRST_WITH_IO) {
        return Vec::new();
    }
    let mut found = Vec::new();
    let mut report = |line, what: String| {
        if !file.is_test(line) {
            found.push((file.path.clone(), line, format!("{what} below the layers that do I/O")));
        }
    };
    for (line, path) in paths(&file.code) {
        let parts: Vec<&str> = path.iter().map(String::as_str).collect();
        let reaches = match parts[..] {
            ["std", part, ..] => STD_IO.contains(&part),
            ["File" | "OpenOptions" | "fs" | "io" | "env", ..] => parts.len() > 1,
            ["Utc" | "Local", "now"] | ["chrono", "Utc" | "Local", "now"] => true,
            [first, ..] => IO_CRATES.contains(&first),
            [] => false,
        };
        if reaches || parts.iter().any(|part| UNREPEATABLE.contains(part)) {
            report(line, format!("`{}`", path.join("::")));
        }
    }
    macros(&file.code).iter().filter(|(_, name)| PRINTS.contains(&name.as_str())).for_each(|(line, name)| {
        report(*line, format!("`{name}!`"));
    });
    calls(&file.code).iter().filter(|(_, name)| DISK_CALLS.contains(&name.as_str())).for_each(|(line, name)| {
        report(*line, format!("`.{name}()`"));
    });
    found
}

/// Rule: a file opens with at least two lines `//!`, one of which says what it must not do.
pub fn purpose(file: &Source) -> Vec<Breach> {
    let head: Vec<&str> = file.text.lines().take_while(|line| line.starts_with("//!")).collect();
    let says = |line: &&str| line.contains("Must not") || line.contains("must not") || line.contains("never");
    if head.len() >= 2 && head.iter().any(says) {
        return Vec::new();
    }
    vec![(file.path.clone(), 1, "opens without its purpose lines `//!`: its job, and what it must not do".to_owned())]
}

/// Rule: at most [`MOST_LINES`] lines of code.
pub fn length(file: &Source) -> Vec<Breach> {
    let n = file.code.lines().filter(|line| !line.trim().is_empty()).count();
    let known = TOO_LONG.iter().find(|(path, _)| *path == file.path).map(|(_, most)| *most);
    let most = known.unwrap_or(MOST_LINES);
    let what = if n > most {
        format!("{n} lines of code; at most {most}")
    } else if known.is_some() && n <= MOST_LINES {
        "no longer too long: take it off the list in tests/architecture/rules.rs".to_owned()
    } else {
        return Vec::new();
    };
    vec![(file.path.clone(), 1, what)]
}

/// Rule: nothing outside tests that panics on purpose.
pub fn panics(file: &Source) -> Vec<Breach> {
    let panicking = |name: &str| matches!(name, "panic" | "todo" | "unimplemented" | "unreachable");
    let aborting = |name: &str| matches!(name, "unwrap" | "expect" | "unwrap_err" | "expect_err");
    let used =
        macros(&file.code).into_iter().filter(|(_, name)| panicking(name)).map(|(line, name)| (line, name + "!"));
    let called = calls(&file.code).into_iter().filter(|(_, name)| aborting(name));
    let called = called.map(|(line, name)| (line, format!(".{name}()")));
    let outside = used.chain(called).filter(|(line, _)| !file.is_test(*line));
    outside.map(|(line, name)| (file.path.clone(), line, format!("`{name}` outside tests"))).collect()
}

/// Rule: no `unsafe`, anywhere.
pub fn unsafe_code(file: &Source) -> Vec<Breach> {
    let found = words(&file.code).into_iter().filter(|(_, word)| word == "unsafe");
    found.map(|(line, _)| (file.path.clone(), line, "`unsafe`".to_owned())).collect()
}

/// Where types have a stored form.
const SERDE: &[&str] = &["record", "limits", "recipe", "station", "store", "page", "cli"];
/// Where such types, or values without a type, become bytes: no derive and no type of their own.
const JSON: &[&str] = &["disk", "report"];

/// Rule: serde where stored forms are, and nowhere else.
pub fn serde(file: &Source) -> Vec<Breach> {
    let own = file.module();
    if SERDE.contains(&own) {
        return Vec::new();
    }
    let forbidden = |word: &str| match word {
        "serde" | "Serialize" | "Deserialize" => true,
        "serde_json" => !JSON.contains(&own),
        _ => false,
    };
    let found = words(&file.code).into_iter().filter(|(_, word)| forbidden(word));
    found.map(|(line, word)| (file.path.clone(), line, format!("`{word}` in `{own}`"))).collect()
}

/// Rule: no module named for nothing; an `error` of the whole crate neither.
pub fn names(file: &Source) -> Vec<Breach> {
    let drawer = |name: &str| matches!(name, "util" | "utils" | "common" | "prelude" | "helpers" | "misc");
    let parts: Vec<&str> = file.path.split('/').map(|part| part.trim_end_matches(".rs")).collect();
    let crate_wide = |name: &str| matches!(name, "error" | "errors");
    let bad = parts.iter().find(|part| drawer(part)).or(parts.first().filter(|part| crate_wide(part)));
    bad.map(|name| (file.path.clone(), 1, format!("a module named `{name}`"))).into_iter().collect()
}

/// Rule: within `run`, step kinds are named in the table of `run/steps/mod.rs` only.
pub fn kinds(file: &Source) -> Vec<Breach> {
    if file.module() != "run" || file.path == "run/steps/mod.rs" {
        return Vec::new();
    }
    let found = words(&file.code).into_iter().filter(|(line, word)| word == "StepKind" && !file.is_test(*line));
    found.map(|(line, _)| (file.path.clone(), line, "`StepKind` outside the table of kinds".to_owned())).collect()
}

/// Where phrases are written down: the table, and the names of the catalogue.
const PHRASES: &[&str] = &["phrase/", "measurand/catalogue.rs"];

/// Rule: no sentence of a sheet outside the table. A literal goes into a saying through none of its doors.
pub fn sentences(file: &Source) -> Vec<Breach> {
    if PHRASES.iter().any(|place| file.path.starts_with(place)) {
        return Vec::new();
    }
    let doors = ["Saying::outside(", "Saying::of(name(", "name(", "Phrase::new("];
    let opens = |text: &str, code: &str| {
        doors.iter().any(|door| {
            text.match_indices(&format!("{door}\"")).any(|(at, _)| {
                let before = text[..at].chars().next_back();
                // A longer name, a method or a path is another function; a comment is masked in the code.
                let own = before.is_none_or(|c| !c.is_alphanumeric() && !"_.".contains(c));
                own && code.get(at..at + door.len()) == Some(*door)
            })
        })
    };
    let lines = file.text.lines().zip(file.code.lines()).enumerate();
    let found = lines.filter(|(i, (text, code))| !file.is_test(i + 1) && opens(text, code));
    let what = "a literal on the sheet; write it as a phrase in `src/phrase/`";
    found.map(|(i, _)| (file.path.clone(), i + 1, what.to_owned())).collect()
}
