//! Archives through the command line: shown, exported, replayed, damaged.

use std::process::Command;

use crate::support::{Bench, SMALL_CELL, column, figure};

fn archived() -> Bench {
    let rest =
        "store(\"light J-V\", cell.jv(lamp, [0.V, 0.1.V, 0.4.V]));\nstore(\"bands\", cell.at(0.2.V, lamp));";
    let bench = Bench::with("small.rhai", &format!("{SMALL_CELL}{rest}"));
    bench.ends(0, &["run", "small.rhai", "--set", "base=300nm"]);
    bench
}

/// Source of truth: the same snapshot on two ways out: JSON and CSV hold the same numbers to the bit.
#[test]
fn show_and_export_agree() {
    let bench = archived();
    let listing = bench.ends(0, &["show", "small.epiloom"]).out;
    assert!(
        listing.contains("light J-V") && listing.contains("bands") && listing.contains("script small.rhai"),
        "{listing}"
    );
    let page = bench.ends(0, &["show", "small.epiloom", "light J-V"]).out;
    assert!(page.contains("jsc") && page.contains("+-") && page.contains("stack `small`"), "{page}");
    let json: serde_json::Value =
        serde_json::from_str(&bench.ends(0, &["show", "small.epiloom", "--json"]).out).expect("JSON");
    assert_eq!(json["snapshots"].as_array().map(Vec::len), Some(2));

    let snapshot = bench.snapshot("small.epiloom", "light J-V");
    assert!(figure(&snapshot, "jsc") > 0.0);
    let voltages = column(&snapshot, "voltage_V");
    assert_eq!(voltages, [0.0, 0.1, 0.4]);
    bench.ends(0, &["export", "small.epiloom", "light J-V", "--to", "csv", "-o", "out.csv"]);
    let csv = String::from_utf8(bench.bytes("out.csv")).expect("text");
    let mut rows = csv.lines().filter(|line| !line.starts_with('#'));
    let head: Vec<&str> = rows.next().expect("a heading").split(',').collect();
    let at =
        |name: &str| head.iter().position(|h| *h == name).unwrap_or_else(|| panic!("{name} in {head:?}"));
    let currents = column(&snapshot, "current_density_mA_per_cm2");
    let values: Vec<Vec<f64>> = rows.map(|r| r.split(',').filter_map(|c| c.parse().ok()).collect()).collect();
    assert_eq!(values.len(), 3);
    for (row, value) in values.iter().enumerate() {
        assert_eq!(value[at("voltage_V")].to_bits(), voltages[row].to_bits());
        assert_eq!(value[at("current_density_mA_per_cm2")].to_bits(), currents[row].to_bits());
    }
    bench.ends(0, &["export", "small.epiloom", "bands", "--to", "json", "-o", "out.json"]);
    let exported: serde_json::Value = serde_json::from_slice(&bench.bytes("out.json")).expect("JSON");
    assert_eq!(exported, bench.snapshot("small.epiloom", "bands"));
    let near = bench.ends(2, &["show", "small.epiloom", "light JV"]);
    assert!(near.err.contains("E414") && near.err.contains("`light J-V`"), "{}", near.err);
    bench.ends(2, &["export", "small.epiloom", "bands", "--to", "papyrus", "-o", "x"]);
    bench.ends(5, &["export", "small.epiloom", "bands", "--to", "json", "-o", "no/such/folder.json"]);
}

/// Source of truth: numpy itself reads the file; its numbers equal those of the JSON to the bit.
#[test]
fn npz_opens_in_numpy() {
    let python = std::env::var("EPILOOM_PYTHON").unwrap_or_else(|_| "python3".to_string());
    let numpy = Command::new(&python).args(["-c", "import numpy"]).output();
    if !numpy.is_ok_and(|output| output.status.success()) {
        println!("skipped: no Python with numpy (set EPILOOM_PYTHON to one)");
        return;
    }
    let bench = archived();
    bench.ends(0, &["export", "small.epiloom", "light J-V", "--to", "npz", "-o", "out.npz"]);
    let program = "import numpy, sys\n\
                   z = numpy.load(sys.argv[1], allow_pickle=False)\n\
                   for name in z.files:\n\
                   \x20   a = z[name]\n\
                   \x20   if a.dtype == numpy.float64:\n\
                   \x20       print(name, a.ndim, *[float(x).hex() for x in a.ravel()])\n";
    let output =
        Command::new(&python).args(["-c", program]).arg(bench.path("out.npz")).output().expect("Python runs");
    let text = String::from_utf8_lossy(&output.stdout).into_owned();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let snapshot = bench.snapshot("small.epiloom", "light J-V");
    for name in ["voltage_V", "current_density_mA_per_cm2"] {
        let line = text.lines().find(|l| l.split(' ').next().is_some_and(|n| n.ends_with(name)));
        let line = line.unwrap_or_else(|| panic!("{name} in {text}"));
        let shown: Vec<&str> = line.split(' ').skip(2).collect();
        let wanted: Vec<String> = column(&snapshot, name).iter().map(|x| hexadecimal(*x)).collect();
        assert_eq!(shown, wanted, "{name}");
    }
}

/// A number as Python's `float.hex` writes it.
fn hexadecimal(x: f64) -> String {
    let bits = x.to_bits();
    let sign = if bits >> 63 == 1 { "-" } else { "" };
    let (exponent, fraction) = ((bits >> 52) & 0x7ff, bits & ((1 << 52) - 1));
    if exponent == 0 && fraction == 0 {
        return format!("{sign}0x0.0p+0");
    }
    let (lead, power) = if exponent == 0 { (0, -1022) } else { (1, exponent as i64 - 1023) };
    format!("{sign}0x{lead}.{fraction:013x}p{power:+}")
}

/// Source of truth: an archive is replayed by the program that wrote it; a changed number must be noticed.
#[test]
fn replay_is_identical_to_the_bit_and_notices_a_change() {
    let bench = archived();
    let ran = bench.ends(0, &["replay", "small.epiloom"]);
    assert!(ran.out.contains("identical") && ran.out.contains("2 snapshots"), "{}", ran.out);
    // an archive whose script says something else than what it holds: made through the archive's own writer
    let path = bench.path("small.epiloom");
    let archive = epiloom::archive::Archive::open(&path).expect("it opens");
    let run = archive.run().expect("its run is whole").clone();
    let other = bench.path("forged.epiloom");
    let mut writer = epiloom::archive::Writer::create(&other, &run).expect("it is created");
    for index in 0..archive.entries().len() {
        let mut snapshot = archive.snapshot_at(index).expect("it is whole");
        if let Some(figure) = snapshot.figures.first_mut() {
            figure.value = figure.value.map(f64::next_up);
        }
        writer.append(&snapshot).expect("it is stored");
    }
    writer.finish(&run).expect("it is finished");
    let ran = bench.ends(4, &["replay", "forged.epiloom"]);
    assert!(ran.out.contains("differs") && ran.out.contains("archived"), "{}", ran.out);
}

/// Source of truth: one byte of a frame changed by the test; the neighbour stays readable, and nothing of the damaged one is shown.
#[test]
fn a_damaged_or_cut_archive_is_named_and_its_whole_frames_are_shown() {
    let bench = archived();
    let whole = bench.bytes("small.epiloom");
    let path = bench.path("small.epiloom");
    let archive = epiloom::archive::Archive::open(&path).expect("it opens");
    let second = archive.entries()[1].clone();
    let mut damaged = whole.clone();
    let at = usize::try_from(second.offset + second.length).expect("small") - 16;
    damaged[at] ^= 1;
    std::fs::write(bench.path("damaged.epiloom"), &damaged).expect("writable");
    let refused = bench.ends(3, &["show", "damaged.epiloom", "bands"]);
    assert!(
        refused.err.contains("E413") && refused.err.contains("bands") && refused.out.is_empty(),
        "{}{}",
        refused.out,
        refused.err
    );
    bench.run(&["show", "damaged.epiloom", "light J-V"]);
    let listed = bench.run(&["show", "damaged.epiloom"]);
    assert!(listed.out.contains("damaged") && listed.code == 3, "{}\n{}", listed.out, listed.err);

    let cut = usize::try_from(second.offset + second.length / 2).expect("small");
    std::fs::write(bench.path("cut.epiloom"), &whole[..cut]).expect("writable");
    let shown = bench.ends(3, &["show", "cut.epiloom"]);
    assert!(shown.out.contains("light J-V") && shown.err.contains("cut off"), "{}\n{}", shown.out, shown.err);
    let first = bench.ends(3, &["show", "cut.epiloom", "light J-V"]);
    assert!(first.out.contains("jsc"), "{}", first.out);
    let lost = bench.run(&["show", "cut.epiloom", "bands"]);
    assert_ne!(lost.code, 0);
}
