//! The vocabulary as a table: every example runs, the reference page is its copy, every diagnostic has a test script.

use super::*;
use crate::language::vocabulary::{entries, topics};

/// Source of truth: a manual whose examples do not run is wrong; each is checked, and those that solve nothing are run.
#[test]
fn every_example_is_a_valid_script() {
    for entry in entries() {
        let solving = [".jv(", ".figures(", ".at(", ".eqe(", ".equilibrium(", ".capacitance("];
        let solves = solving.iter().any(|word| entry.example.contains(word));
        let options = RunOptions { check_only: solves, ..RunOptions::default() };
        let (outcome, _) = run_with(entry.example, options);
        assert!(outcome.errors.is_empty(), "{}:\n{}", entry.name, shown(entry.example, &outcome.errors));
    }
}

/// Source of truth: the copy beside the crate is what `epiloom reference` prints; EPILOOM_WRITE_REFERENCE=1 writes it anew.
#[test]
fn the_reference_page_is_in_step() {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("REFERENCE.md");
    if std::env::var_os("EPILOOM_WRITE_REFERENCE").is_some() {
        std::fs::write(&path, reference()).expect("the reference page can be written");
    }
    let copy = std::fs::read_to_string(&path).expect("the copy is there");
    assert!(
        copy == reference(),
        "write it anew: EPILOOM_WRITE_REFERENCE=1 cargo test -p epiloom the_reference_page"
    );
}

/// Source of truth: a table that drives registration needs complete rows.
#[test]
fn every_row_is_complete() {
    for topic in topics() {
        assert!(!topic.title.is_empty() && topic.intro.ends_with('.'), "{}", topic.title);
        for entry in topic.entries {
            assert!(!entry.forms.is_empty() && entry.doc.ends_with('.'), "{}", entry.name);
            assert!(entry.forms.iter().any(|form| form.contains(entry.name)), "{}", entry.name);
        }
    }
}

/// Source of truth: the catalogue: each code that a script can meet stands as an expectation in one of these tests.
#[test]
fn every_code_has_a_test() {
    const TESTS: &[&str] = &[
        include_str!("attacks.rs"),
        include_str!("devices.rs"),
        include_str!("files.rs"),
        include_str!("material_models.rs"),
        include_str!("numbers.rs"),
        include_str!("pictures.rs"),
        include_str!("plans.rs"),
        include_str!("solving.rs"),
        include_str!("temperature_models.rs"),
        include_str!("../solver_faults.rs"),
    ];
    // told by the solver alone, in states that no short script reaches on purpose; tested beside the solver
    const OF_THE_SOLVER: &[&str] = &["W301", "W310", "W312", "W313"];
    // of the command line, the archive and the replay
    const OF_OTHERS: &[&str] = &["E404", "E405", "E406", "E41", "E420", "E430", "W4"];
    for entry in crate::diagnostics::entries() {
        let code = entry.code.as_str();
        let others = OF_OTHERS.iter().any(|family| code.starts_with(family)) || OF_THE_SOLVER.contains(&code);
        let expected = TESTS.iter().any(|text| text.contains(code));
        assert!(others || expected, "no test expects {code}: {}", entry.title);
    }
}
