//! Every rule, tried on a breach that was planted and on the same text without it: a rule that finds nothing is no rule.
//! Must not read `src/`.
//! Main function: `finds`.

use super::source::Source;
use super::{RULES, breaches};

/// No line.
const NONE: [usize; 0] = [];
const HEAD: &str = "//! A file.\n//! Must not do harm.\n";

/// Lines at which a rule finds a breach.
#[track_caller]
fn finds(rule: &str, path: &str, text: &str) -> Vec<usize> {
    let (_, check) = RULES.iter().find(|(name, _)| *name == rule).expect("a rule of the table");
    let found = breaches(*check, &[Source::new(path, text)]);
    let line = |text: &String| text.split(':').nth(1).and_then(|line| line.parse().ok()).expect("a line number");
    found.iter().map(line).collect()
}

#[test]
fn imports_up_or_sideways() {
    let of = |path: &str, text: &str| finds("imports", path, text);
    assert_eq!(of("sweep/a.rs", "use crate::run::Run;"), [1]);
    assert_eq!(of("sweep/a.rs", "use crate::{\n    numerics,\n    record::sheet::Row,\n};"), [3]);
    assert_eq!(of("sweep/a.rs", "use crate::{capture, numerics, uncertainty, tube};"), NONE);
    assert_eq!(of("sweep/a.rs", "fn f() { crate::limits::judge(); }"), [1]);
    assert_eq!(of("sweep/a.rs", "// crate::limits\nlet a = \"crate::limits::judge\";"), NONE);
    assert_eq!(of("phantom/a.rs", "use crate::tube::growth;"), [1], "the model shares no code with the engine");
    assert_eq!(of("phantom/a.rs", "use crate::{quantity, constants};"), NONE);
    assert_eq!(of("record/event.rs", "use crate::limits::Limits;"), [1]);
    assert_eq!(of("record/a.rs", "use crate::behaviour::Hop;"), [1]);
    assert_eq!(of("report/a.rs", "use crate::run::Run;"), [1]);
    assert_eq!(of("run/a.rs", "use crate::station::Want;"), NONE);
    assert_eq!(of("disk/a.rs", "use crate::driver::Driver;"), [1]);
    let in_tests = "#[cfg(test)]\nmod tests {\n    use crate::disk::Store;\n}\nuse crate::disk::Home;";
    assert_eq!(of("driver/a.rs", in_tests), [5]);
    assert_eq!(of("quantity/mod.rs", "use crate::numerics::peaks;"), [1]);
    assert_eq!(of("drawer/mod.rs", ""), [1], "a module without a layer");
}

#[test]
fn imports_by_super() {
    assert_eq!(finds("imports", "sweep/mod.rs", "use super::run::Run;"), [1]);
    assert_eq!(finds("imports", "sweep/a.rs", "use super::run::Run;"), NONE, "sweep's own");
    assert_eq!(finds("imports", "sweep/a.rs", "use super::super::run::Run;"), [1]);
    assert_eq!(finds("imports", "run/steps/a.rs", "use super::super::notebook::Notebook;"), NONE);
    let tests =
        "#[cfg(test)]\nmod tests {\n    use super::super::run::Run;\n    use super::super::super::disk::Home;\n}";
    assert_eq!(finds("imports", "sweep/a.rs", tests), [4]);
}

#[test]
fn io_and_clocks() {
    let planted = [
        "use std::fs;",
        "use std::{fmt, fs::File};",
        "fn f() { std::env::var(\"A\"); }",
        "fn f() { File::open(\"a\"); }",
        "fn f() { let a = Instant::now(); }",
        "use std::time::{Duration, SystemTime};",
        "fn f() { chrono::Utc::now(); }",
        "fn f() { Local::now(); }",
        "use std::net::TcpStream;",
        "fn f() { println!(\"a\"); }",
        "fn f(path: &Path) { path.is_file(); }",
        "use tokio::task;",
    ];
    for text in planted {
        assert_eq!(finds("io", "sweep/a.rs", text), [1], "{text}");
        assert_eq!(finds("io", "disk/a.rs", text), NONE, "{text}");
        let in_tests = format!("#[cfg(test)]\nmod tests {{\n{text}\n}}");
        assert_eq!(finds("io", "sweep/a.rs", &in_tests), NONE, "{text}");
    }
    for sound in ["use std::time::Duration;", "StationFile::parse(a);", "// std::fs", "let a = \"std::fs::read\";"] {
        assert_eq!(finds("io", "run/a.rs", sound), NONE, "{sound}");
    }
}

#[test]
fn purpose_lines() {
    assert_eq!(finds("purpose", "a/b.rs", HEAD), NONE);
    assert_eq!(finds("purpose", "a/b.rs", "use x;\n//! A file.\n//! Must not do harm.\n"), [1]);
    assert_eq!(finds("purpose", "a/b.rs", "//! Must not do harm.\n"), [1]);
    assert_eq!(finds("purpose", "a/b.rs", "//! A file.\n//! Of a kind.\n"), [1]);
}

#[test]
fn length() {
    let file = |n: usize| format!("{HEAD}\n{}", "let a = 1; // one\n\n// none\n".repeat(n));
    assert_eq!(finds("length", "a/b.rs", &file(400)), NONE);
    assert_eq!(finds("length", "a/b.rs", &file(401)), [1]);
}

#[test]
fn panics() {
    for text in ["a.unwrap();", "a\n    .expect(\"b\");", "panic!(\"a\");", "todo!()  ;", "unreachable!(\"a\");"] {
        assert_eq!(finds("panics", "cli/a.rs", text).len(), 1, "{text}");
        let in_tests = format!("#[cfg(test)]\nmod tests {{\n{text}\n}}");
        assert_eq!(finds("panics", "cli/a.rs", &in_tests), NONE, "{text}");
    }
    let after = "#[cfg(test)]\nmod tests {}\nfn f() { a.unwrap(); }";
    assert_eq!(finds("panics", "cli/a.rs", after), [3]);
    for sound in ["a.unwrap_or(1);", "// a.unwrap()", "let a = \"panic!()\";", "fn expect() {}"] {
        assert_eq!(finds("panics", "cli/a.rs", sound), NONE, "{sound}");
    }
}

#[test]
fn unsafe_code() {
    assert_eq!(finds("unsafe", "a/b.rs", "fn f() {\n    unsafe { g() }\n}"), [2]);
    assert_eq!(finds("unsafe", "a/b.rs", "let unsafe_yet = 1; // unsafe"), NONE);
}

#[test]
fn serde() {
    assert_eq!(finds("serde", "sweep/a.rs", "#[derive(Debug, Serialize)]\nstruct A;"), [1]);
    assert_eq!(finds("serde", "run/a.rs", "use serde::Deserialize;").len(), 2);
    assert_eq!(finds("serde", "report/a.rs", "serde_json::json!(1);"), NONE);
    assert_eq!(finds("serde", "run/a.rs", "serde_json::json!(1);"), [1]);
    assert_eq!(finds("serde", "disk/a.rs", "#[derive(serde::Serialize)]\nstruct A;").first(), Some(&1));
    assert_eq!(finds("serde", "record/a.rs", "#[derive(Serialize)]\nstruct A;"), NONE);
}

#[test]
fn names() {
    for path in ["util.rs", "sweep/common.rs", "run/prelude/mod.rs", "error.rs", "error/mod.rs"] {
        assert_eq!(finds("names", path, HEAD), [1], "{path}");
    }
    assert_eq!(finds("names", "capture/error.rs", HEAD), NONE, "errors live with the module that raises them");
}

#[test]
fn kinds() {
    assert_eq!(finds("kinds", "run/fold.rs", "use crate::recipe::StepKind;"), [1]);
    assert_eq!(finds("kinds", "run/steps/mod.rs", "use crate::recipe::StepKind;"), NONE);
}

#[test]
fn sentences_outside_the_table() {
    let of = |path: &str, text: &str| finds("sentences", path, text);
    assert_eq!(of("run/a.rs", "let a = 1;\nValue::Absent(Saying::outside(\"no light\"));"), [2]);
    assert_eq!(
        of("run/a.rs", "A.with([name(\"a few words\")]);\nstatic A: Phrase = Phrase::new(\"a\", \"b\");"),
        [1, 2]
    );
    assert_eq!(
        of("run/a.rs", "Saying::outside(reason); name(step); // name(\"a\")\nlet a = file_name(\"a\"); b.name(\"a\");"),
        NONE
    );
    assert_eq!(of("phrase/page.rs", "static A: Phrase = Phrase::new(\"a\", \"b\");"), NONE);
    assert_eq!(of("run/a.rs", "#[cfg(test)]\nmod tests {\n    fn a() { Saying::outside(\"b\"); }\n}"), NONE);
}
