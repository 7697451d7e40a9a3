//! Every scenario runs as it stands, and gives what its header expects.

use serde_json::Value;

use crate::support::{Bench, column, figure, workspace};

/// The names of the scenarios' files.
fn names() -> Vec<String> {
    let folder = std::fs::read_dir(workspace().join("scenarios")).expect("the folder of scenarios");
    let mut names: Vec<String> = folder
        .map(|entry| entry.expect("readable").file_name().to_string_lossy().into_owned())
        .filter(|name| name.ends_with(".rhai"))
        .collect();
    names.sort();
    names
}

fn run(name: &str) -> Bench {
    let bench = Bench::empty();
    let script = workspace().join("scenarios").join(name);
    bench.ends(0, &["check", &script.to_string_lossy()]);
    bench.ends(0, &["run", &script.to_string_lossy()]);
    bench
}

/// What a line of a header expects: a snapshot, and the digits of each of its figures or columns.
struct Expected {
    snapshot: String,
    numbers: Vec<(String, Vec<String>)>,
}

/// The expectations that stand after "Expected, from a run" in a script's header.
fn expected(script: &str) -> Vec<Expected> {
    let header = script.lines().take_while(|line| line.starts_with("//"));
    let after = header.skip_while(|line| !line.contains("Expected, from a run")).skip(1);
    let lines =
        after.filter_map(|line| line.strip_prefix("//     ")).filter_map(|line| line.split_once(": "));
    lines
        .map(|(snapshot, rest)| Expected {
            snapshot: snapshot.to_string(),
            numbers: rest
                .split(", ")
                .map(|item| {
                    let mut words = item.split_whitespace();
                    let name = words.next().expect("a figure's name").to_string();
                    (name, words.filter(|w| w.parse::<f64>().is_ok()).map(str::to_string).collect())
                })
                .collect(),
        })
        .collect()
}

/// Half a unit of the last digit that is written.
fn half_a_digit(text: &str) -> f64 {
    let (mantissa, power) = text.split_once('e').unwrap_or((text, "0"));
    let decimals = mantissa.split_once('.').map_or(0, |(_, after)| after.len());
    let place: i32 = power.parse::<i32>().expect("an exponent") - i32::try_from(decimals).expect("few");
    0.5 * 10_f64.powi(place)
}

fn agrees(text: &str, value: f64) -> bool {
    let wanted: f64 = text.parse().expect("a number");
    (value - wanted).abs() <= half_a_digit(text) * (1.0 + 1e-9)
}

fn values(snapshot: &Value, name: &str) -> Vec<f64> {
    let is_figure = snapshot["figures"].as_array().is_some_and(|list| list.iter().any(|f| f["name"] == name));
    if is_figure { vec![figure(snapshot, name)] } else { column(snapshot, name) }
}

/// Source of truth: the headers, golden answers from a run, to half a unit of the last digit that they write; a header
/// without any is a fault. Each archive replays to the bit.
#[test]
fn every_scenario_gives_what_its_header_expects() {
    for name in names() {
        let script = std::fs::read_to_string(workspace().join("scenarios").join(&name)).expect("a script");
        let bench = run(&name);
        let archive = name.replace(".rhai", ".epiloom");
        let expected = expected(&script);
        assert!(!expected.is_empty(), "{name} expects nothing");
        for Expected { snapshot, numbers } in expected {
            let found = bench.snapshot(&archive, &snapshot);
            for (key, digits) in numbers {
                let values = values(&found, &key);
                assert_eq!(values.len(), digits.len(), "{name}, {snapshot}, {key}");
                for (text, value) in digits.iter().zip(values) {
                    assert!(agrees(text, value), "{name}, {snapshot}: {key} is {value}, expected {text}");
                }
            }
        }
        bench.ends(0, &["replay", &archive]);
    }
    assert!(
        !agrees("1.016", 1.0166) && agrees("1.016", 1.0164) && !agrees("4.19e-5", 4.2e-5),
        "the check can fail"
    );
}

/// Source of truth: the range that a GaAs cell without an antireflection coating of its own can physically have
/// (Jsc 26 to 30 mA/cm2, Voc 1.0 to 1.1 V): a plausibility check, no proof.
#[test]
fn window_and_bsf_gives_a_sensible_gaas_cell() {
    let bench = run("window_and_bsf.rhai");
    let light = bench.snapshot("window_and_bsf.epiloom", "light J-V");
    let (jsc, voc, ff) = (figure(&light, "jsc"), figure(&light, "voc"), figure(&light, "ff"));
    assert!((26.0..30.0).contains(&jsc), "{jsc}");
    assert!((1.0..1.1).contains(&voc), "{voc}");
    assert!((0.75..0.9).contains(&ff), "{ff}");
    let efficiency = figure(&light, "efficiency");
    let product = jsc * voc * ff / 100.0371;
    assert!((efficiency - product).abs() < 1e-5 * efficiency, "the product over the light's 1000.371 W/m2");
    // the response's integral against the current is no exact relation (the response is on steps of 5 nm)
    let response = bench.snapshot("window_and_bsf.epiloom", "response");
    let highest = column(&response, "eqe").into_iter().fold(0.0, f64::max);
    assert!((0.8..0.95).contains(&highest), "no more than what is not reflected: {highest}");
}

/// Source of truth: the scaling of the two channels with the density of carriers: their ratio grows with concentration,
/// stays below 0.1 % in lightly doped GaAs, and is in the order of the materials' coefficients.
#[test]
fn auger_shows_under_concentration_where_it_should() {
    let bench = run("concentrator_auger.rhai");
    let ratio = |cell: &str| {
        let table = bench.snapshot("concentrator_auger.epiloom", &format!("{cell}, 1 to 1000 suns"));
        column(&table, "auger_to_radiative")
    };
    let (gaas, gainas, si) = (ratio("GaAs"), ratio("GaInAs on InP"), ratio("Si"));
    for series in [&gaas, &gainas, &si] {
        assert!(series.len() == 4 && series.windows(2).all(|pair| pair[1] > pair[0]), "{series:?}");
    }
    assert!(gaas[3] < 1e-3, "{gaas:?}");
    assert!(gainas[3] > 0.05 && si[3] > 1.0, "{gainas:?} {si:?}");
}

/// Source of truth: README itself: its first script runs as printed, and its input can be set from outside.
#[test]
fn the_first_script_of_the_readme_runs() {
    let readme = std::fs::read_to_string(workspace().join("README.md")).expect("README");
    let script =
        readme.split("```rhai\n").nth(1).and_then(|rest| rest.split("```").next()).expect("a script");
    let bench = Bench::with("first.rhai", script);
    let ran = bench.ends(0, &["run", "first.rhai", "--set", "emitter_thickness=80nm"]);
    assert_eq!(
        ran.out.lines().filter(|line| line.contains("efficiency ") && line.contains("Jsc ")).count(),
        4
    );
    for command in ["run scenarios/window_and_bsf.rhai", "cargo test --release --workspace"] {
        assert!(readme.contains(command), "README names `{command}`");
    }
}
