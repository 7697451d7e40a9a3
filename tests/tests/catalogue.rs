//! The catalogue of codes against the code: no page without a use, no code without a page.

use epiloom::diagnostics::{Code, entries};
use epiloom_tests::floors::{Source, sources, tokens};

use crate::support::workspace;

/// Source of truth: the source text: each code's constant is named outside the catalogue, or its text stands in the solver.
#[test]
fn every_code_can_be_met() {
    let scripting = sources(&workspace().join("scripting/src"));
    let solver = sources(&workspace().join("solver/src"));
    let catalogue = |source: &&Source| source.module.iter().any(|part| part == "catalogue");
    let rows: Vec<(String, String)> = scripting
        .iter()
        .filter(catalogue)
        .flat_map(|source| source.text.lines())
        .filter_map(|line| {
            let (name, rest) = line.trim().split_once(" = \"")?;
            let code = rest.split('"').next()?;
            Code::find(code).map(|_| (name.to_string(), code.to_string()))
        })
        .collect();
    assert_eq!(rows.len(), entries().count(), "every row was read");
    let used: std::collections::BTreeSet<String> = scripting
        .iter()
        .filter(|source| !catalogue(source) && !source.test_only)
        .flat_map(|source| tokens(&source.text))
        .map(|(word, _)| word)
        .collect();
    let in_solver = |code: &str| solver.iter().any(|source| source.text.contains(&format!("\"{code}\"")));
    let idle: Vec<_> = rows.iter().filter(|(name, code)| !used.contains(name) && !in_solver(code)).collect();
    assert!(idle.is_empty(), "no way leads to {idle:?}");
    // and the other way round: what the solver warns of has a page
    for source in solver.iter().filter(|source| !source.test_only) {
        for piece in source.text.split('"').skip(1).step_by(2) {
            let code =
                piece.len() == 4 && piece.starts_with('W') && piece[1..].bytes().all(|b| b.is_ascii_digit());
            assert!(!code || Code::find(piece).is_some(), "{}: {piece} has no page", source.path.display());
        }
    }
}
