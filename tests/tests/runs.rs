//! Running scripts: what is printed, what is stored, what is refused.

use crate::support::{Bench, Ran, SMALL_CELL, figure};

fn small(rest: &str) -> Bench {
    Bench::with("small.rhai", &format!("{SMALL_CELL}{rest}"))
}

/// Source of truth: the promise of the command line: results on standard output with the archive last, nothing else there.
#[test]
fn a_run_prints_its_results_and_names_its_archive_last() {
    let bench = small("print(`hello`);\nstore(\"light\", cell.jv(lamp, [0.V, 0.5.V]));");
    let ran = bench.ends(0, &["run", "small.rhai"]);
    for wanted in [
        "hello",
        "stack `small`",
        "emitter",
        "100 nm",
        "500 nm",
        "temperature",
        "298.15 K",
        "Fermi-Dirac",
        "light",
        "jsc",
        "+-",
    ] {
        assert!(
            ran.out.to_lowercase().contains(&wanted.to_lowercase()),
            "`{wanted}` is missing:\n{}",
            ran.out
        );
    }
    assert_eq!(ran.out.trim_end().lines().last(), Some("archive small.epiloom"));
    assert!(bench.path("small.epiloom").is_file());
    assert!(!bench.path("small.epiloom.unfinished").exists(), "a finished run leaves no unfinished file");
    let quiet = bench.ends(0, &["run", "small.rhai", "--quiet"]);
    assert_eq!(quiet.out, "hello\n", "only what the script prints");
}

/// Source of truth: determinism: the same script gives the same bytes, whatever the number of threads.
#[test]
fn the_archive_is_the_same_to_the_byte_on_any_number_of_threads() {
    let bench = small("store(\"light\", cell.jv(lamp));\nstore(\"dark\", cell.at(0.3.V, dark()));");
    bench.ends(0, &["run", "small.rhai", "--threads", "1", "--out", "one.epiloom", "--quiet"]);
    bench.ends(0, &["run", "small.rhai", "--threads", "2", "--out", "two.epiloom", "--quiet"]);
    assert!(bench.bytes("one.epiloom") == bench.bytes("two.epiloom"));
}

/// Source of truth: the thickness that was set, read back from the archive; bad values are refused before solving.
#[test]
fn inputs_are_set_with_units_and_wrong_ones_refused() {
    let bench = small("store(\"light\", cell.jv(lamp, [0.V]));");
    let ran = bench.ends(0, &["run", "small.rhai", "--set", "base=0.25um"]);
    assert!(ran.out.contains("0.25 um") || ran.out.contains("250 nm"), "{}", ran.out);
    let shown = bench.ends(0, &["show", "small.epiloom"]);
    assert!(shown.out.contains("input base") && shown.out.contains("set from outside"), "{}", shown.out);
    let cases = [
        ("base=250V", "E112"),
        ("base=250", "E112"),
        ("base=250furlong", "E112"),
        ("bsae=250nm", "E111"),
        ("base=nm", "E112"),
    ];
    for (set, code) in cases {
        let ran = bench.ends(1, &["run", "small.rhai", "--set", set]);
        assert!(ran.err.contains(&format!("error[{code}]")), "{set}: {}", ran.err);
        assert!(!ran.out.contains("archive"), "{set}");
    }
    let unknown = bench.ends(1, &["run", "small.rhai", "--set", "bsae=250nm"]);
    assert!(unknown.err.contains("`base`"), "the inputs are listed: {}", unknown.err);
    bench.ends(2, &["run", "small.rhai", "--set", "base"]);
}

/// Source of truth: the rule of the manual: an earlier archive of the same script is replaced, nothing else is.
#[test]
fn only_the_same_scripts_archive_is_replaced() {
    let bench = small("store(\"light\", cell.jv(lamp, [0.V]));");
    bench.ends(0, &["run", "small.rhai"]);
    bench.ends(0, &["run", "small.rhai"]);
    bench.write("other.rhai", &format!("{SMALL_CELL}store(\"light\", cell.jv(lamp, [0.1.V]));"));
    let before = bench.bytes("small.epiloom");
    let refused = bench.ends(5, &["run", "other.rhai", "--out", "small.epiloom"]);
    assert!(refused.err.contains("E404") && refused.err.contains("small.rhai"), "{}", refused.err);
    assert!(bench.bytes("small.epiloom") == before, "it was not touched");
    let script = bench.bytes("small.rhai");
    bench.ends(5, &["run", "small.rhai", "--out", "small.rhai"]);
    assert!(bench.bytes("small.rhai") == script, "the script itself is never overwritten");
}

/// Source of truth: the table of exit codes.
#[test]
fn every_failure_has_its_exit_code() {
    let bench = Bench::with("bad.rhai", "let x = ;");
    let fault = bench.ends(1, &["run", "bad.rhai"]);
    assert!(fault.err.contains("error[E100]") && fault.err.contains("bad.rhai:1:"), "{}", fault.err);
    assert!(fault.out.is_empty());
    assert!(!bench.path("bad.epiloom").exists() && !bench.path("bad.epiloom.unfinished").exists());
    bench.ends(5, &["run", "missing.rhai"]);
    bench.ends(2, &["run"]);
    bench.ends(2, &["fly"]);
    bench.ends(2, &["run", "bad.rhai", "--threads", "0"]);
    bench.ends(2, &["explain", "E999"]);
    bench.ends(2, &["materials", "Unobtainium"]);
    bench.ends(5, &["show", "missing.epiloom"]);
    bench.ends(3, &["show", "bad.rhai"]);
    std::fs::write(bench.path("latin.rhai"), b"let x = \"\xe9\";").expect("writable");
    let encoding = bench.ends(5, &["run", "latin.rhai"]);
    assert!(encoding.err.contains("line 1"), "{}", encoding.err);
    for arguments in [
        &["--help"][..],
        &["--version"],
        &["run", "--help"],
        &["explain"],
        &["explain", "e210"],
        &["materials"],
        &["materials", "GaAs"],
        &["reference"],
        &["completions", "bash"],
    ] {
        let ran = bench.ends(0, arguments);
        assert!(!ran.out.is_empty() && ran.err.is_empty(), "{arguments:?}: {}", ran.err);
    }
}

/// Source of truth: the offset ladder in use: AlGaAs's valence band lies below that of GaAs, and every value has a source.
#[test]
fn materials_are_listed_with_offsets_and_sources() {
    let bench = Bench::empty();
    let all = bench.ends(0, &["materials"]).out;
    for name in ["GaAs", "AlGaAs", "GaInP", "AlInP", "InP", "GaInAs", "Si", "Ge"] {
        assert!(all.lines().any(|line| line.starts_with(&format!("{name} "))), "{name}: {all}");
        let page = bench.ends(0, &["materials", name]).out;
        for word in [
            "gap",
            "affinity",
            "nc",
            "electron_mobility",
            "radiative_coefficient",
            "absorption",
            "band edges above those of GaAs",
        ] {
            assert!(page.contains(word), "{name} lacks {word}: {page}");
        }
    }
    let first = bench.ends(0, &["materials", "AlGaAs", "--x", "0.3"]).out;
    let second = bench.ends(0, &["materials", "AlGaAs", "--x", "0.2"]).out;
    assert_ne!(first, second);
    bench.ends(2, &["materials", "AlGaAs", "--x", "1.5"]);
}

/// Source of truth: the faults planted in the script, one a line, each named with the code written beside it; nothing is solved.
#[test]
fn check_reports_every_fault_at_once() {
    let script = r#"let gaas = material("GaAs");
let a = layer("a", gaas, 0.nm, intrinsic()); //# E210
let b = layer("b", gaas, 30, intrinsic()); //# E200
let c = layer("c", gaas, 30.V, intrinsic()); //# E202
let d = material("GaAz"); //# E217
let e = ohmic(#{ recombination_velocty: 1.cm_per_s }); //# E108
let f = 1.nm + 1.V; //# E201
let g = spectrum("AM2"); //# E226
"#;
    let bench = Bench::with("faults.rhai", script);
    let ran = bench.ends(1, &["check", "faults.rhai"]);
    for (index, line) in script.lines().enumerate() {
        if let Some((_, code)) = line.split_once("//# ") {
            let place = format!("faults.rhai:{}:", index + 1);
            let told = ran.err.split("error[").any(|part| part.starts_with(code) && part.contains(&place));
            assert!(told, "{code} at {place} is missing:\n{}", ran.err);
        }
    }
    assert_eq!(ran.err.matches("error[").count(), 7, "{}", ran.err);
    assert!(!bench.path("faults.epiloom").exists());
    let good = small("store(\"light\", cell.jv(lamp));");
    let ran = good.ends(0, &["check", "small.rhai"]);
    assert!(ran.out.contains("no faults") && !good.path("small.epiloom").exists(), "{}", ran.out);
}

/// Source of truth: the promise that what is finished is kept: a signal from outside, then the unfinished archive read back.
#[cfg(unix)]
#[test]
fn an_interrupted_run_keeps_what_is_finished() {
    let bench = small(
        "store(\"first\", cell.jv(lamp, [0.V]));\nlet n = 0;\nloop { n += 1; if n > 150000000 { break; } }\nstore(\"second\", cell.jv(lamp, [0.V]));",
    );
    let mut command = bench.command(&["run", "small.rhai"]);
    let child = command
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .expect("starts");
    let unfinished = bench.path("small.epiloom.unfinished");
    let stored = |bench: &Bench| {
        unfinished.exists() && bench.run(&["show", "small.epiloom.unfinished"]).out.contains("first")
    };
    for _ in 0..600 {
        if stored(&bench) {
            break;
        }
        std::thread::sleep(std::time::Duration::from_millis(50));
    }
    let killed = std::process::Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .expect("kill runs");
    assert!(killed.success(), "the run was still going on");
    let ran = Ran::of(child.wait_with_output().expect("it ends"));
    assert_eq!(ran.code, 130, "{}\n{}", ran.out, ran.err);
    assert!(ran.err.contains("small.epiloom.unfinished") && ran.err.contains("E503"), "{}", ran.err);
    assert!(!bench.path("small.epiloom").exists());
    let shown = bench.ends(3, &["show", "small.epiloom.unfinished"]);
    assert!(shown.out.contains("first") && !shown.out.contains("second"), "{}", shown.out);
    assert!(shown.err.contains("W401"), "{}", shown.err);
    let again = bench.ends(3, &["show", "small.epiloom.unfinished", "first", "--json"]);
    let snapshot: serde_json::Value = serde_json::from_str(&again.out).expect("JSON");
    assert!(figure(&snapshot, "jsc") > 0.0);
}

/// Source of truth: what `| head` expects: a reader that goes away stops nothing and is no failure.
#[cfg(unix)]
#[test]
fn a_closed_standard_output_stops_nothing() {
    let bench = small("for i in 0..2000 { print(`line ${i}`); }\nstore(\"light\", cell.jv(lamp, [0.V]));");
    let mut command = bench.command(&["run", "small.rhai"]);
    let mut child = command
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .expect("starts");
    drop(child.stdout.take());
    let ran = Ran::of(child.wait_with_output().expect("it ends"));
    assert_eq!(ran.code, 0, "{}", ran.err);
    assert!(bench.path("small.epiloom").is_file());
}

/// A script that stores one result and then goes on for long.
#[cfg(unix)]
const LONG: &str =
    "store(\"first\", cell.jv(lamp, [0.V]));\nlet n = 0;\nloop { n += 1; if n > 150000000 { break; } }";

/// Starts that script and waits until its first result is stored.
#[cfg(unix)]
fn started(bench: &Bench) -> std::process::Child {
    let mut command = bench.command(&["run", "small.rhai"]);
    let mut child = command
        .stdout(std::process::Stdio::null())
        .stderr(std::process::Stdio::null())
        .spawn()
        .expect("starts");
    for _ in 0..600 {
        if bench.run(&["show", "small.epiloom.unfinished"]).out.contains("first") {
            return child;
        }
        std::thread::sleep(std::time::Duration::from_millis(50));
    }
    child.kill().expect("it was going on");
    child.wait().expect("it ends");
    panic!("nothing was stored in half a minute");
}

/// Source of truth: the promise that nothing stored is lost, not even to a kill: read back; the next run moves it aside.
#[cfg(unix)]
#[test]
fn a_killed_run_keeps_what_is_stored_and_the_next_one_moves_it_aside() {
    let bench = small(LONG);
    let mut child = started(&bench);
    child.kill().expect("it was going on");
    child.wait().expect("it ends");
    let shown = bench.ends(3, &["show", "small.epiloom.unfinished"]);
    assert!(shown.out.contains("first"), "{}", shown.out);
    bench.write("small.rhai", &format!("{SMALL_CELL}store(\"other\", cell.jv(lamp, [0.V]));"));
    let next = bench.ends(0, &["run", "small.rhai"]);
    assert!(next.err.contains("small.epiloom.unfinished-1"), "{}", next.err);
    assert!(bench.ends(3, &["show", "small.epiloom.unfinished-1"]).out.contains("first"));
    assert!(bench.ends(0, &["show", "small.epiloom"]).out.contains("other"));
}

/// Source of truth: the lock on the unfinished archive: a second run of the same archive is refused, the first goes on.
#[cfg(unix)]
#[test]
fn two_runs_do_not_write_one_archive() {
    let bench = small(LONG);
    let mut child = started(&bench);
    let second = bench.ends(5, &["run", "small.rhai"]);
    assert!(second.err.contains("E405") && second.err.contains("--out"), "{}", second.err);
    assert!(child.try_wait().expect("it can be asked").is_none(), "the first goes on");
    child.kill().expect("it was going on");
    child.wait().expect("it ends");
}

/// Source of truth: a full disk, played by /dev/full: the results cannot be printed, and that is said.
#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_under_standard_output_is_said() {
    let bench = Bench::empty();
    let full = std::fs::OpenOptions::new().write(true).open("/dev/full").expect("it is there on Linux");
    let ran = Ran::of(bench.command(&["materials"]).stdout(full).output().expect("it starts"));
    assert!(ran.code == 5 && ran.err.contains("E403"), "{}: {}", ran.code, ran.err);
}

/// Source of truth: the rule that scripts read below their own folder only, and that a replay wants the same bytes.
#[test]
fn data_files_are_read_inside_the_folder_and_replayed_by_their_digest() {
    let bench = small(
        "let rows = read_csv(\"levels.csv\");\nfor row in rows { store(`at ${row.level}`, cell.at(row.level, lamp)); }",
    );
    bench.write("levels.csv", "level_V\n0.1\n0.2\n");
    bench.ends(0, &["run", "small.rhai"]);
    assert!(bench.ends(0, &["show", "small.epiloom"]).out.contains("data file levels.csv"));
    bench.ends(0, &["replay", "small.epiloom"]);
    bench.write("levels.csv", "level_V\n0.1\n0.3\n");
    let changed = bench.ends(5, &["replay", "small.epiloom"]);
    assert!(changed.err.contains("E421") && changed.err.contains("levels.csv"), "{}", changed.err);
    std::fs::create_dir(bench.path("scripts")).expect("writable");
    bench.write("scripts/outside.rhai", "let rows = read_csv(\"../levels.csv\");\nprint(rows.len());");
    let refused = bench.ends(1, &["run", "scripts/outside.rhai"]);
    assert!(refused.err.contains("E401") && refused.err.contains("--allow-read"), "{}", refused.err);
    let allowed = bench.ends(0, &["run", "scripts/outside.rhai", "--allow-read", "."]);
    assert_eq!(allowed.out, "2\n");
    let outside = bench.path("small.rhai");
    let text = std::fs::read_to_string(outside).expect("a script").replace("levels.csv", "../levels.csv");
    bench.write("scripts/outside.rhai", &text);
    bench.ends(0, &["run", "scripts/outside.rhai", "--allow-read", "."]);
    bench.ends(5, &["replay", "outside.epiloom", "--data", "scripts"]);
    bench.ends(0, &["replay", "outside.epiloom", "--data", "scripts", "--allow-read", "."]);
}

/// Source of truth: what a terminal would obey: an escape in a name is shown as text, on both streams.
#[test]
fn control_characters_never_reach_the_terminal() {
    let bench = small("store(\"\\x1b[2Jred\", cell.jv(lamp, [0.V]));\nprint(\"\\x1b[31m\");");
    let ran = bench.ends(0, &["run", "small.rhai"]);
    let listed = bench.ends(0, &["show", "small.epiloom"]);
    let missing = bench.ends(2, &["show", "small.epiloom", "\u{1b}[0m"]);
    for text in [&ran.out, &ran.err, &listed.out, &missing.err] {
        assert!(!text.contains('\u{1b}'), "{text:?}");
    }
    assert!(listed.out.contains("\\u{1b}[2Jred"), "{}", listed.out);
}
