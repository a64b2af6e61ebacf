//! Paths, words and macros in code: enough of the language for the rules, and no more.
//! Must not know a rule, nor see comments or strings: they are blank in what it is given.
//! Main functions: [`paths`], [`calls`], [`macros`], [`words`].

/// A token and its line, from 1.
#[derive(Debug, Clone, PartialEq)]
enum Token {
    Word(String),
    /// `::`
    Join,
    Sign(char),
}

fn tokens(code: &str) -> Vec<(usize, Token)> {
    let mut found = Vec::new();
    for (k, line) in code.lines().enumerate() {
        let mut rest = line;
        while let Some(c) = rest.chars().next() {
            let word = rest.find(|c: char| !c.is_alphanumeric() && c != '_').unwrap_or(rest.len());
            let (token, length) = if word > 0 {
                (Some(Token::Word(rest[..word].to_owned())), word)
            } else if rest.starts_with("::") {
                (Some(Token::Join), 2)
            } else {
                (Some(Token::Sign(c)).filter(|_| !c.is_whitespace()), c.len_utf8())
            };
            found.extend(token.map(|token| (k + 1, token)));
            rest = &rest[length..];
        }
    }
    found
}

/// Every path of two or more parts, and every `use`, its groups written out: (line, parts).
pub fn paths(code: &str) -> Vec<(usize, Vec<String>)> {
    let tokens = tokens(code);
    let mut found = Vec::new();
    let mut at = 0;
    while at < tokens.len() {
        match &tokens[at].1 {
            Token::Word(word) if word == "use" => {
                at += 1;
                tree(&tokens, &mut at, &[], &mut found);
            }
            Token::Word(word) if tokens.get(at + 1).map(|(_, token)| token) == Some(&Token::Join) => {
                let line = tokens[at].0;
                let mut path = vec![word.clone()];
                while let (Some((_, Token::Join)), Some((_, Token::Word(next)))) =
                    (tokens.get(at + 1), tokens.get(at + 2))
                {
                    path.push(next.clone());
                    at += 2;
                }
                found.push((line, path));
                at += 1;
            }
            _ => at += 1,
        }
    }
    found
}

/// One tree of a `use`, to its comma, brace or semicolon.
fn tree(tokens: &[(usize, Token)], at: &mut usize, before: &[String], found: &mut Vec<(usize, Vec<String>)>) {
    let mut path = before.to_vec();
    let mut line = tokens.get(*at).map_or(0, |(line, _)| *line);
    let mut grouped = false;
    while let Some((here, token)) = tokens.get(*at) {
        match token {
            Token::Word(word) if word == "as" => *at += 1,
            Token::Word(word) => {
                path.push(word.clone());
                line = *here;
            }
            Token::Sign('{') => {
                grouped = true;
                while !matches!(tokens.get(*at), None | Some((_, Token::Sign('}')))) {
                    *at += 1;
                    tree(tokens, at, &path, found);
                }
            }
            Token::Sign(',' | '}' | ';') => break,
            Token::Join | Token::Sign(_) => {}
        }
        *at += 1;
    }
    if !grouped && path.len() > before.len() {
        found.push((line, path));
    }
}

/// Every `.name(`: (line, name).
pub fn calls(code: &str) -> Vec<(usize, String)> {
    let tokens = tokens(code);
    let called = |window: &[(usize, Token)]| match (&window[0].1, &window[1], &window[2].1) {
        (Token::Sign('.'), (line, Token::Word(name)), Token::Sign('(')) => Some((*line, name.clone())),
        _ => None,
    };
    tokens.windows(3).filter_map(called).collect()
}

/// Every `name!`: (line, name).
pub fn macros(code: &str) -> Vec<(usize, String)> {
    let tokens = tokens(code);
    let used = |window: &[(usize, Token)]| match (&window[0], &window[1].1, &window[2].1) {
        ((line, Token::Word(name)), Token::Sign('!'), next) if *next != Token::Sign('=') => Some((*line, name.clone())),
        _ => None,
    };
    tokens.windows(3).filter_map(used).collect()
}

/// Every word: (line, word).
pub fn words(code: &str) -> Vec<(usize, String)> {
    let word = |(line, token)| match token {
        Token::Word(word) => Some((line, word)),
        _ => None,
    };
    tokens(code).into_iter().filter_map(word).collect()
}

#[test]
fn groups_are_written_out() {
    let joined =
        |code: &str| paths(code).iter().map(|(line, path)| format!("{line} {}", path.join("::"))).collect::<Vec<_>>();
    let code = "use std::{fs, io::{self, Write as _}};\nlet a = crate::run::Run::open(x);\nuse crate::{\n  limits::Limits,\n  run,\n};\na";
    let expected = [
        "1 std::fs",
        "1 std::io::self",
        "1 std::io::Write",
        "2 crate::run::Run::open",
        "4 crate::limits::Limits",
        "5 crate::run",
    ];
    assert_eq!(joined(code), expected);
    assert_eq!(calls("a.unwrap(); b.unwrap_or(1)"), [(1, "unwrap".to_owned()), (1, "unwrap_or".to_owned())]);
    assert_eq!(macros("panic!(); a != b; x!{}"), [(1, "panic".to_owned()), (1, "x".to_owned())]);
}
