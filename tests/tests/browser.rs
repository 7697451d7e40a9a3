//! The report in a real browser, headless: `browser/drive.mjs` does what a person would and tells what it saw.
//!
//! `EPILOOM_BROWSER` names a folder with the `node_modules` of `browser/package.json`; Chromium is found by its usual names
//! or `EPILOOM_CHROMIUM`. Without them these tests say so and pass by.

use std::io::{BufRead, BufReader, Write};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::sync::OnceLock;

use serde_json::Value;

use crate::report::{HOSTILE, SlowRun, hostile_page, hundred};
use crate::support::{Bench, SMALL_CELL, column, figure, workspace};

fn runs(program: &str) -> bool {
    Command::new(program).arg("--version").output().is_ok_and(|output| output.status.success())
}

/// The program that is a browser; none, with a message, where the tests must pass by.
fn chromium() -> Option<String> {
    static FOUND: OnceLock<Option<String>> = OnceLock::new();
    FOUND
        .get_or_init(|| {
            let tools = std::env::var("EPILOOM_BROWSER").map(PathBuf::from).unwrap_or_default();
            let named = std::env::var("EPILOOM_CHROMIUM").ok();
            let usual = ["chromium", "chromium-browser", "google-chrome"].map(str::to_string);
            let found = named.into_iter().chain(usual).find(|program| runs(program));
            if found.is_none() || !tools.join("node_modules/playwright-core").is_dir() || !runs("node") {
                println!(
                    "skipped: no Chromium, node and playwright-core (EPILOOM_CHROMIUM, EPILOOM_BROWSER)"
                );
                return None;
            }
            // playwright wants a path
            found.map(|program| {
                let which = Command::new("which").arg(&program).output().expect("which");
                String::from_utf8_lossy(&which.stdout).trim().to_string()
            })
        })
        .clone()
}

fn driver(program: &str, arguments: &[&Path]) -> Command {
    let mut command = Command::new("node");
    command.arg(workspace().join("tests/browser/drive.mjs")).env("EPILOOM_CHROMIUM", program);
    command.args(arguments);
    command
}

/// What the driver saw.
fn drive(program: &str, what: &str, arguments: &[&Path]) -> Value {
    let all: Vec<&Path> = std::iter::once(Path::new(what)).chain(arguments.iter().copied()).collect();
    let output = driver(program, &all).output().expect("node starts");
    let text = String::from_utf8_lossy(&output.stdout);
    assert!(output.status.success(), "{what}: {}\n{text}", String::from_utf8_lossy(&output.stderr));
    serde_json::from_str(text.trim()).unwrap_or_else(|e| panic!("{what}: {e}: {text}"))
}

/// Nothing was complained of, and nothing left the page.
fn quiet(seen: &Value) {
    for list in ["console", "requests", "asked"] {
        assert_eq!(seen[list].as_array().map(Vec::len), Some(0), "{list}: {}", seen[list]);
    }
    assert_eq!(seen["dialogs"], 0);
}

/// One page, and what a person with a pointer saw of it.
fn looked() -> Option<&'static (Bench, Value)> {
    static LOOKED: OnceLock<Option<(Bench, Value)>> = OnceLock::new();
    LOOKED
        .get_or_init(|| {
            let program = chromium()?;
            let bench = hostile_page();
            let told = drive(&program, "look", &[&bench.path("report.html"), &bench.path("")]);
            Some((bench, told))
        })
        .as_ref()
}

fn text<'a>(value: &'a Value, key: &str) -> &'a str {
    value[key].as_str().unwrap_or_else(|| panic!("no text `{key}` in {value}"))
}

/// Source of truth: the texts of the script and the archive, which show as they are and do nothing.
#[test]
fn a_page_opens_without_complaint_and_texts_show_as_themselves() {
    let Some((_, told)) = looked() else { return };
    quiet(&told["seen"]);
    let shown = text(told, "text");
    assert!(shown.contains("<script>alert(2)</script> & \"what\" a script may say"), "the script");
    assert!(shown.contains(HOSTILE), "the name of a snapshot");
    assert_eq!(told["images"], 0);
    assert_eq!(told["empty"], 0, "plots without curves");
}

/// Source of truth: the archive's own numbers, to the bit: the place and the current of a row of the table.
#[test]
fn pointing_at_a_curve_tells_the_number_that_the_archive_holds() {
    let Some((bench, told)) = looked() else { return };
    let snapshot = bench.snapshot("hostile.epiloom", "light J-V");
    let voltage = column(&snapshot, "voltage_V");
    let current = column(&snapshot, "extrapolated_current_density_mA_per_cm2");
    let number =
        |text: &str| text.split_whitespace().find_map(|word| word.parse::<f64>().ok()).expect("a number");
    let readings = told["hover"].as_array().expect("readings");
    let mut rows = Vec::new();
    for reading in readings {
        let at = number(text(reading, "place"));
        let row = voltage.iter().position(|v| v.to_bits() == at.to_bits());
        let row = row.unwrap_or_else(|| panic!("{at} is no voltage of the archive"));
        let value = number(text(&reading["values"], "current density"));
        assert_eq!(value.to_bits(), current[row].to_bits(), "{reading}");
        rows.push(row);
    }
    assert!(rows.windows(2).all(|pair| pair[0] < pair[1]), "{rows:?}");
}

/// Source of truth: the labels of the axis: powers of ten on a logarithmic one, none on a linear one; the words under the plot.
#[test]
fn a_plot_switches_zooms_and_hides() {
    let Some((_, told)) = looked() else { return };
    let [linear, log] = [0, 1].map(|i| told["svg"][i].as_str().expect("a drawing"));
    assert!(linear.starts_with("<?xml") && linear.contains("Current density / mA cm\u{207b}\u{b2}"));
    assert!(!linear.contains("10\u{207b}\u{b9}") && log.contains(">10\u{2070}<"), "powers of ten");
    assert!(log.contains("|Current density|"));
    assert_eq!(told["pressed"], "true");
    assert!(text(told, "notes").contains("absolute values"), "{}", told["notes"]);
    assert!(text(told, "zoomed").contains("enlarged: voltage from"), "{}", told["zoomed"]);
    assert!(!text(told, "unzoomed").contains("enlarged"));
    assert_eq!(told["hidden"], "false");
}

/// Source of truth: `epiloom export --to csv` of the same snapshot, byte for byte.
#[test]
fn downloads_are_what_export_writes() {
    let Some((bench, told)) = looked() else { return };
    let listing: Value =
        serde_json::from_str(&bench.ends(0, &["show", "hostile.epiloom", "--json"]).out).expect("JSON");
    let names: Vec<&str> =
        listing["snapshots"].as_array().expect("snapshots").iter().map(|each| text(each, "name")).collect();
    let mut compared = 0;
    for (place, name) in names.iter().enumerate() {
        let written = bench.ends(0, &["export", "hostile.epiloom", name, "--to", "csv", "-o", "out.csv"]).out;
        let files: Vec<&Value> = told["files"]
            .as_array()
            .expect("files")
            .iter()
            .filter(|file| file["snapshot"] == place)
            .collect();
        assert_eq!(files.len(), written.lines().count(), "{name}");
        for (file, path) in files.iter().zip(written.lines()) {
            let got = std::fs::read(text(file, "path")).expect("a download");
            assert!(got == bench.bytes(path), "{name}, {path}:\n{}", String::from_utf8_lossy(&got));
            compared += 1;
        }
    }
    assert!(compared >= 8, "{compared}");
}

/// Source of truth: the order of the numbers themselves, and the filter's own comparison.
#[test]
fn tables_sort_and_filter() {
    let Some((_, told)) = looked() else { return };
    let numbers = |key: &str| -> Vec<f64> {
        let cells = told[key].as_array().unwrap_or_else(|| panic!("no {key}"));
        cells.iter().map(|cell| cell.as_str().expect("text").parse().expect("a number")).collect()
    };
    let sorted = numbers("sorted");
    assert!(sorted.len() > 8 && sorted.windows(2).all(|pair| pair[0] <= pair[1]), "{sorted:?}");
    let filtered = numbers("filtered");
    assert!(
        !filtered.is_empty() && filtered.len() < sorted.len() && filtered.iter().all(|v| *v > 1.0),
        "{filtered:?}"
    );
}

/// Source of truth: what the manual of the keys says; every stop on the way shows where it is.
#[test]
fn the_page_is_used_without_a_pointer() {
    let Some(program) = chromium() else { return };
    let Some((bench, _)) = looked() else { return };
    let told = drive(&program, "keyboard", &[&bench.path("report.html")]);
    quiet(&told["seen"]);
    let unseen: Vec<&Value> =
        told["visited"].as_array().expect("stops").iter().filter(|stop| stop["visible"] == false).collect();
    assert!(unseen.is_empty(), "stops that do not show: {unseen:?}");
    assert_ne!(told["grounds"][0], told["grounds"][1], "light and dark");
    let steps = told["steps"].as_array().expect("steps");
    let places: Vec<&str> = steps.iter().map(|step| text(step, "place")).collect();
    assert!(places[0] != places[1] && places[1] != places[2], "{places:?}");
    let snapshot = bench.snapshot("hostile.epiloom", "light J-V");
    let last = column(&snapshot, "voltage_V").pop().expect("a row");
    assert!(places[2].contains(&format!("Voltage {last} V")), "{} is not the end, {last}", places[2]);
    assert_eq!(told["log"], "true");
    assert!(text(&told, "zoomed").contains("enlarged"), "{}", told["zoomed"]);
    assert!(told["hidden"].is_string(), "the curve's button says whether it is shown: {}", told["hidden"]);
    assert_eq!(told["unfolded"], true);
}

/// Source of truth: nothing reaches over the edge of a telephone or a desk's screen; text stands out from its ground by the
/// 4.5 to 1 of WCAG 2.1; light is light and dark is dark.
#[test]
fn the_page_fits_narrow_and_wide_light_and_dark() {
    let Some(program) = chromium() else { return };
    let Some((bench, _)) = looked() else { return };
    let told = drive(&program, "sizes", &[&bench.path("report.html"), &bench.path("")]);
    let views = told.as_array().expect("views");
    assert_eq!(views.len(), 4);
    for view in views {
        quiet(&view["seen"]);
        let name = format!("{} {}", view["colorScheme"], view["width"]);
        assert!(view["overflow"].as_f64().expect("a number") <= 0.0, "{name} scrolls sideways: {view}");
        assert_eq!(view["wide"].as_array().map(Vec::len), Some(0), "{name}: {}", view["wide"]);
        assert_eq!(view["empty"], 0, "{name}");
        let width = view["width"].as_f64().expect("a number");
        let plots = view["plots"].as_array().expect("plots");
        assert!(
            plots.len() > 6 && plots.iter().all(|w| w.as_f64().is_some_and(|w| w > 200.0 && w < width)),
            "{name}: {plots:?}"
        );
        assert!(view["worst"][1].as_f64().expect("a contrast") >= 4.5, "{name}: {}", view["worst"]);
    }
    let ground = |scheme: &str| {
        views.iter().find(|view| view["colorScheme"] == scheme).map(|view| view["ground"].clone())
    };
    assert_ne!(ground("light"), ground("dark"));
}

/// Source of truth: a page that breaks the rule on purpose, which this check must catch; the policy must stop the same page.
#[test]
fn a_request_that_leaves_is_caught_and_the_policy_stops_it() {
    let Some(program) = chromium() else { return };
    let Some((bench, _)) = looked() else { return };
    let page = String::from_utf8(bench.bytes("report.html")).expect("UTF-8");
    let planted = "<img src=\"http://leak.example/a.png\"><link rel=\"stylesheet\" href=\"http://leak.example/a.css\">\
        <script>document.documentElement.dataset.acted = 1; fetch(\"http://127.0.0.1:9/x\");</script></body>";
    let guarded = page.replace("</body>", planted);
    let policy = page.find("<meta http-equiv").expect("a policy");
    let end = page[policy..].find('>').expect("its end") + policy + 1;
    let open = format!("{}{}", &guarded[..policy], &guarded[end..]);
    bench.write("guarded.html", &guarded);
    bench.write("open.html", &open);
    let caught = drive(&program, "leaks", &[&bench.path("open.html")]);
    let asked = caught["seen"]["asked"].to_string();
    assert!(
        asked.contains("leak.example/a.png") && asked.contains("a.css"),
        "the check sees what leaves: {asked}"
    );
    assert_eq!(caught["acted"], "1");
    let stopped = drive(&program, "leaks", &[&bench.path("guarded.html")]);
    assert_eq!(stopped["seen"]["asked"].as_array().map(Vec::len), Some(0), "{}", stopped["seen"]);
    assert_eq!(stopped["acted"], Value::Null, "a script that the policy does not know");
    assert!(
        stopped["seen"]["console"].as_array().is_some_and(|list| !list.is_empty()),
        "the browser says why"
    );
}

/// Source of truth: the archive: the point that a person chooses on a map shows that point's own numbers and the curves that it
/// stored, by the pointer and by keys.
#[test]
fn a_click_on_a_map_shows_the_curves_of_that_point() {
    let Some(program) = chromium() else { return };
    let sweep = r#"
let plan = grid(#{ base: [300.nm, 600.nm, 900.nm], doping: [1e16.per_cm3, 1e17.per_cm3] });
plan.run("map", |p| {
    cell["base"].thickness = p.base;
    cell["base"].doping = acceptors(p.doping);
    let jv = cell.jv(lamp, [0.V, 0.2.V, 0.4.V]);
    store("jv", jv);
    #{ jsc: jv.jsc }
});
"#;
    let bench = Bench::with("map.rhai", &format!("{SMALL_CELL}{sweep}"));
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    bench.ends(0, &["report", "map.epiloom", "-o", "map.html"]);
    let told = drive(&program, "map", &[&bench.path("map.html")]);
    quiet(&told["seen"]);
    assert_eq!((&told["cells"], &told["empty"]), (&6.into(), &0.into()), "{told}");
    let points = told["points"].as_array().expect("points");
    let mut titles = std::collections::BTreeSet::new();
    for shown in points {
        let row = text(shown, "row");
        assert_eq!(text(shown, "title"), format!("Point {row}"));
        let stored = bench.ends(0, &["show", "map.epiloom", &format!("map/{row}"), "--json"]).out;
        let stored: Value = serde_json::from_str(&stored).expect("JSON");
        let jsc = stored["outputs"][0]["value"].as_f64().expect("a number");
        let digits = format!("{jsc}");
        assert!(text(shown, "words").contains(&digits) && text(shown, "label").contains(&digits), "{shown}");
        let kinds: Vec<&str> =
            shown["figures"].as_array().expect("figures").iter().filter_map(Value::as_str).collect();
        assert!(kinds.contains(&"jv"), "{kinds:?}");
        assert!(text(shown, "words").contains("jv"), "{shown}");
        titles.insert(text(shown, "title"));
    }
    titles.insert(text(&told["byKeys"], "title"));
    assert_eq!(titles.len(), 3, "three points, each its own: {titles:?}");
}

/// Source of truth: every plot has a drawing on paper, and the paper is a file.
#[test]
fn the_page_prints() {
    let Some(program) = chromium() else { return };
    let Some((bench, _)) = looked() else { return };
    let told = drive(&program, "print", &[&bench.path("report.html"), &bench.path("")]);
    quiet(&told["seen"]);
    assert!(
        told["drawings"].as_u64() >= told["plots"].as_u64() && told["plots"].as_u64() > Some(6),
        "{told}"
    );
    assert!(bench.bytes("page.pdf").starts_with(b"%PDF") && bench.bytes("page.pdf").len() > 20_000);
}

/// Source of truth: the archive: a page that had to leave rows out still tells its numbers, and says what it left out.
#[test]
fn a_thinned_page_holds_the_archives_numbers() {
    let Some(program) = chromium() else { return };
    let bench = hundred();
    bench.ends(0, &["report", "hundred.epiloom", "-o", "report.html"]);
    let told = drive(&program, "rows", &[&bench.path("report.html"), &bench.path("")]);
    quiet(&told["seen"]);
    let listing: Value =
        serde_json::from_str(&bench.ends(0, &["show", "hundred.epiloom", "--json"]).out).expect("JSON");
    assert_eq!(told["rows"], listing["snapshots"].as_array().map_or(0, Vec::len));
    let name = text(&told, "name");
    assert!(text(&told, "said").contains("rows of \u{201c}profiles\u{201d}"), "{}", told["said"]);
    let whole = bench.ends(0, &["export", "hundred.epiloom", name, "--to", "csv", "-o", "out.csv"]).out;
    let whole = String::from_utf8(bench.bytes(whole.lines().next().expect("a file"))).expect("UTF-8");
    let part = std::fs::read_to_string(text(&told, "path")).expect("a download");
    let mut all = whole.lines();
    assert!(part.lines().count() > 40 && part.lines().count() < whole.lines().count());
    for line in part.lines() {
        assert!(
            all.any(|other| other == line),
            "a row that the archive does not have, or out of order: {line}"
        );
    }
    assert!(figure(&bench.snapshot("hundred.epiloom", name), "current_density").is_finite());
}

/// Source of truth: the snapshots that the run has stored, one after the other, and its end.
#[test]
fn a_watched_page_renews_itself() {
    let Some(program) = chromium() else { return };
    let mut run = SlowRun::begin();
    let (watcher, address) = run.watch();
    let mut node = driver(&program, &[Path::new("watch"), Path::new(&address)])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .expect("node starts");
    let mut say = node.stdin.take().expect("a pipe");
    let mut lines = BufReader::new(node.stdout.take().expect("a pipe")).lines();
    let mut next = || -> Value {
        let line = lines.next().expect("a line").expect("readable");
        serde_json::from_str(&line).unwrap_or_else(|e| panic!("{e}: {line}"))
    };
    let first = next();
    assert_eq!(first["rows"], 1);
    assert!(text(&first, "state").contains("going on"), "{first}");
    run.store();
    run.store();
    writeln!(say, "more").expect("told");
    assert!(next()["rows"].as_u64() > Some(1));
    run.store();
    run.finish();
    writeln!(say, "last").expect("told");
    let last = next();
    assert_eq!(last["rows"], 4, "the last state arrives: {last}");
    assert!(last["open"].as_u64() > Some(0), "what was open stays open");
    writeln!(say, "end").expect("told");
    quiet(&next()["seen"]);
    assert!(node.wait().expect("it ends").success());
    assert_eq!(watcher.wait_with_output().expect("it ends").status.code(), Some(0));
}
