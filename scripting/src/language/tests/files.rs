//! Inputs, `--set` and data files.

use super::*;
use std::path::Path;

fn set(text: &str, name: &str, value: &str) -> (RunOutcome, Recorder) {
    let options = RunOptions { set: vec![(name.to_string(), value.to_string())], ..RunOptions::default() };
    run_with(text, options)
}

/// Source of truth: the specified rules of `--set`.
#[test]
fn inputs_are_overridden_by_name() {
    let text = "let t = input(\"t\", 80.nm); let n = input(\"n\", 3); let kind = input(\"kind\", \"a\"); print(`${t} ${n} ${kind}`);";
    let (outcome, recorder) = set(text, "t", "50nm");
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(recorder.lines, ["50 nm 3 a"]);
    assert!(recorder.inputs[0].overridden && !recorder.inputs[1].overridden);
    let code = |value: &str| set(text, "t", value).0.errors.first().map(|e| e.code.as_str());
    assert_eq!(code("50"), Some("E112"));
    assert_eq!(code("50V"), Some("E112"));
    assert_eq!(code("50nmm"), Some("E112"));
    assert_eq!(code("thin"), Some("E112"));
    let (outcome, _) = set(text, "tt", "50nm");
    let unknown = &outcome.errors[0];
    assert_eq!(unknown.code, codes::UNKNOWN_INPUT); // E111
    assert!(unknown.help.as_deref().is_some_and(|h| h.contains('t')), "{unknown:?}");
    fails("let a = input(\"a\", 1);\nlet b = input(\"a\", 2); // ~ E110");
    fails("let a = input(\"a\", [1]); // ~ E107");
}

/// Source of truth: the rule that an unknown name is told before anything is solved, where the inputs can be known: this script
/// would solve a curve first. A name that is computed is known too; one that depends on a figure is not, and is let through.
#[test]
fn strange_names_of_inputs_are_told_before_solving() {
    let text = |last: &str| {
        format!(
            "let gaas = material(\"GaAs\", #{{ electron_lifetime: 1.ns, hole_lifetime: 1.ns }});\n\
             let base = input(\"base\", 1.um);\nfor i in [1, 2] {{ let k = input(`step_${{i}}`, 1.0); }}\n\
             let cell = stack(\"c\", [layer(\"n\", gaas, 100.nm, donors(1e18.per_cm3)), layer(\"p\", gaas, base, acceptors(1e17.per_cm3))]);\n\
             let j = cell.at(0.5.V, dark()).current_density;\nprint(\"solved\");\n{last}"
        )
    };
    let (outcome, recorder) = set(&text(""), "gaas", "3");
    assert_eq!(outcome.errors[0].code, codes::UNKNOWN_INPUT);
    assert!(outcome.errors[0].notes[0].contains("`base`, `step_1`, `step_2`"), "{:?}", outcome.errors[0]);
    assert!(recorder.lines.is_empty(), "nothing was solved");
    let (outcome, recorder) = set(&text(""), "step_2", "3");
    assert!(outcome.errors.is_empty(), "{:?}", outcome.errors);
    assert_eq!(recorder.lines, ["solved"]);
    let late = text("if j > 0.mA_per_cm2 { let late = input(\"la\" + \"te\", 1); print(late); }");
    let (outcome, recorder) = set(&late, "late", "7");
    assert!(outcome.errors.is_empty(), "{:?}", outcome.errors);
    assert_eq!(recorder.lines, ["solved", "7"]);
    let (outcome, _) = set(&late, "later", "7");
    assert_eq!(outcome.errors[0].code, codes::UNKNOWN_INPUT, "at the end at the latest");
}

/// Source of truth: data files as instruments and spreadsheets write them; what each fault must tell a person.
#[test]
fn data_files_as_they_come() {
    let root = tempfile::tempdir().expect("a folder");
    let read = |bytes: &[u8], text: &str| {
        std::fs::write(root.path().join("f.csv"), bytes).expect("a file");
        let (outcome, recorder) = in_folder(root.path(), text, &[]);
        match outcome.errors.first() {
            Some(error) => {
                let label = error.labels.first().map_or("", |l| l.text.as_str());
                let notes = error.notes.join(" ");
                format!("{} {label} {notes} {}", error.message, error.help.as_deref().unwrap_or_default())
            }
            None => recorder.lines.join("\n"),
        }
    };
    let rows = "print(read_csv(\"f.csv\")[1].density);";
    for good in [
        "depth_nm,density_per_cm3\n0,3e18\n20,2e18\n",
        "\"depth_nm\",\"density_per_cm3\"\n\"0\",\"3e18\"\n\"20\",\"2e18\"\n",
        "depth_nm;density_per_cm3\r\n0;3e18\r\n20;2e18\r\n",
        "\u{feff}depth_nm\tdensity_per_cm3\n0\t3e18\n20\t2e18",
    ] {
        assert_eq!(read(good.as_bytes(), rows), "2e18 cm^-3", "{good:?}");
    }
    let utf16: Vec<u8> =
        [0xff, 0xfe].into_iter().chain("a,b\n1,2".encode_utf16().flat_map(u16::to_le_bytes)).collect();
    assert!(read(&utf16, rows).contains("UTF-16"));
    assert!(read(b"depth_nm,density_per_cm3\n0,3e18\n# \xb5m\n", rows).contains("line 3"));
    let comma = read(b"depth_nm,density_per_cm3\n0,3e18\n20,2,5e18\n", rows);
    assert!(comma.contains("line 3: 3 fields") && comma.contains("follow a point"), "{comma}");
    let comma = read(b"depth_nm;density_per_cm3\n0;3e18\n20;2,5e18\n", rows);
    assert!(comma.contains("`2.5e18`"), "{comma}");
    let large = read(b"depth_nm;density_per_cm3\n0;1e400\n", rows);
    assert!(large.contains("`1e400` is no number") && !large.contains("point"), "{large}");
    assert!(read(b"depth_nm,depth_nm\n0,3e18\n", rows).contains("two columns are called `depth`"));
    let profile = "donors(graded(read_csv(\"f.csv\")));";
    let unit = read(b"depth_nn,density_per_cm3\n0,3e18\n20,2e18\n", profile);
    assert!(unit.contains("no column `depth`") && unit.contains("`nn`") && unit.contains("`nm`"), "{unit}");
    let name = read(b"depth_nm,conc_per_cm3\n0,3e18\n20,2e18\n", profile);
    assert!(name.contains("no column `density`") && name.contains("`conc`, `depth`"), "{name}");
    let bare = read(b"depth,density_per_cm3\n0,3e18\n20,2e18\n", profile);
    assert!(bare.contains("`depth_nm`"), "{bare}");
}

fn in_folder(folder: &Path, text: &str, allow: &[&Path]) -> (RunOutcome, Recorder) {
    let mut recorder = Recorder::default();
    let script = Script { folder: Some(folder.to_path_buf()), ..script(text) };
    let options =
        RunOptions { allow_read: allow.iter().map(|p| p.to_path_buf()).collect(), ..RunOptions::default() };
    let outcome = run(&script, options, &mut recorder);
    (outcome, recorder)
}

/// Source of truth: the rule of folders; each attack tries a way out of the script's folder.
#[test]
fn files_are_read_from_the_scripts_folder_alone() {
    let root = tempfile::tempdir().expect("a folder");
    let (inside, outside) = (root.path().join("inside"), root.path().join("outside"));
    std::fs::create_dir_all(inside.join("data")).expect("a folder");
    std::fs::create_dir_all(&outside).expect("a folder");
    std::fs::write(inside.join("data/p.csv"), "depth_nm,density_per_cm3\n0,2e18\n40,5e17\n").expect("a file");
    std::fs::write(outside.join("secret.csv"), "a,b\n1,2\n").expect("a file");
    let (outcome, recorder) = in_folder(
        &inside,
        "let p = read_csv(\"data/p.csv\"); print(p[1].density); let d = donors(graded(p)); read_csv(\"data/p.csv\");",
        &[],
    );
    assert!(outcome.errors.is_empty(), "{:?}", outcome.errors);
    assert_eq!(recorder.lines, ["5e17 cm^-3"]);
    assert_eq!(recorder.files.len(), 1, "a file is told once");
    let absolute = format!("read_csv(\"{}\");", outside.join("secret.csv").display());
    let mut attacks = vec![
        "read_csv(\"../outside/secret.csv\");".to_string(),
        absolute,
        "read_csv(\"data/../../outside/secret.csv\");".to_string(),
    ];
    #[cfg(unix)]
    {
        std::os::unix::fs::symlink(outside.join("secret.csv"), inside.join("link.csv")).expect("a link");
        std::os::unix::fs::symlink(&outside, inside.join("folder")).expect("a link");
        attacks.push("read_csv(\"link.csv\");".to_string());
        attacks.push("read_csv(\"folder/secret.csv\");".to_string());
    }
    for attack in &attacks {
        let (outcome, _) = in_folder(&inside, attack, &[]);
        assert_eq!(outcome.errors.first().map(|e| e.code), Some(codes::OUTSIDE), "{attack}");
        let (outcome, _) = in_folder(&inside, attack, &[&outside]);
        assert!(outcome.errors.is_empty(), "{attack}: {:?}", outcome.errors);
    }
    let (outcome, _) = in_folder(&inside, "read_csv(\"../nowhere.csv\");", &[]);
    assert_eq!(outcome.errors[0].code, codes::OUTSIDE, "whether a file outside exists is not told");
    let (outcome, _) = in_folder(&inside, "read_csv(\"nowhere.csv\");", &[]);
    assert_eq!(outcome.errors[0].code, codes::UNREADABLE); // E400
    let (outcome, _) = in_folder(&inside, "read_csv(\"data\");", &[]);
    assert_eq!(outcome.errors[0].code, codes::UNREADABLE);
    std::fs::write(inside.join("torn.csv"), "a,b\n1,x\n").expect("a file");
    let (outcome, _) = in_folder(&inside, "read_csv(\"torn.csv\");", &[]);
    assert_eq!(outcome.errors[0].code, codes::DATA_FILE); // E402
    fails("read_csv(\"x.csv\"); // ~ E401");
}

/// Source of truth: a replay runs from the archived bytes without the folder.
#[test]
fn archived_files_stand_in_for_the_folder() {
    let mut given = script("print(read_csv(\"p.csv\")[0].voltage);");
    given.files.insert("p.csv".to_string(), b"voltage_V\n0.5\n".to_vec());
    let mut recorder = Recorder::default();
    let outcome = run(&given, RunOptions::default(), &mut recorder);
    assert!(outcome.errors.is_empty(), "{:?}", outcome.errors);
    assert_eq!(recorder.lines, ["0.5 V"]);
    given.text = "read_csv(\"q.csv\");".to_string();
    let outcome = run(&given, RunOptions::default(), &mut Recorder::default());
    assert_eq!(outcome.errors[0].code, codes::REPLAY_INPUT); // E421
}

/// Source of truth: the columns that the reference page names; a lamp of constant irradiance integrates by hand.
#[test]
fn spectra_and_optical_constants_come_from_files() {
    let root = tempfile::tempdir().expect("a folder");
    std::fs::write(
        root.path().join("lamp.csv"),
        "# a lamp\nwavelength_nm,irradiance_W_per_m2_nm\n400,1\n900,1\n",
    )
    .expect("a file");
    std::fs::write(root.path().join("nk.csv"), "wavelength_um,n,k\n0.3,2.5,0.1\n1.2,2.3,0\n")
        .expect("a file");
    std::fs::write(root.path().join("bad.csv"), "wavelength_um,n,k\n1.2,2.5,0.1\n0.3,2.3,0\n")
        .expect("a file");
    let text = "print(spectrum_file(\"lamp.csv\").irradiance);\nlet zns = optical_constants(\"nk.csv\");\n\
        let two = coating([film(\"MgF2\", 100.nm), film(zns, 50.nm)]);\nlet own = material(\"GaAs\", #{ optical_constants: zns });";
    let (outcome, recorder) = in_folder(root.path(), text, &[]);
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(recorder.lines, ["50 mW/cm2"]);
    assert_eq!(recorder.files.iter().map(|f| f.name.as_str()).collect::<Vec<_>>(), ["lamp.csv", "nk.csv"]);
    for text in
        ["spectrum_file(\"nk.csv\");", "optical_constants(\"bad.csv\");", "optical_constants(\"lamp.csv\");"]
    {
        let (outcome, _) = in_folder(root.path(), text, &[]);
        assert_eq!(outcome.errors[0].code, codes::DATA_FILE, "{text}");
    }
}
