//! The import direction: a module uses only the floors below it.

use std::path::{Path, PathBuf};

use epiloom_tests::floors::{Exception, Source, Violation, named_paths, sources, tokens, violations};

/// The floors of the solver, from the top down.
const FLOORS: &[&str] = &[
    "analysis",
    "solve",
    "discretise",
    "linear",
    "optics",
    "mesh",
    "device",
    "physics",
    "materials",
    "quantity",
    "math",
];

/// Upward names that are meant.
const EXCEPTIONS: &[Exception] = &[Exception {
    from: "device",
    to: "optics",
    items: &["Reflectance", "Film", "OpticalConstants"],
    reason: "the stack holds the description of its surfaces as plain data; the light's path is computed above",
}];

fn workspace() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("..")
}

fn check(module: &str, text: &str) -> Vec<Violation> {
    let module: Vec<String> = module.split("::").map(str::to_string).collect();
    violations("planted.rs", &module, text, FLOORS, EXCEPTIONS)
}

/// Source of truth: the list of floors in the design; no exception but those named here.
#[test]
fn the_solver_imports_downwards_only() {
    let root = workspace().join("solver/src");
    let files = sources(&root);
    assert!(files.len() > 40, "the solver's sources were found");
    let mut found = Vec::new();
    assert!(files.iter().any(|source| source.test_only), "modules of tests were told apart");
    for source in files.iter().filter(|source| !source.test_only) {
        let file = source.path.display().to_string();
        found.extend(violations(&file, &source.module, &source.text, FLOORS, EXCEPTIONS));
    }
    let list: Vec<String> =
        found.iter().map(|v| format!("{}:{}: {}: {}", v.file, v.line, v.path, v.why)).collect();
    assert!(list.is_empty(), "{}", list.join("\n"));
    assert!(EXCEPTIONS.iter().all(|e| !e.reason.is_empty()));
}

/// Source of truth: violations planted by hand in every spelling that Rust has for them.
#[test]
fn planted_violations_are_caught() {
    let bad = [
        ("physics::statistics", "use crate::solve::Newton;"),
        ("physics::statistics", "use crate::{math::Num, solve::{Newton as N, damping}};"),
        ("physics::statistics", "use super::super::mesh::Mesh;"),
        ("physics::statistics", "fn f() { let x = crate::device::Stack::new(); }"),
        ("physics", "pub use super::optics::Light;"),
        ("math::dual", "impl Foo for crate::quantity::constants::C {}"),
        ("device::stack", "use crate::optics::illumination::Illumination;"),
        ("mesh::grading", "mod inner { use super::super::super::solve::Newton; }"),
        ("linear::block", "#[rustfmt::skip]\nuse crate::\n    discretise::Row;"),
        ("physics", "use crate::gadgets::Thing;"),
        ("gadgets", ""),
    ];
    for (module, text) in bad {
        assert!(!check(module, text).is_empty(), "{module}: {text}");
    }
    let good = [
        (
            "solve::newton",
            "use crate::{discretise::Row, linear::Chain, math::Num}; use super::damping::Damping;",
        ),
        ("device::stack", "use crate::optics::Reflectance;"),
        (
            "physics",
            "// use crate::solve::Newton;\n/* crate::solve::Newton */ const T: &str = \"crate::solve\";",
        ),
        (
            "physics",
            "const R: &str = r#\"crate::solve::X \" \"#; const C: char = '\"'; use crate::math::Num;",
        ),
        ("physics::tests", "use crate::device::Stack;"),
        ("physics", "mod tests { use crate::device::Stack; }"),
        ("mesh::grading", "mod inner { use super::super::nesting::Nest; }"),
    ];
    for (module, text) in good {
        assert_eq!(check(module, text), Vec::new(), "{module}: {text}");
    }
    let named = named_paths(&["a".to_string()], "\nuse crate::{b::{C, d::*}, e as f, self};");
    let parts: Vec<String> = named.iter().map(|n| n.parts.join("::")).collect();
    assert_eq!(parts, ["b::C", "b::d", "e", ""]);
    assert_eq!(named[0].line, 2);
}

/// Source of truth: the design: the archive knows neither the language nor the command line, nor any of their crates.
#[test]
fn the_archive_stands_alone() {
    let forbidden_crates = ["rhai", "clap", "indicatif", "epiloom_solver", "annotate_snippets"];
    let forbidden_modules = ["language", "command", "diagnostics", "picture"];
    let root = workspace().join("scripting/src");
    let mut seen = 0;
    for Source { path, module, text, test_only } in sources(&root) {
        if test_only {
            continue;
        }
        let own = module.first().map(String::as_str).unwrap_or_default();
        let named = named_paths(&module, &text);
        let names = |other: &str| named.iter().any(|n| n.parts.first().is_some_and(|p| p == other));
        if own == "archive" {
            seen += 1;
            for word in tokens(&text) {
                assert!(
                    !forbidden_crates.contains(&word.0.as_str()),
                    "{}:{}: {}",
                    path.display(),
                    word.1,
                    word.0
                );
            }
            for other in forbidden_modules {
                assert!(!names(other), "{} names crate::{other}", path.display());
            }
        }
        if own == "language" || own == "diagnostics" {
            assert!(!names("command"), "{} names crate::command", path.display());
        }
        if own == "diagnostics" {
            assert!(!names("language") && !names("archive"), "{} names a module above it", path.display());
        }
    }
    assert!(seen > 5, "the archive's sources were found");
}

/// Source of truth: the design: the solver reads and writes nothing, keeps no clock, and no hash map decides an order.
#[test]
fn the_solver_does_no_input_or_output() {
    let forbidden = [
        "println",
        "eprintln",
        "print",
        "eprint",
        "dbg",
        "HashMap",
        "HashSet",
        "Instant",
        "SystemTime",
        "thread_local",
        "File",
        "stdin",
        "stdout",
        "stderr",
    ];
    for Source { path, text, test_only, .. } in sources(&workspace().join("solver/src")) {
        if test_only {
            continue;
        }
        // the tests of a file stand at its end
        let code = text.split("#[cfg(test)]\nmod tests {").next().unwrap_or(&text);
        let words = tokens(code);
        for (at, (word, line)) in words.iter().enumerate() {
            let macro_or_type = word.chars().next().is_some_and(char::is_uppercase)
                || words.get(at + 1).is_some_and(|t| t.0 == "!");
            let module_of_std = words.get(at.wrapping_sub(1)).is_some_and(|t| t.0 == "::")
                && ["fs", "env", "process", "net"].contains(&word.as_str());
            let bad = (forbidden.contains(&word.as_str()) && macro_or_type) || module_of_std;
            assert!(!bad, "{}:{line}: {word}", path.display());
        }
    }
}
