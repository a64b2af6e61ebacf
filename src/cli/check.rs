//! `tubewright check`: reads files that people wrote and says everything that is wrong with them.
//! Must not use a file for anything else.
//! Main items: [`CheckArgs`], [`check`], [`check_texts`].

use std::{
    fs,
    io::{self, Write},
    path::{Path, PathBuf},
};

use crate::{
    disk::said,
    limits::{Fault, Limits, nearest, reading::top_keys},
    recipe::Recipe,
    station::{answers::Answers, file::StationFile},
};

/// Arguments of `check`.
#[derive(Debug, Clone, PartialEq, clap::Args)]
pub struct CheckArgs {
    /// Files, or folders that hold some; the home's `limits` folder where none is given
    #[arg(value_name = "PATH")]
    pub paths: Vec<PathBuf>,
}

/// What a file is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Kind {
    Limits,
    Recipe,
    Station,
    Answers,
    /// Read by somebody else, or a note beside a data file.
    Other,
}

/// Deepest folder that is searched: a home is three deep.
const DEEPEST: usize = 8;

/// Reads every path and prints every fault, then how many there are.
///
/// * `home`: searched where no path is given.
/// * `out`: faults, one or two lines each, in the order of the paths, then of the file.
///
/// Returns the number of faults: any gives exit status 30. Errors: the writer's.
pub fn check(args: &CheckArgs, home: Option<&Path>, out: &mut dyn Write) -> io::Result<usize> {
    let mut faults = Vec::new();
    let mut texts = Vec::new();
    let of_home: Vec<PathBuf> = home.map(|home| home.join("limits")).into_iter().collect();
    let paths = if args.paths.is_empty() { &of_home } else { &args.paths };
    if paths.is_empty() {
        faults.push(Fault::of_file(".", "no home found; expected a path, or a folder with `limits/`"));
    }
    for path in paths {
        gather(path, 0, &mut texts, &mut faults);
    }
    let files: Vec<(&str, &str)> = texts.iter().map(|(name, text)| (name.as_str(), text.as_str())).collect();
    faults.extend(check_texts(&files));
    for fault in &faults {
        writeln!(out, "{fault}")?;
    }
    let plural = |n: usize| if n == 1 { "" } else { "s" };
    let (n, m) = (faults.len(), files.len());
    writeln!(out, "{n} fault{} in {m} file{}", plural(n), plural(m))?;
    Ok(faults.len())
}

/// Reads a file, or the files of a folder in the order of their names.
fn gather(path: &Path, depth: usize, texts: &mut Vec<(String, String)>, faults: &mut Vec<Fault>) {
    let name = path.display().to_string();
    if path.is_dir() {
        if depth >= DEEPEST {
            return faults.push(Fault::of_file(&name, format!("more than {DEEPEST} folders deep; expected fewer")));
        }
        let entries = fs::read_dir(path).and_then(|entries| entries.collect::<Result<Vec<_>, _>>());
        match entries {
            Ok(mut entries) => {
                entries.sort_by_key(fs::DirEntry::file_name);
                let is_wanted = |path: &Path| path.is_dir() || path.extension().is_some_and(|end| end == "toml");
                let before = texts.len();
                for entry in entries.iter().filter(|entry| is_wanted(&entry.path())) {
                    gather(&entry.path(), depth + 1, texts, faults);
                }
                let has = |wanted: &str| entries.iter().any(|entry| entry.file_name() == *wanted);
                for (there, missing) in [("limits.toml", "recipe.toml"), ("recipe.toml", "limits.toml")] {
                    if has(there) && !has(missing) {
                        let message = format!("a tube type with `{there}` but no `{missing}`; expected both");
                        faults.push(Fault::of_file(&name, message));
                    }
                }
                if depth == 0 && texts.len() == before && faults.is_empty() {
                    faults.push(Fault::of_file(&name, "the folder holds no `.toml` file; expected at least one"));
                }
            }
            Err(error) => faults.push(Fault::of_file(&name, format!("the folder cannot be read: {}", said(&error)))),
        }
        return;
    }
    match fs::read_to_string(path) {
        // Of a folder's files, notes and scenarios are left alone; a file that was named must be one of ours.
        Ok(text) if depth > 0 && kind(&name, &text) == Kind::Other => {}
        Ok(text) => texts.push((name, text)),
        Err(error) if error.kind() == io::ErrorKind::InvalidData => {
            faults.push(Fault::of_file(&name, "the file is not UTF-8; expected plain text"));
        }
        Err(error) => faults.push(Fault::of_file(&name, format!("the file cannot be read: {}", said(&error)))),
    }
}

/// Every fault of some files, in the order of the files, then of each file.
///
/// * `files`: (name, text). A limits file is checked against the recipe of the same folder, if that is among them.
pub fn check_texts(files: &[(&str, &str)]) -> Vec<Fault> {
    files.iter().flat_map(|(name, text)| check_text(name, text, files)).collect()
}

fn check_text(name: &str, text: &str, files: &[(&str, &str)]) -> Vec<Fault> {
    match kind(name, text) {
        Kind::Limits => {
            let beside =
                |(other, text): &&(&str, &str)| folder(other) == folder(name) && kind(other, text) == Kind::Recipe;
            // A faulty recipe fills nothing for certain: its own faults are enough.
            match files.iter().find(beside).and_then(|(name, text)| Recipe::parse(name, text).ok()) {
                Some(recipe) => faults_of(Limits::parse_for(name, text, &recipe.fillable())),
                None => faults_of(Limits::parse(name, text)),
            }
        }
        Kind::Recipe => faults_of(Recipe::parse(name, text)),
        Kind::Station => faults_of(StationFile::parse(name, text)),
        Kind::Answers => faults_of(Answers::parse(name, text)),
        Kind::Other => {
            let expected = "expected a limits, recipe, station or answer file";
            let known = ["limits.toml", "recipe.toml", "station.toml", "answers.toml"];
            let message = format!("the file is of no known kind by its name or its keys; {expected}");
            let nearest = nearest(file_name(name), known).map(str::to_owned);
            vec![Fault { nearest, ..Fault::of_file(name, message) }]
        }
    }
}

fn faults_of<T>(read: Result<T, Vec<Fault>>) -> Vec<Fault> {
    read.err().unwrap_or_default()
}

fn file_name(name: &str) -> &str {
    name.rsplit(['/', '\\']).next().unwrap_or(name)
}

fn folder(name: &str) -> &str {
    name.strip_suffix(file_name(name)).unwrap_or("")
}

/// By name, else by the keys that only one kind has.
fn kind(name: &str, text: &str) -> Kind {
    let file = file_name(name);
    match file {
        "limits.toml" => return Kind::Limits,
        "recipe.toml" => return Kind::Recipe,
        "station.toml" => return Kind::Station,
        "answers.toml" => return Kind::Answers,
        "scenario.toml" => return Kind::Other,
        note if note.ends_with(".about.toml") => return Kind::Other,
        _ => {}
    }
    let keys = top_keys(text);
    let has = |any: &[&str]| keys.iter().any(|key| any.contains(&key.as_str()));
    // A scenario has tubes, and may share other keys with any of the kinds.
    if has(&["tube", "tubes", "origin", "made_by"]) {
        Kind::Other
    } else if has(&["limit", "grades"]) {
        Kind::Limits
    } else if has(&["step", "nominal_spacing", "mode_floor"]) {
        Kind::Recipe
    } else if has(&["station", "interferometer", "power_meter", "time_zone", "shifts"]) {
        Kind::Station
    } else if has(&["steps", "technician", "time_to_answer"]) {
        Kind::Answers
    } else {
        Kind::Other
    }
}
