//! A channel's file given alone: the files beside it that hold the other channels of the same capture.
//! Must not read samples.
//! Main function: [`beside`]; main type: [`Siblings`].

use std::path::{Path, PathBuf};

use crate::capture::{is_channel_name, natural_order, pair_names};

/// What is said of a capture that one channel's file alone could not give.
pub(super) const MISSING: &str = "the name says one channel of several, and no other lies beside it: give the other channel's \
                                  file too, or put it in the same folder";

/// What was found beside a group of files.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Siblings {
    /// Not named as one channel, or several files were given.
    NotSought,
    /// Named as one channel, alone.
    Missing,
    /// The other channels' files.
    Found(Vec<PathBuf>),
}

/// Looks beside a lone file for the other channels of its capture (`F0001CH1.CSV` → `F0001CH2.CSV`).
pub(super) fn beside(files: &[PathBuf]) -> Siblings {
    let [file] = files else { return Siblings::NotSought };
    let Some(name) = file.file_name().and_then(|name| name.to_str()).filter(|name| is_channel_name(name)) else {
        return Siblings::NotSought;
    };
    let mut names: Vec<String> = others(file).into_iter().filter(|other| other != name).collect();
    names.sort_by(|a, b| natural_order(a, b));
    names.insert(0, name.to_owned());
    let group = pair_names(&names).into_iter().find(|group| group.first() == Some(&0)).unwrap_or_default();
    let found: Vec<PathBuf> = group.iter().skip(1).map(|&index| file.with_file_name(&names[index])).collect();
    if found.is_empty() { Siblings::Missing } else { Siblings::Found(found) }
}

/// Names of the files in the folder of a file; none if it cannot be listed.
fn others(file: &Path) -> Vec<String> {
    let folder = file.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let entries = std::fs::read_dir(folder).into_iter().flatten().flatten();
    entries.filter(|entry| entry.path().is_file()).filter_map(|entry| entry.file_name().into_string().ok()).collect()
}
