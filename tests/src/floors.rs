//! The import direction of modules, read from the source text: which floors a file names, and whether it may.

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

/// Where a module may be named although it stands higher, and why.
#[derive(Clone, Copy, Debug)]
pub struct Exception {
    /// The floor that names.
    pub from: &'static str,
    /// The higher floor.
    pub to: &'static str,
    /// The items of it that may be named.
    pub items: &'static [&'static str],
    /// Why.
    pub reason: &'static str,
}

/// A forbidden import.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Violation {
    /// The file.
    pub file: String,
    /// Line, from 1.
    pub line: usize,
    /// What is named, `crate::solve::Newton`.
    pub path: String,
    /// Why not.
    pub why: String,
}

/// A path that code names, from the crate's root on.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Named {
    /// Line, from 1.
    pub line: usize,
    /// Its parts after `crate`.
    pub parts: Vec<String>,
    /// Whether it stands in test code.
    pub in_tests: bool,
}

/// One file of Rust.
#[derive(Clone, Debug)]
pub struct Source {
    /// Where it is.
    pub path: PathBuf,
    /// Its module path below the crate's root.
    pub module: Vec<String>,
    /// Its text.
    pub text: String,
    /// Whether it is compiled for tests only: a module behind `#[cfg(test)]`, or below one.
    pub test_only: bool,
}

/// All Rust files below a folder, in order.
///
/// # Panics
/// Where the folder cannot be read: then there is nothing to test.
pub fn sources(root: &Path) -> Vec<Source> {
    let mut found = Vec::new();
    let mut folders = vec![root.to_path_buf()];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).expect("the source folder is readable") {
            let path = entry.expect("the source folder is readable").path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "rs") {
                let inside = path.strip_prefix(root).expect("it was found below it").with_extension("");
                let mut module: Vec<String> =
                    inside.components().map(|c| c.as_os_str().to_string_lossy().into_owned()).collect();
                if module.last().is_some_and(|last| last == "mod" || last == "lib" || last == "main") {
                    module.pop();
                }
                let text = std::fs::read_to_string(&path).expect("source files are text");
                found.push(Source { path, module, text, test_only: false });
            }
        }
    }
    found.sort_by(|a, b| a.path.cmp(&b.path));
    let behind_test: BTreeSet<Vec<String>> = found.iter().flat_map(test_modules).collect();
    for source in &mut found {
        source.test_only = (1..=source.module.len()).any(|n| behind_test.contains(&source.module[..n]));
    }
    found
}

/// The modules that a file declares behind `#[cfg(test)]`.
fn test_modules(source: &Source) -> Vec<Vec<String>> {
    let words: Vec<String> = tokens(&source.text).into_iter().map(|token| token.0).collect();
    let plain = ["#", "[", "cfg", "(", "test", ")", "]", "mod"];
    let shared = ["#", "[", "cfg", "(", "test", ")", "]", "pub", "(", "crate", ")", "mod"];
    let mut found = Vec::new();
    for marker in [&plain[..], &shared[..]] {
        for window in
            words.windows(marker.len() + 1).filter(|w| w.iter().zip(marker).all(|(word, m)| word == m))
        {
            found.push(source.module.iter().cloned().chain([window[marker.len()].clone()]).collect());
        }
    }
    found
}

/// What a file may not name, given the floors from the highest down.
pub fn violations(
    file: &str,
    module: &[String],
    text: &str,
    floors: &[&str],
    exceptions: &[Exception],
) -> Vec<Violation> {
    let Some(own) = module.first() else { return Vec::new() };
    let violation = |named: &Named, why: String| Violation {
        file: file.to_string(),
        line: named.line,
        path: format!("crate::{}", named.parts.join("::")),
        why,
    };
    let height = |floor: &str| floors.iter().position(|f| *f == floor);
    let Some(own_height) = height(own) else {
        let here = Named { line: 1, parts: module.to_vec(), in_tests: false };
        return vec![violation(&here, format!("`{own}` is no floor: give it its place in the list"))];
    };
    let mut found = Vec::new();
    for named in named_paths(module, text) {
        let Some(floor) = named.parts.first() else { continue };
        // tests of a floor may need the floors above it to have something to act on
        if named.in_tests || floor == own {
            continue;
        }
        let Some(other) = height(floor) else {
            found.push(violation(&named, format!("`{floor}` is no floor")));
            continue;
        };
        let item = named.parts.get(1).map(String::as_str).unwrap_or_default();
        let excepted = exceptions.iter().any(|e| e.from == own && e.to == floor && e.items.contains(&item));
        // the list goes from the top down, so a smaller number is a higher floor
        if other < own_height && !excepted {
            found.push(violation(&named, format!("`{own}` stands below `{floor}`")));
        }
    }
    found
}

/// Every path from the crate's root that code names: `crate::..` and `super::..`, in `use` and anywhere else.
pub fn named_paths(module: &[String], text: &str) -> Vec<Named> {
    let tokens = tokens(text);
    let test_file = module.iter().any(|part| part == "tests");
    let mut found = Vec::new();
    // inline modules that are open, with the depth of braces they were opened at
    let mut inline: Vec<(String, usize)> = Vec::new();
    let mut depth = 0;
    let mut at = 0;
    while at < tokens.len() {
        let word = &tokens[at].0;
        let after_path = at > 0 && tokens[at - 1].0 == "::";
        match word.as_str() {
            "{" => depth += 1,
            "}" => {
                depth -= 1;
                while inline.last().is_some_and(|(_, opened)| *opened == depth) {
                    inline.pop();
                }
            }
            "mod" if tokens.get(at + 2).is_some_and(|t| t.0 == "{") => {
                inline.push((tokens[at + 1].0.clone(), depth));
            }
            "crate" | "super" if !after_path && tokens.get(at + 1).is_some_and(|t| t.0 == "::") => {
                let mut prefix: Vec<String> = Vec::new();
                let mut next = at + 2;
                if word == "super" {
                    prefix =
                        module.iter().cloned().chain(inline.iter().map(|(name, _)| name.clone())).collect();
                    prefix.pop();
                    while tokens.get(next).is_some_and(|t| t.0 == "super") {
                        prefix.pop();
                        next += if tokens.get(next + 1).is_some_and(|t| t.0 == "::") { 2 } else { 1 };
                    }
                }
                let in_tests = test_file || inline.iter().any(|(name, _)| name == "tests");
                let mut paths = Vec::new();
                tree(&tokens, next, prefix, &mut paths);
                found.extend(paths.into_iter().map(|(parts, line)| Named { line, parts, in_tests }));
            }
            _ => {}
        }
        at += 1;
    }
    found
}

/// Reads a path, or a tree of paths in braces, from `at` on; the index after it.
fn tree(
    tokens: &[(String, usize)],
    mut at: usize,
    mut prefix: Vec<String>,
    out: &mut Vec<(Vec<String>, usize)>,
) -> usize {
    loop {
        let Some((word, line)) = tokens.get(at) else { return at };
        if word == "{" {
            at += 1;
            while tokens.get(at).is_some_and(|t| t.0 != "}") {
                at = tree(tokens, at, prefix.clone(), out);
                // `as name` and commas up to the next branch
                while tokens.get(at).is_some_and(|t| t.0 != "," && t.0 != "}") {
                    at += 1;
                }
                if tokens.get(at).is_some_and(|t| t.0 == ",") {
                    at += 1;
                }
            }
            return at + 1;
        }
        let is_word = word.chars().all(|c| c.is_alphanumeric() || c == '_') || word == "*";
        if !is_word {
            out.push((prefix, *line));
            return at;
        }
        if word != "self" && word != "*" {
            prefix.push(word.clone());
        }
        if tokens.get(at + 1).is_some_and(|t| t.0 == "::") {
            at += 2;
        } else {
            out.push((prefix, *line));
            return at + 1;
        }
    }
}

/// Words, `::` and single signs with their lines; comments, texts and characters are left out.
pub fn tokens(text: &str) -> Vec<(String, usize)> {
    let bytes: Vec<char> = text.chars().collect();
    let mut found = Vec::new();
    let mut line = 1;
    let mut at = 0;
    let peek = |at: usize| bytes.get(at).copied().unwrap_or('\0');
    while at < bytes.len() {
        let c = bytes[at];
        if c == '\n' {
            line += 1;
            at += 1;
        } else if c == '/' && peek(at + 1) == '/' {
            while at < bytes.len() && bytes[at] != '\n' {
                at += 1;
            }
        } else if c == '/' && peek(at + 1) == '*' {
            let mut open = 0;
            while at < bytes.len() {
                match (bytes[at], peek(at + 1)) {
                    ('/', '*') => (open, at) = (open + 1, at + 2),
                    ('*', '/') => (open, at) = (open - 1, at + 2),
                    ('\n', _) => (line, at) = (line + 1, at + 1),
                    _ => at += 1,
                }
                if open == 0 {
                    break;
                }
            }
        } else if c == 'r' && matches!(peek(at + 1), '"' | '#') && raw_text(&bytes, at).is_some() {
            let end = raw_text(&bytes, at).unwrap_or(bytes.len());
            line += bytes[at..end].iter().filter(|c| **c == '\n').count();
            at = end;
        } else if c == '"' {
            at += 1;
            while at < bytes.len() && bytes[at] != '"' {
                line += usize::from(bytes[at] == '\n');
                at += if bytes[at] == '\\' { 2 } else { 1 };
            }
            at += 1;
        } else if c == '\'' && (peek(at + 1) == '\\' || peek(at + 2) == '\'') {
            at += if peek(at + 1) == '\\' { 3 } else { 2 };
            while at < bytes.len() && bytes[at] != '\'' {
                at += 1;
            }
            at += 1;
        } else if c.is_alphanumeric() || c == '_' {
            let start = at;
            while peek(at).is_alphanumeric() || peek(at) == '_' {
                at += 1;
            }
            found.push((bytes[start..at].iter().collect(), line));
        } else if c == ':' && peek(at + 1) == ':' {
            found.push(("::".to_string(), line));
            at += 2;
        } else {
            if !c.is_whitespace() {
                found.push((c.to_string(), line));
            }
            at += 1;
        }
    }
    found
}

/// The index after a raw text that begins at `at` with `r`, if it is one.
fn raw_text(characters: &[char], at: usize) -> Option<usize> {
    let hashes = characters[at + 1..].iter().take_while(|c| **c == '#').count();
    let start = at + 1 + hashes;
    if characters.get(start) != Some(&'"') {
        return None;
    }
    (start + 1..characters.len())
        .find(|&i| characters[i] == '"' && (1..=hashes).all(|h| characters.get(i + h) == Some(&'#')))
        .map(|i| i + 1 + hashes)
}
