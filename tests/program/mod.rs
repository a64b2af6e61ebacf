//! Runs the built program as a child process and keeps what it said, how it ended and what it left in a folder.
//! Must not look into the library.
//! Main types: [`Ran`], [`Place`].

#![allow(dead_code, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

/// The built program.
pub const PROGRAM: &str = env!("CARGO_BIN_EXE_tubewright");

/// What a child process left behind.
#[derive(Debug)]
pub struct Ran {
    pub status: Option<i32>,
    pub out: String,
    pub err: String,
    /// Everything in the folder before and after: path and length.
    pub before: Vec<String>,
    pub after: Vec<String>,
}

impl Ran {
    /// The status is this one, standard error holds these words, and nothing panicked.
    #[track_caller]
    pub fn ends(&self, status: i32, words: &[&str]) -> &Self {
        assert_eq!(self.status, Some(status), "standard error: {}\nstandard output: {}", self.err, self.out);
        for word in words {
            let said = self.err.contains(word) || self.out.contains(word);
            assert!(said, "`{word}` is not said.\nstandard error: {}\nstandard output: {}", self.err, self.out);
        }
        self.is_calm();
        self
    }

    /// Nothing panicked.
    #[track_caller]
    pub fn is_calm(&self) {
        assert!(!self.err.contains("panicked"), "{}", self.err);
    }

    /// The folder is as it was.
    #[track_caller]
    pub fn leaves_nothing(&self) -> &Self {
        assert_eq!(self.before, self.after);
        self
    }

    /// What was there is as it was, and one whole record came beside it: nothing half-written, nothing else.
    #[track_caller]
    pub fn leaves_one_record(&self) -> &Self {
        let gone: Vec<_> = self.before.iter().filter(|line| !self.after.contains(line)).collect();
        assert!(gone.is_empty(), "changed or gone: {gone:?}");
        let is_new = |line: &&String| !self.before.contains(line) && !line.ends_with(" -");
        let name = |line: &String| {
            let path = line.rsplit_once(' ').map_or(line.as_str(), |(path, _)| path);
            path.rsplit('/').next().unwrap_or(path).to_owned()
        };
        let kept = |name: &String| !name.ends_with(".lock") && !Self::is_capture(name);
        let mut new: Vec<String> = self.after.iter().filter(is_new).map(name).filter(kept).collect();
        new.sort();
        assert_eq!(new, ["budget.csv", "events.jsonl", "record.csv", "record.csv-metadata.json", "record.pdf"]);
        self
    }

    /// A capture's name in a run folder: number, dash, its own name.
    fn is_capture(name: &str) -> bool {
        name.split_once('-').is_some_and(|(number, rest)| {
            number.len() == 6 && number.bytes().all(|b| b.is_ascii_digit()) && rest.ends_with(".csv")
        })
    }
}

/// A folder of its own for one test.
pub struct Place {
    folder: tempfile::TempDir,
}

impl Place {
    pub fn new() -> Self {
        Self { folder: tempfile::tempdir().unwrap() }
    }

    pub fn path(&self) -> &Path {
        self.folder.path()
    }

    pub fn join(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn write(&self, name: &str, bytes: impl AsRef<[u8]>) -> String {
        let path = self.join(name);
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(&path, bytes).unwrap();
        path.display().to_string()
    }

    /// Runs the program in this folder.
    pub fn run(&self, arguments: &[&str]) -> Ran {
        let before = listing(self.path());
        let output = self.command(arguments).stdin(Stdio::null()).output().unwrap();
        self.ran(before, output)
    }

    pub fn ran(&self, before: Vec<String>, output: Output) -> Ran {
        Ran {
            status: output.status.code(),
            out: String::from_utf8_lossy(&output.stdout).into_owned(),
            err: String::from_utf8_lossy(&output.stderr).into_owned(),
            before,
            after: listing(self.path()),
        }
    }

    pub fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(PROGRAM);
        command.args(arguments).current_dir(self.path()).env_remove("TUBEWRIGHT_HOME");
        command
    }

    /// `inspect` of a tube of the brisk bench, with more arguments.
    pub fn inspect(&self, serial: &str, more: &[&str]) -> Ran {
        self.run(&brisk(serial, more).iter().map(String::as_str).collect::<Vec<_>>())
    }

    /// The one file of a name below the folder.
    pub fn find(&self, name: &str) -> Option<PathBuf> {
        let wanted = listing(self.path()).into_iter().find_map(|line| {
            let path = line.rsplit_once(' ').unwrap().0.to_owned();
            (path.rsplit('/').next() == Some(name)).then_some(path)
        });
        wanted.map(|path| self.join(&path))
    }
}

/// Arguments of `inspect` on the brisk bench.
pub fn brisk(serial: &str, more: &[&str]) -> Vec<String> {
    let fixture = |name: &str| format!("{}/fixtures/brisk{name}", env!("CARGO_MANIFEST_DIR"));
    let mut arguments: Vec<String> = ["inspect", serial].map(str::to_owned).to_vec();
    let mut default = |option: &str, value: String| {
        if !more.contains(&option) {
            arguments.extend([option.to_owned(), value]);
        }
    };
    default("--reports", "reports".to_owned());
    default("--home", fixture(""));
    default("--station", fixture("/bench.toml"));
    if !more.contains(&"--captures") {
        default("--scenario", fixture("/scenario.toml"));
        default("--pace", "1000000x".to_owned());
    }
    arguments.extend(more.iter().map(|&argument| argument.to_owned()));
    arguments
}

/// Every file and folder below one, with lengths of files, sorted.
pub fn listing(folder: &Path) -> Vec<String> {
    let mut lines = Vec::new();
    let mut open = vec![folder.to_owned()];
    while let Some(next) = open.pop() {
        for entry in fs::read_dir(&next).unwrap() {
            let path = entry.unwrap().path();
            let name = path.strip_prefix(folder).unwrap().display().to_string();
            if path.is_dir() {
                lines.push(format!("{name}/ -"));
                open.push(path);
            } else {
                lines.push(format!("{name} {}", path.metadata().unwrap().len()));
            }
        }
    }
    lines.sort();
    lines
}

/// Text of a fixture of the brisk bench.
pub fn fixture(name: &str) -> String {
    fs::read_to_string(format!("{}/fixtures/brisk/{name}", env!("CARGO_MANIFEST_DIR"))).unwrap()
}
