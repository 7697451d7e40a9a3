//! Every scenario runs as it stands, and gives what its header expects.

use crate::support::{Bench, figure, workspace};

fn run(name: &str) -> Bench {
    let bench = Bench::empty();
    let script = workspace().join("scenarios").join(name);
    bench.ends(0, &["check", &script.to_string_lossy()]);
    bench.ends(0, &["run", &script.to_string_lossy()]);
    bench
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
    assert!(
        (efficiency - jsc * voc * ff / 100.0371).abs() < 1e-4 * efficiency,
        "the product over the light's 1000.371 W/m2"
    );
    bench.ends(0, &["replay", "window_and_bsf.epiloom"]);
}

/// Source of truth: the folder itself: no scenario may be left without a test here.
#[test]
fn every_scenario_is_tested() {
    let mut names: Vec<String> = std::fs::read_dir(workspace().join("scenarios"))
        .expect("the folder of scenarios")
        .map(|entry| entry.expect("readable").file_name().to_string_lossy().into_owned())
        .filter(|name| name.ends_with(".rhai"))
        .collect();
    names.sort();
    assert_eq!(names, ["concentrator_auger.rhai", "silicon_cell.rhai", "window_and_bsf.rhai"]);
}

/// Source of truth: what crystalline silicon can have: less than 43 mA/cm2 and 0.75 V under one sun.
#[test]
fn the_silicon_cell_is_sensible() {
    let bench = run("silicon_cell.rhai");
    let light = bench.snapshot("silicon_cell.epiloom", "light J-V");
    let (jsc, voc) = (figure(&light, "jsc"), figure(&light, "voc"));
    assert!((30.0..42.0).contains(&jsc), "{jsc}");
    assert!((0.55..0.72).contains(&voc), "{voc}");
}
