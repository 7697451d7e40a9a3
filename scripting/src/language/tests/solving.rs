//! Scripts that solve: the main scenario's script, and the other forms of asking.

use super::*;

const WINDOW_AND_BSF: &str = r#"
let gaas    = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
let wide    = material("AlGaAs", #{ x: 0.80 });
let barrier = material("AlGaAs", #{ x: 0.30 });
let bsf     = input("bsf_thickness", 80.nm);            // overridden by --set bsf_thickness=50nm

let cell = stack("Larch Bay 12", [
    layer("window",             wide,     30.nm, donors(2e18.per_cm3)),
    layer("emitter",            gaas,    120.nm, donors(2e18.per_cm3)),
    layer("base",               gaas,    3.0.um, acceptors(1e17.per_cm3)),
    layer("back surface field", barrier,    bsf, acceptors(2e18.per_cm3)),
    layer("buffer",             gaas,    300.nm, acceptors(5e18.per_cm3)),
]);
cell.front_reflectance = 0.05;
cell.front = ohmic(#{ recombination_velocity: 1e6.cm_per_s });
cell.rear  = ohmic(#{ recombination_velocity: 1e7.cm_per_s });

let sun = spectrum("AM1.5G");
let jv  = cell.jv(sun);
print(`Jsc ${jv.jsc}  Voc ${jv.voc}  FF ${jv.ff}  efficiency ${jv.efficiency}`);
store("light J-V", jv);
store("dark J-V", cell.jv(dark(), 0.V, 1.1.V, 20.mV));
store("response", cell.eqe(300.nm, 900.nm, 5.nm));
store("bands at maximum power", cell.at(jv.mpp.voltage, sun));
"#;

/// Source of truth: the specification and its physical bounds, 26 to 30 mA/cm2 and 1.0 to 1.1 V.
#[test]
fn the_main_script_runs_as_it_stands() {
    let (outcome, recorder) = run_text(WINDOW_AND_BSF);
    assert!(outcome.errors.is_empty(), "{}", shown(WINDOW_AND_BSF, &outcome.errors));
    assert_eq!(outcome.stored, 4);
    let names: Vec<&str> = recorder.snapshots.iter().map(|s| s.name()).collect();
    assert_eq!(names, ["light J-V", "dark J-V", "response", "bands at maximum power"]);
    let light = &recorder.snapshots[0];
    let figure = |name: &str| light.figure(name).and_then(|f| f.value).unwrap_or(f64::NAN);
    assert!((26.0..30.0).contains(&figure("jsc")), "{}", figure("jsc"));
    assert!((1.0..1.1).contains(&figure("voc")), "{}", figure("voc"));
    assert!((0.7..0.95).contains(&figure("ff")));
    assert_eq!(recorder.snapshots[1].table("points").map(|t| t.rows), Some(56));
    assert_eq!(recorder.snapshots[2].table("response").map(|t| t.rows), Some(121));
    assert!(recorder.snapshots[3].ledgers.len() >= 3);
    assert!(recorder.snapshots.iter().all(|s| !s.materials.is_empty() && s.stack.layers.len() == 5));
    assert!(
        recorder.lines[0].starts_with("Jsc ") && recorder.lines[0].contains(" V +- "),
        "{:?}",
        recorder.lines
    );
}

/// Source of truth: the stated conventions: a bar has no figures of merit but a reason; J V >= 0 in the dark.
#[test]
fn figures_that_do_not_exist_are_nothing_with_a_reason() {
    let lines = printed(
        r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let bar = stack("bar", [layer("bar", gaas, 1.um, donors(1e17.per_cm3))]);
        let jv = bar.jv(dark(), [0.V, 10.mV, -10.mV]);
        print(jv.voc == ());
        print(jv.reason("voc") != ());
        print(jv.mpp.voltage == ());
        for p in jv.points { print((p.voltage * p.current_density).to("W_per_m2") >= 0); }
        print(jv.stopped == ());
        "#,
    );
    assert_eq!(lines, ["true", "true", "true", "true", "true", "true", "true"]);
    fails(
        "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\n\
         let bar = stack(\"bar\", [layer(\"bar\", gaas, 1.um, donors(1e17.per_cm3))]);\n\
         let v = bar.jv(dark(), [0.V, 10.mV]).voc * 2; // ~ E302",
    );
}

/// Source of truth: the places of the ledger's own lines; a wrong one is told with those there are.
#[test]
fn a_place_that_the_ledger_does_not_have_is_told() {
    let cell = "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\n\
                let bar = stack(\"bar\", [layer(\"bar\", gaas, 1.um, donors(1e17.per_cm3))]);\nlet p = bar.at(0.V, dark());\n";
    let fault = fails(&format!("{cell}p.total(\"carriers\", \"Auger\", \"bas\"); // ~ E122"));
    assert_eq!(fault.help.as_deref(), Some("did you mean `bar`?"));
    fails(&format!("{cell}p.total(\"carriers\", \"surface recombination\", \"bar\"); // ~ E122"));
}

/// Source of truth: the specified forms, each used once on a small diode; ledger and totals agree by definition.
#[test]
fn every_form_of_asking_works() {
    let text = r#"
        let test = custom_material("test", #{ gap: 1.424.eV, affinity: 4.07.eV, permittivity: 12.9, nc: 4.7e17.per_cm3, nv: 9e18.per_cm3,
            electron_mobility: 3000.cm2_per_Vs, hole_mobility: 200.cm2_per_Vs, electron_lifetime: 1.ns, hole_lifetime: 10.ns,
            radiative_coefficient: 0.cm3_per_s, electron_auger: 0.cm6_per_s, hole_auger: 0.cm6_per_s, absorption: 1e4.per_cm });
        let cell = stack("diode", [layer("n", test, 200.nm, donors(1e18.per_cm3)),
            interface(#{ recombination_velocity: 1e3.cm_per_s }), layer("p", test, 1.um, acceptors(1e17.per_cm3))]);
        cell.temperature = 300.K;
        cell.statistics = "boltzmann";
        cell.series_resistance = 0.5.ohm_cm2;
        cell.shunt_resistance = 5000.ohm_cm2;
        let light = monochromatic(#{ photon_flux: 2e17.per_cm2_s });
        let jv = cell.jv(light, [0.V, 0.4.V]);
        print(jv.efficiency == ());
        print(jv.points[0].current_density < 0.mA_per_cm2);
        print(jv.points[0].junction_voltage > 0.V);
        let point = cell.at(0.4.V, light);
        let sum = 0.mA_per_cm2;
        for line in point.ledger { if line.account == "carriers" && line.channel == "Shockley-Read-Hall" { sum += line.value; } }
        let total = point.total("carriers", "Shockley-Read-Hall");
        let layers = point.total("carriers", "Shockley-Read-Hall", "n") + point.total("carriers", "Shockley-Read-Hall", "p");
        print(abs(total / sum - 1) < 1e-2 && abs(layers / total - 1) < 1e-12);
        print(point.profiles.depth.len() == point.profiles.electrons.len());
        let bands = cell.equilibrium();
        print(bands.sheet_resistance["n"] > 1.ohm);
        print(bands.barriers.len());
        let d = cell;
        d["p"].thickness = 2.um;
        print(cell["p"].thickness);
        let response = d.eqe([500.nm, 600.nm], #{ voltage: 0.1.V, bias_light: light });
        print(response.points.len());
        let cv = cell.capacitance(dark(), -1.V, 0.V, 0.5.V).points;
        print(cv[0].voltage == -1.V && cv[0].capacitance < cv[2].capacitance);
        print(abs(cv[0].stored / cv[0].capacitance - 1) < 1e-3 && cv[0].conductance > 0.mS_per_cm2);
        store("capacitance", cell.capacitance(dark(), [-0.5.V]));
        store("figures", #{ jsc: jv.jsc, note: 0.5 });
        store("table", [#{ v: 0.1.V, j: 1.mA_per_cm2 }, #{ v: 0.2.V, j: 2.mA_per_cm2 }]);
        "#;
    let (outcome, recorder) = run_text(text);
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(
        recorder.lines,
        ["true", "true", "true", "true", "true", "true", "1", "1 um", "2", "true", "true"]
    );
    let points = recorder.snapshots[0].table("capacitance").expect("the points of a C-V curve");
    assert_eq!(points.columns[1].name, "capacitance_nF_per_cm2");
    assert!(points.columns[1].values[0] > 0.0);
    let table = recorder.snapshots[2].table("table").expect("a table");
    let names: Vec<&str> = table.columns.iter().map(|c| c.name.as_str()).collect();
    assert_eq!(names, ["j_mA_per_cm2", "v_V"]);
    fails("store(\"x\", 3); // ~ E107");
    fails("store(\"x\", #{ a: 1 });\nstore(\"x\", #{ a: 1 }); // ~ E119");
    fails("store(\"x\", [#{ a: 1 }, #{ a: 1.nm }]); // ~ E201");
}

/// Source of truth: the curve with its points: the figures alone have the same bits, errors and meshes included.
#[test]
fn the_figures_alone_are_those_of_the_curve() {
    let text = r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let cell = stack("d", [layer("n", gaas, 100.nm, donors(1e18.per_cm3)), layer("p", gaas, 1.um, acceptors(1e17.per_cm3))]);
        cell.series_resistance = 0.5.ohm_cm2;
        store("curve", cell.jv(spectrum("AM1.5G")));
        store("figures", cell.figures(spectrum("AM1.5G")));
        print(cell.figures(dark()).reason("voc"));
    "#;
    let (outcome, recorder) = run_text(text);
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(recorder.snapshots[0].figures, recorder.snapshots[1].figures);
    assert_eq!(recorder.snapshots[1].table("points").map(|t| t.rows), Some(0));
    assert_eq!(recorder.lines, ["no light is absorbed"]);
}

/// Source of truth: the same script gives the same bytes.
#[test]
fn a_second_run_gives_the_same_snapshots() {
    let text = "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\n\
        let cell = stack(\"d\", [layer(\"n\", gaas, 100.nm, donors(1e18.per_cm3)), layer(\"p\", gaas, 1.um, acceptors(1e17.per_cm3))]);\n\
        store(\"a\", cell.jv(spectrum(\"AM1.5G\"), [0.V, 0.8.V]));";
    let (_, first) = run_text(text);
    let (_, second) = run_text(text);
    assert_eq!(first.snapshots.len(), 1);
    assert_eq!(first.snapshots, second.snapshots);
}

/// Source of truth: a closure works on its own copy of what it captures, whatever way a user writes it.
#[test]
fn closures_may_capture_stacks() {
    let lines = printed(
        r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let cell = stack("d", [layer("n", gaas, 100.nm, donors(1e18.per_cm3)), layer("p", gaas, 1.um, acceptors(1e17.per_cm3))]);
        let currents = [0.2.V, 0.4.V].map(|v| cell.at(v, dark()).current_density);
        print(currents[1] > currents[0]);
        let thinner = |t| { let c = cell; c["p"].thickness = t; c };
        print(thinner.call(500.nm)["p"].thickness);
        print(cell["p"].thickness);
        "#,
    );
    assert_eq!(lines, ["true", "500 nm", "1 um"]);
}

/// Source of truth: what the catalogue says of each warning; each stands at the layer or the analysis it is about.
#[test]
fn warnings_stand_where_they_belong() {
    let checked = RunOptions { check_only: true, ..RunOptions::default() };
    let text = r#"let life = #{ electron_lifetime: 1.ns, hole_lifetime: 1.ns };
let cell = stack("d", [
    layer("window", material("AlInP"), 20.nm, donors(1e18.per_cm3), life), // ~ W202 W202 W206
    layer("n", material("AlGaAs", #{ x: 0.33 }), 100.nm, donors(1e18.per_cm3), life), // ~ W204 W205
    layer("p", material("Si"), 1.um, acceptors(1e17.per_cm3), life),
]);
let jv = cell.jv(dark());"#;
    expect_diagnostics(text, checked.clone());
    let cold = r#"let gaas = material("GaAs", #{ electron_lifetime: 1.ns, hole_lifetime: 1.ns });
let cell = stack("d", [
    layer("n", gaas, 100.nm, donors(1e18.per_cm3)),
]);
cell.temperature = 40.K;
let jv = cell.jv(dark()); // ~ W203"#;
    expect_diagnostics(cold, checked);
    // the common coated cell is quiet; an accuracy that no mesh reaches is said
    let quiet = r#"let gaas = material("GaAs", #{ electron_lifetime: 1.ns, hole_lifetime: 1.ns });
let cell = stack("d", [
    layer("n", gaas, 100.nm, donors(1e18.per_cm3)),
    layer("p", gaas, 1.um, acceptors(1e17.per_cm3)),
]);
cell.front_reflectance = coating([film("MgF2", 95.nm), film("ZnS", 50.nm)]);
let jv = cell.jv(spectrum("AM1.5G"), [0.V]);
let silicon = stack("s", [layer("s", material("Si", #{ electron_lifetime: 1.us, hole_lifetime: 1.us }), 100.um, donors(1e15.per_cm3))]);
let bands = silicon.at(0.V, spectrum("AM1.5G"));
let hard = stack("h", [
    layer("w", material("AlGaAs", #{ x: graded("linear", 0.2, 0.4), electron_lifetime: 1.ns, hole_lifetime: 1.ns }), 50.nm, donors(graded("erfc", 1e19.per_cm3, 1e15.per_cm3, 5.nm))), // ~ W205
    layer("n", gaas, 100.nm, donors(1e18.per_cm3)),
    layer("p", gaas, 1.um, acceptors(1e17.per_cm3)),
]);
hard.accuracy = 1e-9;
let exact = hard.jv(spectrum("AM1.5G"), [0.V]); // ~ W313"#;
    expect_diagnostics(quiet, RunOptions::default());
    let lit = r#"let gaas = material("GaAs", #{ electron_lifetime: 1.ns, hole_lifetime: 1.ns });
let cell = stack("d", [
    layer("n", gaas, 100.nm, donors(1e18.per_cm3)), // ~ W303
    layer("p", gaas, 1.um, acceptors(1e17.per_cm3)), // ~ W303
]);
cell.front_reflectance = [[400.nm, 0.1], [900.nm, 0.1]];
let jv = cell.jv(spectrum("AM1.5G"), [0.V]); // ~ W302
let response = cell.eqe([200.nm, 600.nm]);"#;
    expect_diagnostics(lit, RunOptions::default());
}

/// Source of truth: a sink that cannot keep a snapshot stops the script with its own words.
#[test]
fn a_snapshot_that_is_not_kept_stops_the_script() {
    struct Full;
    impl Sink for Full {
        fn snapshot(&mut self, _: Snapshot) -> Result<(), String> {
            Err("the disk is full".to_string())
        }
    }
    let outcome = run(&script("store(\"a\", #{ x: 1 });\nprint(1);"), RunOptions::default(), &mut Full);
    assert_eq!(outcome.errors[0].code, codes::UNWRITABLE); // E403
    assert_eq!((outcome.errors[0].message.as_str(), outcome.stored), ("the disk is full", 0));
}

/// Source of truth: every way to describe doping, composition and optics goes through the solver; currents in the dark at 0 V vanish.
#[test]
fn every_way_of_describing_a_stack_is_solved() {
    let text = r#"
        let life = #{ electron_lifetime: 5.ns, hole_lifetime: 5.ns };
        let gaas = material("GaAs", life);
        let cell = stack("all", [
            layer("graded", material("AlGaAs", #{ x: graded("linear", 0.3, 0.0), electron_lifetime: 1.ns, hole_lifetime: 1.ns }), 50.nm, donors(2e18.per_cm3)),
            layer("erfc", gaas, 200.nm, donors(graded("erfc", 2e18.per_cm3, 1e15.per_cm3, 80.nm)) + acceptors(1e16.per_cm3)),
            layer("intrinsic", gaas, 20.nm, intrinsic()),
            layer("table", gaas, 100.nm, acceptors(graded([[0.nm, 1e16.per_cm3], [50.nm, 1e17.per_cm3]])), #{ optics: "inert" }),
            layer("exponential", gaas, 1.um, acceptors(graded("exponential", 1e17.per_cm3, 1e18.per_cm3))),
        ]);
        cell.front_reflectance = coating([film("MgF2", 90.nm), film("ZnS", 50.nm)]);
        cell.rear_reflectance = 0.5;
        cell.grid_shading = 4.percent;
        let sun = spectrum("AM1.5D", 10.suns);
        let jv = cell.jv(sun, [0.V]);
        print(jv.points[0].current_density < 0.mA_per_cm2);
        cell.lit_from = "rear";
        cell.front_reflectance = [[300.nm, 0.3], [4000.nm, 0.3]];
        let rear = cell.jv(sun, [0.V]);
        print(rear.points[0].current_density > jv.points[0].current_density);
        print(abs(cell.at(0.V, dark()).current_density) < 1e-12.mA_per_cm2);
        print(cell.jv(monochromatic(#{ photon_flux: 1e17.per_cm2_s, wavelength: 700.nm }), [0.V]).points[0].current_density < 0.mA_per_cm2);
        print(cell.jv(black_body(5800.K, 100.mW_per_cm2), [0.V]).points[0].current_density < 0.mA_per_cm2);
    "#;
    let (outcome, recorder) = run_text(text);
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(recorder.lines, ["true"; 5]);
}
