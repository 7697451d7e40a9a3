//! Materials, layers, stacks and light: what is built, and what is refused at its place.

use super::*;

fn check(text: &str) -> RunOutcome {
    expect_diagnostics(text, RunOptions { check_only: true, ..RunOptions::default() })
}

/// A cell to put statements after.
fn with_cell(statements: &str) -> String {
    format!(
        "let gaas = material(\"GaAs\", #{{ electron_lifetime: 20.ns, hole_lifetime: 20.ns }});\nlet cell = stack(\"test\", [\n    \
         layer(\"emitter\", gaas, 120.nm, donors(2e18.per_cm3)),\n    layer(\"base\", gaas, 3.um, acceptors(1e17.per_cm3)),\n]);\n{statements}"
    )
}

/// Source of truth: the rules of each function by hand; place and code stand in each script.
#[test]
fn layers_and_materials_are_checked_at_their_place() {
    let fault = fails(
        "let t = 150;\nlet gaas = material(\"GaAs\");\nlayer(\"emitter\", gaas, (t - 200).nm, donors(2e18.per_cm3)); // ~ E210",
    );
    assert_eq!(fault.message, "thickness of layer `emitter` must be positive");
    assert_eq!(fault.labels[0].text, "this is -50 nm");
    let source = "let t = 150;\nlet gaas = material(\"GaAs\");\nlayer(\"emitter\", gaas, (t - 200).nm, donors(2e18.per_cm3)); // ~ E210";
    let span = fault.labels[0].span;
    assert_eq!(&source[span.start..span.end], "(t - 200).nm");
    fails("layer(\"a\", material(\"GaAs\"), 0.nm, intrinsic()); // ~ E210");
    let bare = fails("layer(\"a\", material(\"GaAs\"), 30, intrinsic()); // ~ E200");
    assert_eq!(bare.help.as_deref(), Some("write `30.nm`, with the unit that is meant"));
    fails("layer(\"a\", material(\"GaAs\"), 30.V, intrinsic()); // ~ E202");
    fails("layer(\"a\", \"GaAs\", 30.nm, intrinsic()); // ~ E107");
    fails("layer(\"a\", material(\"GaAs\"), 30.nm, 1e17.per_cm3); // ~ E107");
    fails("layer(\"a\", material(\"GaAs\"), 30.nm); // ~ E104");
    fails("material(\"GaAsN\"); // ~ E217");
    fails("material(\"GaAsP\"); // ~ E216");
    fails("material(\"AlGaAs\"); // ~ E216");
    fails("material(\"GaAs\", #{ x: 0.3 }); // ~ E216");
    fails("material(\"AlGaAs\", #{ x: 1.3 }); // ~ E216");
    let key = fails("material(\"GaAs\", #{ electron_lifetme: 20.ns }); // ~ E108");
    assert_eq!(key.help.as_deref(), Some("did you mean `electron_lifetime`?"));
    fails("material(\"GaAs\", #{ gap: 20.eV }); // ~ E215");
    fails("material(\"GaAs\", #{ gap: 1.4 }); // ~ E200");
    fails(
        "custom_material(\"x\", #{ gap: 1.4.eV, affinity: 4.eV, permittivity: 12, nc: 1e18.per_cm3, nv: 1e18.per_cm3, electron_mobility: 1.cm2_per_Vs }); // ~ E218",
    );
    fails("donors(-1e17.per_cm3); // ~ E214");
    fails("donors(1e17); // ~ E200");
    fails("donors(graded(\"exponential\", 1e17.per_cm3, 0.per_cm3)); // ~ E223");
    fails("graded(\"linar\", 1, 2); // ~ E122");
    fails("graded([[0.nm, 1e17.per_cm3]]); // ~ E223");
    fails("graded([[10.nm, 1e17.per_cm3], [5.nm, 1e18.per_cm3]]); // ~ E223");
    fails("ohmic(#{ recombination_velocity: -1.cm_per_s }); // ~ E224");
    fails("ohmic(#{ velocity: 1e6.cm_per_s }); // ~ E108");
    fails("donors(infinity.per_cm3); // ~ E203");
}

/// Source of truth: the rules of a second diode by hand.
#[test]
fn diodes_are_checked_at_their_place() {
    let none = fails("second_diode(#{ ideality: 2 }); // ~ E237");
    assert!(none.help.is_some_and(|help| help.contains("1e-9.mA_per_cm2")));
    fails("second_diode(#{ saturation_current_density: 1e-9 }); // ~ E200");
    fails("second_diode(#{ saturation_current_density: -1e-9.mA_per_cm2 }); // ~ E237");
    fails("second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2, ideality: 0 }); // ~ E237");
    fails("second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2, n: 2 }); // ~ E108");
    fails(&with_cell("cell.second_diode = 3; // ~ E107"));
    let text = "cell.second_diode = second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2 });\ncell.second_diode = ();";
    assert!(check(&with_cell(text)).errors.is_empty());
}

/// Source of truth: the rules of each contact by hand.
#[test]
fn contacts_are_checked_at_their_place() {
    let none = fails("schottky(#{}); // ~ E236");
    assert_eq!(none.help.as_deref(), Some("give one of them: schottky(#{ electron_barrier: 0.8.eV })"));
    fails("schottky(#{ electron_barrier: 0.8.eV, hole_barrier: 0.6.eV }); // ~ E236");
    fails("schottky(#{ electron_barrier: 0.8 }); // ~ E200");
    fails("schottky(#{ electron_barrier: 0.8.V }); // ~ E202");
    fails("schottky(#{ electron_barrier: 0.8.eV, electron_emission_velocity: -1.cm_per_s }); // ~ E224");
    let near = fails("schottky(#{ barrier: 0.8.eV }); // ~ E108");
    assert!(near.help.is_some_and(|help| help.contains("electron_barrier")));
    fails("selective(#{ electron_velocity: 3 }); // ~ E200");
    fails("schottky(); // ~ E104");
    let high = fails(&with_cell(
        "cell.rear = schottky(#{ electron_barrier: 8.eV });\ncell.equilibrium(); // ~ E236",
    ));
    assert!(high.message.contains("electron barrier of the rear contact must be"), "{}", high.message);
    let blocked = "cell.front = selective(#{ electron_velocity: 0.cm_per_s, hole_velocity: 0.cm_per_s });";
    fails(&with_cell(&format!("{blocked}\ncell.equilibrium(); // ~ E236")));
}

/// Source of truth: the rules of a stack by hand.
#[test]
fn stacks_are_checked_at_their_place() {
    fails("stack(\"a\", []); // ~ E211");
    fails(
        "let gaas = material(\"GaAs\");\nstack(\"a\", [\n    layer(\"x\", gaas, 1.um, intrinsic()),\n    layer(\"x\", gaas, 1.um, intrinsic()), // ~ E212\n]);",
    );
    fails(
        "stack(\"a\", [\n    interface(#{}), // ~ E213\n    layer(\"x\", material(\"GaAs\"), 1.um, intrinsic()),\n]);",
    );
    fails(
        "stack(\"a\", [\n    layer(\"x\", material(\"GaAs\"), 1.um, intrinsic()),\n    interface(#{}), // ~ E213\n]);",
    );
    fails("stack(\"a\", [3]); // ~ E107");
    fails(&with_cell("cell.front_reflectance = 5; // ~ E219"));
    fails(&with_cell("cell.temperature = 300; // ~ E200"));
    fails(&with_cell("cell.temperature = 5.K; // ~ E220"));
    fails(&with_cell("cell.series_resistance = -1.ohm_cm2; // ~ E221"));
    fails(&with_cell("cell.shunt_resistance = 0.ohm_cm2; // ~ E221"));
    fails(&with_cell("cell.accuracy = 2; // ~ E229"));
    fails(&with_cell("cell.statistics = \"bolzmann\"; // ~ E122"));
    fails(&with_cell("cell.lit_from = \"left\"; // ~ E122"));
    fails(&with_cell("cell.front = 3; // ~ E107"));
    let near = fails(&with_cell("cell.temprature = 300.K; // ~ E105"));
    assert_eq!(near.help.as_deref(), Some("did you mean `temperature`?"));
    let layer = fails(&with_cell("cell[\"bse\"].thickness = 5.nm; // ~ E222"));
    assert_eq!(layer.help.as_deref(), Some("did you mean `base`?"));
    fails(&with_cell("cell[\"base\"].thickness = -5.nm; // ~ E210"));
    fails(&with_cell("cell[\"base\"].thicknes = 5.nm; // ~ E105"));
    fails(&with_cell("cell[\"base\"].electron_lifetime = 5; // ~ E200"));
    fails(&with_cell("cell.front_reflectance = [[900.nm, 0.1], [300.nm, 0.2]]; // ~ E223"));
}

/// Source of truth: what the laws of an interface need and exclude, by hand; the offsets that a bias point then shows.
#[test]
fn laws_of_interfaces_are_checked_and_kept() {
    let near = fails("interface(#{ transport: \"thermoionic\" }); // ~ E122");
    assert_eq!(near.help.as_deref(), Some("did you mean `thermionic`?"));
    fails("interface(#{ electron_emission_velocity: 0.cm_per_s }); // ~ E224");
    fails("interface(#{ electron_emission_velocity: 1e7 }); // ~ E200");
    fails("interface(#{ transport: \"continuous\", hole_emission_velocity: 1e6.cm_per_s }); // ~ E238");
    let twice = fails("interface(#{ valence_offset: 0.3.eV, offset_ratio: 0.6 }); // ~ E238");
    assert!(twice.help.is_some_and(|help| help.contains("give one")));
    fails("interface(#{ conduction_offset: 0.3.V }); // ~ E202");
    let key = fails("interface(#{ conduction_ofset: 0.3.eV }); // ~ E108");
    assert_eq!(key.help.as_deref(), Some("did you mean `conduction_offset`?"));
    let stack = |options: &str, expected: &str| {
        format!(
            "let gaas = material(\"GaAs\", #{{ electron_lifetime: 20.ns, hole_lifetime: 20.ns }});\n\
             let wide = material(\"AlGaAs\", #{{ x: 0.3, electron_lifetime: 1.ns, hole_lifetime: 1.ns }});\n\
             let cell = stack(\"a\", [\n    layer(\"w\", wide, 50.nm, donors(1e18.per_cm3)), {expected}\n    \
             interface(#{{ {options} }}),\n    layer(\"b\", gaas, 1.um, acceptors(1e17.per_cm3)),\n]);\n\
             let step = cell.equilibrium().barriers[0];\n"
        )
    };
    let text = stack("transport: \"thermionic\", conduction_offset: -0.2.eV", "");
    assert_eq!(printed(&format!("{text}print((step.electrons.to(\"eV\") + 0.2).abs() < 1e-9);")), ["true"]);
    let text = stack("valence_offset: 0.15.eV", "");
    assert_eq!(printed(&format!("{text}print((step.holes.to(\"eV\") + 0.15).abs() < 1e-9);")), ["true"]);
    fails(&stack("conduction_offset: 7.eV", "// ~ E240"));
    fails(&stack("states: 1e12.per_cm2, states_kind: \"donor\"", "// ~ E109"));
    fails(&stack("sheet_charge: 1e18.per_cm2", "// ~ E240"));
    fails("interface(#{ states: 1e12.per_cm2, recombination_velocity: 1.cm_per_s }); // ~ E109");
    fails("interface(#{ states_kind: \"donor\" }); // ~ E109");
    fails("interface(#{ carriers: \"both\" }); // ~ E122");
    fails("interface(#{ trap_energy: 0.1.eV, trap_above_valence_band: 0.7.eV }); // ~ E238");
    let text = stack(
        "recombination_velocity: 1e4.cm_per_s, carriers: \"both sides\", trap_energy: 0.1.eV, states: 1e11.per_cm2, states_kind: \"acceptor\", \
         sheet_charge: -1e11.per_cm2",
        "",
    );
    let lines = printed(&format!(
        "{text}let point = cell.at(0.5.V, dark()); let found = point.interfaces[0];\n\
         print(found.front + found.rear); print(found.occupancy < 1); print(found.charge < 0.C_per_cm2);\n\
         print(found.seen_from_rear != ()); print(found.electron_jump == 0.eV);"
    ));
    assert_eq!(lines, ["wb", "true", "true", "true", "true"]);
}

/// Source of truth: the list of mistakes that every author meets.
#[test]
fn lost_edits_have_their_own_help() {
    let fault = fails(&with_cell(
        "fn thinner(c) {\n    c[\"base\"].thickness = 2.um; // ~ E113\n}\nthinner(cell);\nprint(cell.name);",
    ));
    assert!(fault.help.as_deref().is_some_and(|h| h.contains("return the changed stack")), "{fault:?}");
    fails(&with_cell("fn hot(c) {\n    c.temperature = 350.K; // ~ E113\n    1\n}\nhot(cell);"));
    fails(&with_cell("if true {\n    let base = cell[\"base\"];\n    base.thickness = 2.um; // ~ E113\n}"));
    // nor does the stack hear of it at the outer level, however much is solved below
    let fault = fails(&with_cell(
        "let base = cell[\"base\"];\nbase.thickness = 2.um; // ~ E113\nprint(cell[\"base\"].thickness);",
    ));
    assert!(fault.help.as_deref().is_some_and(|h| h.contains("cell[\"window\"]")), "{fault:?}");
    let lines = printed(&with_cell(
        "let base = cell[\"base\"]; base.thickness = 2.um; cell[\"base\"] = base; print(cell[\"base\"].thickness);",
    ));
    assert_eq!(lines, ["2 um"]);
    let figure = fails(&with_cell("print(cell.Jsc); // ~ E222"));
    assert_eq!(figure.help.as_deref(), Some("a figure of merit belongs to a curve: cell.jv(light).jsc"));
    // a change is not lost where the script breaks off before its use
    fails(&with_cell("cell.temperature = 350.K;\nlet sum = 3.nm + 1; // ~ E200"));
    fails(&with_cell("cell.layer(\"base\") = 3; // ~ E114"));
    fails(&with_cell("cell.layer(\"base\").thickness = 3.nm; // ~ E114"));
    // what is returned, used or superseded is not lost
    let lines = printed(&with_cell(
        "fn thinner(c) { c[\"base\"].thickness = 2.um; c.temperature = 350.K; c }\nlet thin = thinner(cell);\nprint(thin[\"base\"].thickness);\n\
         print(cell[\"base\"].thickness);\nlet copy = cell; copy.temperature = 310.K; copy.temperature = 320.K; print(copy.temperature);\n\
         print(cell.temperature);",
    ));
    assert_eq!(lines, ["2 um", "3 um", "320 K", "298.15 K"]);
    // reading through a property is no change of what it belongs to
    let lines = printed(&with_cell(
        "fn words(c) { `${c.layers.len()} ${c.name.len()} ${c.temperature.to(\"K\")} ${c[\"base\"].thickness.to(\"nm\")}` }\nprint(words(cell));",
    ));
    assert_eq!(lines, ["2 4 298.15 3000"]);
    fails(&with_cell("cell.layers = []; // ~ E222"));
}

/// Source of truth: the rules of light by hand.
#[test]
fn lights_are_checked_at_their_place() {
    let fault = fails("spectrum(\"AM1.5\"); // ~ E226");
    assert!(fault.help.is_some());
    fails("spectrum(\"AM1.5G\", -1); // ~ E225");
    fails("monochromatic(#{}); // ~ E109");
    fails("monochromatic(#{ photon_flux: 2e17 }); // ~ E200");
    fails("monochromatic(#{ photon_flux: 0.per_cm2_s }); // ~ E225");
    fails("let n = dark(); n.suns = 3; // ~ E225");
    fails("film(0.5, 30.nm); // ~ E225");
    fails("film(\"MgF\", 30.nm); // ~ E122");
    fails("coating([3]); // ~ E107");
    let lines = printed(
        "let sun = spectrum(\"AM1.5G\"); print(sun.irradiance); sun.suns = 100; print(sun.suns); print(spectrum(\"AM0\").irradiance.to(\"W_per_m2\") > 1366);",
    );
    assert_eq!(lines[1..], ["100".to_string(), "true".to_string()]);
    assert!(lines[0].starts_with("100.03"), "{lines:?}");
}

/// Source of truth: `()` entries are skipped, arrays in the array count as their entries.
#[test]
fn entries_that_are_not_there_are_skipped() {
    let lines = printed(
        "let gaas = material(\"GaAs\");\nlet t = 0.nm;\nlet cell = stack(\"a\", [\n    if t > 0.nm { layer(\"window\", gaas, t, intrinsic()) },\n    \
         [layer(\"p\", gaas, 1.um, acceptors(1e17.per_cm3)), interface(#{ recombination_velocity: 1e4.cm_per_s })],\n    \
         layer(\"n\", gaas, 1.um, donors(1e17.per_cm3) + acceptors(1e16.per_cm3)),\n]);\nfor l in cell.layers { print(l.name); }",
    );
    assert_eq!(lines, ["p", "n"]);
}

/// Source of truth: a check solves nothing, and figures it has not solved make no faults of their own.
#[test]
fn a_check_finds_all_faults_of_a_device() {
    check(
        "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet bad = material(\"GaAs\", #{ gap: 99.eV }); // ~ E215\n\
         let cell = stack(\"a\", [\n    layer(\"a\", bad, 1.um, intrinsic()),\n    layer(\"b\", gaas, -1.um, intrinsic()), // ~ E210\n    \
         layer(\"c\", gaas, 1, intrinsic()), // ~ E200\n]);\nlet jv = cell.jv(spectrum(\"AM1.5X\")); // ~ E226\nprint(jv.voc + 1.V);",
    );
    check(&with_cell(
        "let sun = spectrum(\"AM1.5G\");\nlet jv = cell.jv(sun);\nif jv.voc > 1.V { print(jv.points[0].voltage); }\nlet p = cell.at(jv.mpp.voltage, sun);\n\
         print(p.ledger[0].value);\nstore(\"x\", jv);\nlet e = cell.eqe(300.nm, 900.nm, 5.nm); print(e.points[3].eqe);\nlet wrong = jv.voc + 1.nm; // ~ E201",
    ));
    check(&with_cell(
        "cell.rear_reflectance = 1;\ncell.front_internal_reflectance = 1;\nlet jv = cell.jv(dark()); // ~ E240",
    ));
    check(&with_cell(
        "let a = cell.jv(dark(), 0.V, 1.V, -0.1.V); // ~ E228\nlet b = cell.eqe(900.nm, 300.nm, 5.nm); // ~ E227\nlet c = cell.jv(dark(), []); // ~ E228",
    ));
    check(&with_cell(
        "let cv = cell.capacitance(dark(), [0.V, -1.V]);\nprint(1.0 / (cv.points[0].capacitance * cv.points[0].capacitance));\nstore(\"c\", cv);\n\
         let a = cell.capacitance(dark(), []); // ~ E228\nlet b = cell.capacitance(dark()); // ~ E104\nlet c = cell.capacitance([0.V], dark()); // ~ E107",
    ));
    check(
        "let bare = material(\"GaAs\");\nlet cell = stack(\"a\", [\n    layer(\"base\", bare, 1.um, acceptors(1e17.per_cm3)), // ~ W201\n]);\nlet jv = cell.jv(dark());",
    );
}
