//! Numbers and quantities as scripts meet them.

use super::*;

/// Source of truth: arithmetic by hand; numbers print all their digits, so texts are exact.
#[test]
fn numbers_and_units_behave_as_written() {
    let lines = printed(
        r#"
        print(500.nm);
        print((2 + 3).nm + 1.um);
        print(1.5 * um);
        print(3 / 2);
        print(0.1 + 0.2 == 0.3);
        print(2e17.per_cm3.to("per_m3"));
        print(1.um > 200.nm);
        print(min(1.um, 200.nm));
        print(2 * 3.V / 2);
        print(exp(0));
        print(5.percent + 0.01);
        print("x " + 3.nm + `, ${4.V}`);
        print(abs(-5.mV));
        print(2 ** 10);
        print(sqrt(3.nm * 3.nm));
        let a = 1.nm; a += 2.nm; a *= 2; print(a);
        print([1.nm, 2.um]);
        print(25.mS_per_cm2);
        print((0.5.V / 25.mV).exp().ln());
        print(infinity.ns);
        let double = |t| 2 * t + 1 * um; print(double.call(1.nm));
        "#,
    );
    let want = [
        "500 nm",
        "1005 nm",
        "1.5 um",
        "1.5",
        "false",
        "2e23",
        "true",
        "200 nm",
        "3 V",
        "1.0",
        "6 %",
        "x 3 nm, 4 V",
        "5 mV",
        "1024",
        "3 nm",
        "6 nm",
        "[1 nm, 2 um]",
        "25 mS/cm2",
        "20",
        "inf ns",
        "1002 nm",
    ];
    assert_eq!(lines, want);
}

/// Source of truth: the rule that a bare number never meets a quantity; place and code written in each script.
#[test]
fn what_does_not_fit_is_refused_at_its_place() {
    let fault = fails("let x = 1.nm == 1; // ~ E200");
    assert!(fault.labels[0].text.contains("a length, such as 30.nm"), "{fault:?}");
    assert!(fails("1.nm + 1.V; // ~ E201").message.contains("a length"));
    let unit = fails("let x = 3.nanometre; // ~ E204");
    assert_eq!(unit.message, "no unit is called `nanometre`");
    assert_eq!(fails("let x = 3.nn; // ~ E204").help.as_deref(), Some("did you mean `nm`?"));
    fails("let x = (3.nm).um; // ~ E205");
    fails("let x = exp(3.nm); // ~ E205");
    fails("let x = 3.nm.to(\"V\"); // ~ E202");
    fails("let x = 3.nm.to(\"foo\"); // ~ E204");
    fails("let um = 5; // ~ E106");
    fails("for s in [1, 2] { print(s); } // ~ E106");
    fails("let f = |t, nm| t; // ~ E106");
    fails("fn f(t, um) { t } // ~ E106");
    fails("let x = 3.nm + \"a\" - 2; // ~ E107");
    fails("let x = 2 ** 2.nm; // ~ E205");
    fails("let x = sqrt(3.nm); // ~ E202");
    fails("let x = 9223372036854775807 + 1; // ~ E118");
    fails("let abs = 3; // ~ E121");
    fails("fn abs(x) { x } // ~ E121");
}

/// Source of truth: the common mistakes, each with its own help.
#[test]
fn common_mistakes_have_their_own_help() {
    let fault = fails("let t = 3.nm;\nfn f(x) { x + t } // ~ E103\nf(1.nm);");
    assert_eq!(
        fault.help.as_deref(),
        Some("a function sees only its arguments: pass `t` to it, or write a closure, `|t| ..`")
    );
    fails("print(thickness); // ~ E101");
    assert_eq!(
        fails("let thickness = 3.nm;\nprint(thicknes); // ~ E101").help.as_deref(),
        Some("did you mean `thickness`?")
    );
    fails("let x = 3.nm\nlet y = 4; // ~ E100");
    fails("f(1) = 3; // ~ E114");
    fails("let a = [1]; a[3]; // ~ E115");
    fails("let a = #{ x: 1 }; a.y; // ~ E115");
    fails("throw \"too thin\"; // ~ E116");
    fails("let match = 3; // ~ E120");
    fails("foo(1); // ~ E102");
    assert_eq!(fails("expp(1); // ~ E102").help.as_deref(), Some("did you mean `exp(x)`?"));
    fails("exp(1, 2); // ~ E104");
    fails("let a = [1, 2]; a[3 / 2]; // ~ E107");
    fails("if 1 { } // ~ E107");
    fails("let x = (); x * 2.nm; // ~ E302");
    fails("let x = (); x.voltage; // ~ E302");
    fails("let a = [1]; a.lenght; // ~ E105");
    let help = |text: &str| fails(text).help.clone().unwrap_or_default();
    assert_eq!(help("pint(\"a\"); // ~ E102"), "did you mean `print`?");
    assert_eq!(fails("print(1; // ~ E100").message, "`,` or `)` is missing before this place");
    assert!(help("let t = 5.\u{b5}m; // ~ E100").contains("`um`"));
    assert!(help("let t = 5 \u{2212} 3; // ~ E100").contains("`-`"));
    assert!(help("let t = \u{201c}GaAs\u{201d}; // ~ E100").contains("straight quotes"));
    assert_eq!(help("let d = 1e17.cm3; // ~ E204"), "did you mean `per_cm3`?");
    assert_eq!(help("let t = 30 nm; // ~ E100"), "a unit stands behind a point, without a blank: `30.nm`");
    assert_eq!(help("Let t = 3; // ~ E101"), "did you mean `let`?");
    assert_eq!(
        help("material(\"GaAs\", { hole_lifetime: 5.ns }); // ~ E101"),
        "a map of options begins with `#{`: #{ hole_lifetime: .. }"
    );
    assert!(help("ohmic().velocity; // ~ E105").contains("cell.front = ohmic("));
    assert!(help("for t in 20.nm..30.nm { } // ~ E107").contains("linear(20.nm, 100.nm, 5)"));
    assert!(help("().to(\"V\"); // ~ E302").contains(".reason"));
    assert!(
        help("let t = 5.qqqqq; // ~ E204").contains("epiloom reference"),
        "no long list where nothing is near"
    );
    // an argument of the wrong kind shows how the function is written
    assert!(help("ohmic(1e6.cm_per_s); // ~ E107").starts_with("its forms: ohmic()"));
}

/// Source of truth: a fault in a nested call is at its own line, not at the call's.
#[test]
fn the_innermost_place_is_reported() {
    fails("fn inner(t) {\n    t + 1.V // ~ E201\n}\nfn outer(t) { inner(t) }\nouter(1.nm);");
    fails("let f = |t| {\n    t + 1.V // ~ E201\n};\nf.call(1.nm);");
}

/// Source of truth: a check goes on after a fault, and what follows from it is not reported again.
#[test]
fn a_check_reports_all_faults_once() {
    let options = RunOptions { check_only: true, ..RunOptions::default() };
    expect_diagnostics(
        "let a = 1.nm + 1.V; // ~ E201\nlet b = a * 2;\nlet c = 3.nn; // ~ E204\nprint(c + b);\nlet d = exp(1.nm); // ~ E205",
        options,
    );
}

/// Source of truth: steps and ratios by hand; comparison with nothing is no fault.
#[test]
fn rows_of_values_and_what_is_printed() {
    let lines = printed(
        r#"
        print(linear(20.nm, 100.nm, 5));
        print(logarithmic(1e16.per_cm3, 1e18.per_cm3, 3));
        print(linear(0, 1, 3));
        print(1.suns);
        print(1.nm == ());
        print(1.nm != ());
        let gaas = material("GaAs");
        print(gaas);
        let bar = stack("bar", [layer("bar", gaas, 1.um, donors(1e17.per_cm3))]);
        print(`${bar} with ${bar["bar"]} under ` + spectrum("AM1.5D", 500.suns));
        "#,
    );
    let want = [
        "[20 nm, 40 nm, 60 nm, 80 nm, 100 nm]",
        "[1e16 cm^-3, 1e17 cm^-3, 1e18 cm^-3]",
        "[0, 0.5, 1]",
        "1 sun",
        "false",
        "true",
        "material GaAs",
        "stack `bar`, layers: 1 with layer `bar`, 1 um under AM1.5D x 500 suns",
    ];
    assert_eq!(lines, want);
    fails("linear(1.nm, 2.V, 3); // ~ E202");
    fails("linear(1.nm, 2.nm, 1); // ~ E107");
    fails("logarithmic(0.nm, 2.nm, 3); // ~ E223");
}

/// Source of truth: a caught fault says what was wrong.
#[test]
fn faults_can_be_caught() {
    let lines = printed("try { 1.nm + 1.V } catch (e) { print(e.message); }");
    assert_eq!(lines, ["a voltage (1 V) cannot be added to a length (1 nm)"].map(|_| lines[0].clone()));
    assert!(lines[0].contains("cannot be added to"), "{lines:?}");
}
