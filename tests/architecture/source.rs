//! Files of `src/` as the rules see them: text, code without comments and strings, and which lines are tests.
//! Must not know a rule.
//! Main type: [`Source`]; main function: [`tree`].

use std::fs;
use std::path::Path;

/// One file.
pub struct Source {
    /// Path below `src/`, with `/`.
    pub path: String,
    /// As it stands.
    pub text: String,
    /// The same length and lines, comments blank, insides of strings and characters as `_`.
    pub code: String,
    /// The whole file is compiled for tests only.
    pub test_only: bool,
    /// For each line, whether it is compiled for tests only.
    test_lines: Vec<bool>,
}

impl Source {
    pub fn new(path: &str, text: &str) -> Self {
        let code = masked(text);
        let test_lines = test_lines(&code);
        Self { path: path.to_owned(), text: text.to_owned(), code, test_only: false, test_lines }
    }

    /// First folder (or file without its ending) of the path: the module that the layers know.
    pub fn module(&self) -> &str {
        let first = self.path.split('/').next().unwrap_or_default();
        first.strip_suffix(".rs").unwrap_or(first)
    }

    /// How many `super` lead from the top of this file to the root of the crate.
    pub fn depth(&self) -> usize {
        let folders = self.path.matches('/').count();
        let is_root = matches!(self.path.as_str(), "lib.rs" | "main.rs");
        if is_root { 0 } else { folders + usize::from(!self.path.ends_with("/mod.rs")) }
    }

    /// Whether a line, from 1, is compiled for tests only.
    pub fn is_test(&self, line: usize) -> bool {
        self.test_only || self.test_lines.get(line - 1).copied().unwrap_or(false)
    }

    /// Files that this one includes for tests only: path below `src/`, without ending.
    fn test_files(&self) -> Vec<String> {
        let folder = match self.path.rsplit_once('/') {
            Some((folder, "mod.rs")) => folder.to_owned(),
            _ => self.path.trim_end_matches(".rs").to_owned(),
        };
        let beside = self.path.rsplit_once('/').map_or("", |(folder, _)| folder);
        let lines: Vec<&str> = self.text.lines().collect();
        let mut files = Vec::new();
        for (k, line) in lines.iter().enumerate().filter(|(k, _)| self.test_lines[*k]) {
            let Some(name) = line.trim().strip_suffix(';').and_then(|line| line.split("mod ").nth(1)) else { continue };
            let before = k.checked_sub(1).map_or("", |k| lines[k]).trim();
            files.push(match before.strip_prefix("#[path = \"").and_then(|rest| rest.strip_suffix(".rs\"]")) {
                Some(named) => format!("{beside}/{named}"),
                None => format!("{folder}/{name}"),
            });
        }
        files
    }
}

/// Every `.rs` file of `src/`, in the order of their paths.
pub fn tree() -> Vec<Source> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Vec::new();
    gather(&root, "", &mut files);
    files.sort_by(|a, b| a.path.cmp(&b.path));
    let test_files: Vec<String> = files.iter().flat_map(Source::test_files).collect();
    for file in &mut files {
        let within = |test: &String| file.path == format!("{test}.rs") || file.path.starts_with(&format!("{test}/"));
        file.test_only = test_files.iter().any(within);
    }
    files
}

fn gather(folder: &Path, below: &str, files: &mut Vec<Source>) {
    for entry in fs::read_dir(folder).unwrap().map(Result::unwrap) {
        let name = entry.file_name().into_string().unwrap();
        let path = format!("{below}{name}");
        if entry.path().is_dir() {
            gather(&entry.path(), &format!("{path}/"), files);
        } else if name.ends_with(".rs") {
            files.push(Source::new(&path, &fs::read_to_string(entry.path()).unwrap()));
        }
    }
}

/// Code alone: comments become blanks, the insides of strings and characters `_`; line ends stay.
fn masked(text: &str) -> String {
    let chars: Vec<char> = text.chars().collect();
    let mut out = String::with_capacity(text.len());
    let mut at = 0;
    while at < chars.len() {
        let (length, by) = match (chars[at], chars.get(at + 1)) {
            ('/', Some('/')) => (chars[at..].iter().take_while(|c| **c != '\n').count(), ' '),
            ('/', Some('*')) => (block_comment(&chars[at..]), ' '),
            ('"', _) => (string(&chars[at..]), '_'),
            ('r', Some('"' | '#')) if !is_word(at.checked_sub(1).map(|k| chars[k])) => (raw_string(&chars[at..]), '_'),
            ('\'', _) => (character(&chars[at..]), '_'),
            _ => (0, ' '),
        };
        if length == 0 {
            out.push(chars[at]);
            at += 1;
            continue;
        }
        for (k, c) in chars[at..at + length].iter().enumerate() {
            let edge = by == '_' && (k == 0 || k + 1 == length);
            out.push(if *c == '\n' || edge { *c } else { by });
        }
        at += length;
    }
    out
}

fn is_word(c: Option<char>) -> bool {
    c.is_some_and(|c| c.is_alphanumeric() || c == '_')
}

fn block_comment(chars: &[char]) -> usize {
    let (mut depth, mut at) = (0, 0);
    while at + 1 < chars.len() {
        match (chars[at], chars[at + 1]) {
            ('/', '*') => (depth, at) = (depth + 1, at + 2),
            ('*', '/') => (depth, at) = (depth - 1, at + 2),
            _ => at += 1,
        }
        if depth == 0 {
            return at;
        }
    }
    chars.len()
}

fn string(chars: &[char]) -> usize {
    let mut at = 1;
    while at < chars.len() && chars[at] != '"' {
        at += if chars[at] == '\\' { 2 } else { 1 };
    }
    (at + 1).min(chars.len())
}

/// Length of a raw string, or 0 if it is a raw identifier.
fn raw_string(chars: &[char]) -> usize {
    let hashes = chars[1..].iter().take_while(|c| **c == '#').count();
    if chars.get(1 + hashes) != Some(&'"') {
        return 0;
    }
    let end: Vec<char> = std::iter::once('"').chain(std::iter::repeat_n('#', hashes)).collect();
    let begin = 2 + hashes;
    let inside = chars[begin..].windows(end.len()).position(|window| window == end);
    inside.map_or(chars.len(), |inside| begin + inside + end.len())
}

/// Length of a character, or 0 if it is a lifetime.
fn character(chars: &[char]) -> usize {
    match chars.get(1) {
        Some('\\') => chars[3..].iter().position(|c| *c == '\'').map_or(0, |k| k + 4),
        Some(_) if chars.get(2) == Some(&'\'') => 3,
        _ => 0,
    }
}

/// Lines below `#[cfg(test)]`, to the end of the item it stands on.
fn test_lines(code: &str) -> Vec<bool> {
    let mut lines = vec![false; code.lines().count()];
    for (begin, mark) in code.match_indices("#[cfg(test)]") {
        let rest = &code[begin + mark.len()..];
        let mut depth = 0_usize;
        let mut end = rest.len();
        for (k, c) in rest.char_indices() {
            match c {
                '{' => depth += 1,
                '}' => depth = depth.saturating_sub(1),
                _ => {}
            }
            if depth == 0 && matches!(c, '}' | ';') {
                end = k;
                break;
            }
        }
        let line_at = |at: usize| code[..at].matches('\n').count();
        let (first, last) = (line_at(begin), line_at(begin + mark.len() + end));
        lines.iter_mut().take(last + 1).skip(first).for_each(|is_test| *is_test = true);
    }
    lines
}

#[test]
fn comments_strings_and_lifetimes_are_told_apart() {
    let code = |text: &str| masked(text);
    assert_eq!(code("a // b\nc"), "a     \nc");
    assert_eq!(code("a /* b /* c */ d */ e"), "a                   e");
    assert_eq!(code(r#"f("x\"//", 1)"#), r#"f("_____", 1)"#);
    assert_eq!(code(r##"r#"a"b"#;"##), "r______#;");
    assert_eq!(code("<'a> '{' '\\'' b"), "<'a> '_' '__' b");
}

#[test]
fn test_items_are_found_to_their_end() {
    let text =
        "fn a() {}\n#[cfg(test)]\nmod tests {\n    fn b() { '}'; }\n}\nfn c() {}\n#[cfg(test)]\nuse x::y;\nfn d() {}";
    let file = Source::new("a/b.rs", text);
    let tests: Vec<usize> = (1..=9).filter(|line| file.is_test(*line)).collect();
    assert_eq!(tests, [2, 3, 4, 5, 7, 8]);
    let outside = Source::new("a/mod.rs", "#[cfg(test)]\nmod tests;\n#[cfg(test)]\n#[path = \"b_tests.rs\"]\nmod b;\n");
    assert_eq!(outside.test_files(), ["a/tests", "a/b_tests"]);
}
