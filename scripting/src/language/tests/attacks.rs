//! Planted attacks: each hole that the engine has by itself, and a script that tries it.

use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, MutexGuard};
use std::time::Duration;

use super::*;

/// Memory is that of the whole process, so attacks on it take turns.
static TURN: Mutex<()> = Mutex::new(());

fn turn() -> MutexGuard<'static, ()> {
    TURN.lock().unwrap_or_else(|poisoned| poisoned.into_inner())
}

fn small() -> RunOptions {
    let limits =
        Limits { operations: 2_000_000, text: 100_000, array: 10_000, map: 1_000, ..Limits::default() };
    RunOptions { limits, ..RunOptions::default() }
}

/// The script ends by itself, with the diagnostics written in it; a limit that fails shows as a test that never ends.
fn stopped(text: &str) {
    expect_diagnostics(text, small());
}

/// Source of truth: the limits given; a loop without end must stop, inside `try` too.
#[test]
fn loops_without_end_stop() {
    stopped("loop { } // ~ E500");
    stopped("let x = 0; while true { try { x += 1; } catch { } } // ~ E500");
    stopped("fn f(n) { f(n + 1) }\nf(0); // ~ E501");
}

/// Source of truth: the limits given; nothing grows past them.
#[test]
fn values_without_end_stop() {
    let _turn = turn();
    stopped("let a = [0]; loop { a += a; } // ~ E502");
    stopped("let t = \"x\"; loop { t += t; } // ~ E502");
    stopped("let t = \"\"; t.pad(1000000000, \"x\"); // ~ E502");
    stopped("let a = []; a.pad(1000000000, 0); // ~ E502");
    stopped("let a = []; loop { a = [a, a]; } // ~ E502");
    stopped("let b = blob(1000000000, 0); // ~ E502");
}

/// Source of truth: memory of many values each below its own limit is bounded as well.
#[test]
#[cfg(target_os = "linux")]
fn memory_is_bounded() {
    let _turn = turn();
    let mut options = small();
    options.limits.memory = 90 << 20;
    options.limits.array = 100_000;
    options.limits.operations = 100_000_000;
    // entries set by their key are not counted by the engine
    expect_diagnostics(
        "let map = #{}; for i in range(0, 100000000) { let a = []; a.pad(1000, i); map[`k${i}`] = a; } // ~ E502",
        options.clone(),
    );
    // closures hide what they capture from the size of the array they stand in
    expect_diagnostics(
        "let keep = []; for i in range(0, 10000) { let big = []; big.pad(20000, i); keep.push(|| big); } // ~ E502",
        options,
    );
}

/// Source of truth: CRATES.md's list of holes; each name closed in every form.
#[test]
fn closed_functions_are_closed() {
    stopped("eval(\"1 + 1\"); // ~ E117");
    stopped("sleep(10000); // ~ E117");
    stopped("sleep(10000.0); // ~ E117");
    stopped("let f = Fn(\"sleep\"); f.call(10000); // ~ E117");
    stopped("timestamp(); // ~ E117");
    stopped("import \"other\" as other; // ~ E117");
    stopped("import \"../other\" as other; // ~ E117");
    stopped("let f = Fn(\"eval\"); f.call(\"1\"); // ~ E117");
}

/// Source of truth: the flag raised from another thread ends an endless loop within a second or so.
#[test]
fn an_interrupt_stops_a_loop() {
    let interrupt = Arc::new(AtomicBool::new(false));
    let raised = Arc::clone(&interrupt);
    let raiser = std::thread::spawn(move || {
        std::thread::sleep(Duration::from_millis(100));
        raised.store(true, Ordering::Relaxed);
    });
    let options = RunOptions { interrupt, ..RunOptions::default() };
    let (outcome, _) = run_with("loop { }", options);
    assert!(outcome.interrupted && outcome.errors[0].code == codes::INTERRUPTED); // E503
    raiser.join().unwrap();
}

/// Source of truth: expressions nested beyond the limit are refused before they exhaust the stack.
#[test]
fn deep_nesting_is_refused() {
    let deep = format!("let x = {}1{}; // ~ E501", "(".repeat(500), ")".repeat(500));
    expect_diagnostics(&deep, small());
    let brackets = format!("let x = {}{}; // ~ E501", "[".repeat(5000), "]".repeat(5000));
    expect_diagnostics(&brackets, small());
}

/// Source of truth: values nested without end must not exhaust the stack when they are dropped; the limit on memory is what
/// bounds closures, and the stack of the script's thread is twice that limit.
#[test]
fn values_nested_without_end_stop() {
    let _turn = turn();
    let mut options = small();
    options.limits.array = 1_000;
    expect_diagnostics("let a = []; loop { a = [a]; } // ~ E502", options.clone());
    expect_diagnostics("let a = #{}; loop { a = #{ a: a }; } // ~ E502", options.clone());
    options.limits.memory = 90 << 20;
    options.limits.operations = 100_000_000;
    expect_diagnostics("let f = 1; loop { let g = f; f = || g; } // ~ E502", options);
}

/// Source of truth: a panic inside a function of the program ends as a diagnostic, with what was stored kept.
#[test]
fn a_panic_is_a_diagnostic() {
    let (outcome, recorder) = run_text("store(\"a\", #{ x: 1 });\npanic_for_a_test();");
    assert_eq!(outcome.errors.iter().map(|e| e.code.as_str()).collect::<Vec<_>>(), ["E900"]);
    assert_eq!((outcome.stored, recorder.snapshots.len()), (1, 1));
}
