//! Temperature models that a script gives with its numbers, seen through the language.

use super::*;

/// A p-n diode of one custom material, whose options beyond the plain ones come from the test.
fn diode(options: &str, statements: &str) -> String {
    format!(
        "let own = custom_material(\"own\", #{{ affinity: 4.eV, permittivity: 12, electron_lifetime: 1.ns, hole_lifetime: 1.ns,\n    \
         electron_mobility: 1000.cm2_per_Vs, hole_mobility: 100.cm2_per_Vs, absorption: 1e4.per_cm, {options} }});\n\
         let d = stack(\"d\", [layer(\"n\", own, 200.nm, donors(1e17.per_cm3)), layer(\"p\", own, 1.um, acceptors(1e17.per_cm3))]);\n\
         {statements}"
    )
}

/// Source of truth: two ways to the same device, which must agree to the digits printed: a model evaluated by the program
/// at 350 K, and the same values worked out by hand (Varshni's law and (350/300)^1.5) and given as plain numbers.
#[test]
fn a_model_gives_what_its_values_give() {
    let run = "d.temperature = 350.K; d.statistics = \"boltzmann\"; print(d.at(0.5.V, dark()).current_density.to(\"A_per_cm2\").to_string().sub_string(0, 8));";
    let v = |t: f64| 5e-4 * t * t / (t + 200.0);
    let gap = 1.4 + v(300.0) - v(350.0);
    let ratio = 350.0f64 / 300.0;
    let scale = ratio * ratio.sqrt();
    let by_hand = format!("gap: {gap}.eV, nc: {}.per_cm3, nv: {}.per_cm3", 4e17 * scale, 8e18 * scale);
    let by_model = "gap: 1.4.eV, gap_varshni_alpha: 0.5.meV_per_K, gap_varshni_beta: 200.K, nc: 4e17.per_cm3, nv: 8e18.per_cm3, \
                    nc_temperature_exponent: 1.5, nv_temperature_exponent: 1.5, reference_temperature: 300.K";
    let standing = "gap: 1.4.eV, nc: 4e17.per_cm3, nv: 8e18.per_cm3";
    let current = |options: &str| printed(&diode(options, run));
    assert_eq!(current(by_model), current(&by_hand));
    assert_ne!(current(by_model), current(standing), "without a model the numbers hold");
}

/// Source of truth: the physics of a gap that closes: Voc falls with temperature by a few mV/K, for a custom material with
/// a model as for any; without one by (Voc - Eg/q)/T of the exponential alone, which is less.
#[test]
fn voc_falls_faster_where_the_gap_closes() {
    let statements = "let sun = monochromatic(#{ photon_flux: 1e17.per_cm2_s });\nd.temperature = 300.K; let cold = d.jv(sun).voc;\n\
                      d.temperature = 340.K; let hot = d.jv(sun).voc;\nprint((hot - cold).to(\"mV\") / 40);";
    let slope = |options: &str| -> f64 { printed(&diode(options, statements))[0].parse().expect("a number") };
    let plain = slope("gap: 1.4.eV, nc: 4e17.per_cm3, nv: 8e18.per_cm3");
    let model = slope(
        "gap: 1.4.eV, nc: 4e17.per_cm3, nv: 8e18.per_cm3, gap_temperature_coefficient: -0.45.meV_per_K",
    );
    assert!((model - plain + 0.45).abs() < 0.1, "{model} against {plain} mV/K");
}

/// Source of truth: the stated rules; place and code stand in each script.
#[test]
fn faults_of_models_are_told_at_their_place() {
    let with = |options: &str, code: &str| {
        fails(&format!(
            "custom_material(\"own\", #{{ affinity: 4.eV, permittivity: 12, nv: 1e19.per_cm3, electron_mobility: 1000.cm2_per_Vs, hole_mobility: 100.cm2_per_Vs, {options} }}); // ~ {code}"
        ))
    };
    let nc = "nc: 4e17.per_cm3";
    let lacks = with(&format!("{nc}, gap_at_zero_kelvin: 1.5.eV"), "E218");
    assert!(lacks.message.contains("`gap_varshni_alpha`"), "{}", lacks.message);
    let both = with(&format!("{nc}, gap: 1.4.eV, electron_mass: 0.07"), "E215");
    assert_eq!(both.message, "material `own` gives both `nc` and `electron_mass`");
    let idle = with(&format!("{nc}, gap: 1.4.eV, reference_temperature: 300.K"), "E218");
    assert!(idle.message.contains("moves nothing"), "{}", idle.message);
    with(&format!("{nc}, gap: 1.4.eV, gap_temperature_coefficient: -0.45.meV"), "E202");
    with(&format!("{nc}, gap: 1.4.eV, gap_temperature_coeficient: -0.45.meV_per_K"), "E108");
    with("gap: 1.4.eV", "E218");
    fails("material(\"GaAs\", #{ hole_lifetime_temperature_exponent: 1 }); // ~ E218");
    let closed = fails(
        "let own = custom_material(\"own\", #{ affinity: 4.eV, permittivity: 12, nc: 4e17.per_cm3, nv: 1e19.per_cm3, electron_mobility: 1000.cm2_per_Vs, hole_mobility: 100.cm2_per_Vs, gap: 1.4.eV, gap_temperature_coefficient: -5.meV_per_K });\n\
         let bar = stack(\"bar\", [layer(\"bar\", own, 1.um, donors(1e17.per_cm3))]); // ~ E215\n\
         bar.temperature = 600.K; bar.equilibrium();",
    );
    assert!(closed.message.contains("at 600 K by its temperature model"), "{}", closed.message);
}

/// Source of truth: the archive holds the values used, at the temperature of the stack, and what the script gave.
#[test]
fn the_archive_holds_the_values_at_the_temperature() {
    let text = diode(
        "gap_at_zero_kelvin: 1.5.eV, gap_varshni_alpha: 0.5.meV_per_K, gap_varshni_beta: 200.K, electron_mass: 0.07, hole_mass: 0.5",
        "d.temperature = 200.K; store(\"bands\", d.equilibrium());",
    );
    let (outcome, recorder) = run_text(&text);
    assert!(outcome.errors.is_empty(), "{}", shown(&text, &outcome.errors));
    let snapshot = &recorder.snapshots[0];
    let gap = snapshot.materials.iter().find(|m| m.parameter == "gap").expect("a gap");
    assert!(format!("{:?}", gap.value).contains("1.45"), "1.5 eV less 0.5 meV/K 200 K / 2: {:?}", gap.value);
    assert_eq!(gap.source, "set by the script");
    assert!(snapshot.stack.layers[0].settings.iter().any(|s| s.name == "gap_varshni_alpha"));
}
