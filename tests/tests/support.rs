//! Running the real command in a folder of its own.

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;

/// The root of the workspace.
pub fn workspace() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("..")
}

/// A folder that goes away with its scripts and archives.
pub struct Bench {
    folder: tempfile::TempDir,
}

/// What a command did.
pub struct Ran {
    /// Its exit code.
    pub code: i32,
    /// What it printed to standard output.
    pub out: String,
    /// What it printed to standard error.
    pub err: String,
}

impl Bench {
    /// An empty folder.
    pub fn empty() -> Self {
        Bench { folder: tempfile::tempdir().expect("a temporary folder") }
    }

    /// A folder with one script in it.
    pub fn with(name: &str, text: &str) -> Self {
        let bench = Bench::empty();
        bench.write(name, text);
        bench
    }

    /// Writes a file.
    pub fn write(&self, name: &str, text: &str) {
        std::fs::write(self.path(name), text).expect("the folder can be written");
    }

    /// The path of a file in the folder.
    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// The bytes of a file.
    pub fn bytes(&self, name: &str) -> Vec<u8> {
        std::fs::read(self.path(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    /// The command in this folder, to be started by the caller.
    pub fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_epiloom-under-test"));
        command.current_dir(self.folder.path()).args(arguments).env_remove("RUST_BACKTRACE");
        command
    }

    /// Runs the command in this folder to its end.
    pub fn run(&self, arguments: &[&str]) -> Ran {
        let output = self.command(arguments).output().expect("the command starts");
        Ran::of(output)
    }

    /// Runs the command, which must end with this code.
    pub fn ends(&self, code: i32, arguments: &[&str]) -> Ran {
        let ran = self.run(arguments);
        assert_eq!(ran.code, code, "{arguments:?}\n--- out\n{}\n--- err\n{}", ran.out, ran.err);
        ran
    }

    /// A snapshot of an archive as JSON.
    pub fn snapshot(&self, archive: &str, name: &str) -> Value {
        let shown = self.ends(0, &["show", archive, name, "--json"]);
        serde_json::from_str(&shown.out).expect("JSON")
    }
}

impl Ran {
    /// What a finished process did; a process ended by a signal has code -1.
    pub fn of(output: Output) -> Self {
        Ran {
            code: output.status.code().unwrap_or(-1),
            out: String::from_utf8_lossy(&output.stdout).into_owned(),
            err: String::from_utf8_lossy(&output.stderr).into_owned(),
        }
    }
}

/// The value of a figure in a snapshot's JSON, in the unit stored there.
pub fn figure(snapshot: &Value, name: &str) -> f64 {
    let figures = snapshot["figures"].as_array().expect("figures");
    let found = figures
        .iter()
        .find(|f| f["name"] == name)
        .unwrap_or_else(|| panic!("no figure {name} in {figures:?}"));
    found["value"].as_f64().unwrap_or_else(|| panic!("no value: {found}"))
}

/// A column of a table in a snapshot's JSON.
pub fn column(snapshot: &Value, name: &str) -> Vec<f64> {
    let tables = snapshot["tables"].as_array().expect("tables");
    let columns = tables.iter().flat_map(|t| t["columns"].as_array().expect("columns"));
    let found = columns.clone().find(|c| c["name"] == name);
    let found = found.unwrap_or_else(|| {
        panic!("no column {name} in {:?}", columns.map(|c| &c["name"]).collect::<Vec<_>>())
    });
    found["values"].as_array().expect("values").iter().map(|v| v.as_f64().expect("a number")).collect()
}

/// A small cell on its own numbers that is solved in a moment.
pub const SMALL_CELL: &str = r#"
let thin = custom_material("thin", #{ gap: 1.424.eV, affinity: 4.07.eV, permittivity: 12.9, nc: 4.7e17.per_cm3, nv: 9e18.per_cm3,
    electron_mobility: 3000.cm2_per_Vs, hole_mobility: 200.cm2_per_Vs, electron_lifetime: 1.ns, hole_lifetime: 10.ns,
    radiative_coefficient: 0.cm3_per_s, electron_auger: 0.cm6_per_s, hole_auger: 0.cm6_per_s, absorption: 1e4.per_cm });
let base = input("base", 500.nm);
let cell = stack("small", [
    layer("emitter", thin, 100.nm, donors(1e18.per_cm3)),
    layer("base", thin, base, acceptors(1e17.per_cm3)),
]);
let lamp = monochromatic(#{ photon_flux: 2e17.per_cm2_s });
"#;
