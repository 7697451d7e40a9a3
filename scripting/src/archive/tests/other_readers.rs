//! Readers that are not ours: an independent one in Python, and numpy.
//!
//! `EPILOOM_PYTHON` names the Python to use (`python3` otherwise). Where it, or numpy, is missing, the test
//! says so on standard error and checks nothing.

use std::path::Path;
use std::process::Command;

use super::sample;
use crate::archive::export::{Format, export};
use crate::archive::*;

fn python() -> Option<String> {
    let name = std::env::var("EPILOOM_PYTHON").unwrap_or_else(|_| "python3".to_owned());
    let there = Command::new(&name).arg("--version").output().is_ok_and(|output| output.status.success());
    if !there {
        eprintln!("skipped: `{name}` does not run; EPILOOM_PYTHON names another");
    }
    there.then_some(name)
}

fn run(python: &str, arguments: &[&str]) -> Result<String, String> {
    let output = Command::new(python).args(arguments).output().map_err(|error| error.to_string())?;
    if output.status.success() {
        String::from_utf8(output.stdout).map_err(|error| error.to_string())
    } else {
        Err(String::from_utf8_lossy(&output.stderr).into_owned())
    }
}

/// Every number of a snapshot in one fixed order, as bits.
fn all_bits(snapshot: &Snapshot) -> Vec<String> {
    let mut out = Vec::new();
    for figure in &snapshot.figures {
        out.extend([figure.value, figure.error].into_iter().flatten());
        out.extend(figure.meshes.iter().map(|mesh| mesh.value));
    }
    for table in &snapshot.tables {
        out.extend(table.columns.iter().flat_map(|column| column.values.iter().copied()));
    }
    for line in snapshot.ledgers.iter().flat_map(|ledger| &ledger.lines) {
        out.extend([line.value, line.share].into_iter().flatten());
    }
    for material in &snapshot.materials {
        if let crate::archive::Value::Number { value, .. } = material.value {
            out.push(value);
        }
    }
    out.into_iter().map(|value| format!("{:016x}", value.to_bits())).collect()
}

/// The independent reader was written from `FORMAT.md` alone; names are compared as text, numbers as bits.
#[test]
fn an_independent_reader_finds_the_same_numbers() {
    let Some(python) = python() else { return };
    let reader = Path::new(env!("CARGO_MANIFEST_DIR")).join("../validation/reference/read_archive.py");
    let folder = tempfile::tempdir().unwrap();
    for file in [sample::write_unfinished(folder.path()), {
        let other = tempfile::tempdir_in(folder.path()).unwrap().keep();
        sample::write_finished(&other)
    }] {
        let archive = Archive::open(&file).unwrap();
        let printed = run(&python, &[reader.to_str().unwrap(), file.to_str().unwrap(), "--bits"]).unwrap();
        let read: serde_json::Value = serde_json::from_str(&printed).unwrap();
        assert_eq!(read["finished"], archive.is_finished());
        assert_eq!(read["run"]["script_text"], sample::run().script_text.as_str());
        assert_eq!(read["run"]["inputs"]["bsf"]["overridden"], true);
        assert_eq!(read["run"]["data_files"]["sun.csv"]["length"], 77);
        let found = read["snapshots"].as_array().unwrap();
        assert_eq!(found.len(), 3);
        for written in sample::snapshots() {
            let same = found.iter().find(|each| each["label"]["name"] == written.name()).unwrap();
            assert_eq!(same["bits"], serde_json::json!(all_bits(&written)));
            assert_eq!(same["label"]["kind"], written.label.kind.as_str());
            assert_eq!(same["label"]["order"]["step"], written.label.order.step);
            let warnings = serde_json::json!(written.warnings);
            assert_eq!(same["warnings"], warnings);
        }
    }

    for file in [
        sample::write_swept_unfinished(folder.path()),
        sample::write_swept_finished(&tempfile::tempdir_in(folder.path()).unwrap().keep()),
    ] {
        let printed = run(&python, &[reader.to_str().unwrap(), file.to_str().unwrap(), "--bits"]).unwrap();
        let read: serde_json::Value = serde_json::from_str(&printed).unwrap();
        assert_eq!(read["snapshots"].as_array().unwrap().len(), 2);
        let sweep = &read["sweeps"][0];
        assert_eq!((&sweep["start"]["name"], &sweep["left_out"]), (&"map".into(), &2.into()));
        let mut points = sample::points();
        points.sort_by_key(|point| point.index);
        assert_eq!(sweep["points"].as_array().unwrap().len(), points.len());
        for (point, read) in points.iter().zip(sweep["points"].as_array().unwrap()) {
            assert_eq!(read["index"], point.index);
            let cells: Vec<&Cell> =
                point.coordinates.iter().chain(point.outputs.iter().map(|output| &output.cell)).collect();
            let numbers = cells.iter().flat_map(|cell| match cell {
                Cell::Number { value, error } => [Some(*value), *error],
                _ => [None, None],
            });
            let bits: Vec<String> =
                numbers.flatten().map(|value| format!("{:016x}", value.to_bits())).collect();
            assert_eq!(read["bits"], serde_json::json!(bits));
            let failed = match &point.status {
                Status::Failed { reason } => serde_json::json!(reason),
                Status::Solved => serde_json::Value::Null,
            };
            assert_eq!(read["failed"], failed);
            assert_eq!(read["printed"], serde_json::json!(point.printed));
            assert_eq!(read["warnings"], serde_json::json!(point.warnings));
            for (output, shown) in point.outputs.iter().zip(read["outputs"].as_array().unwrap()) {
                assert_eq!(
                    (&shown["name"], &shown["unit"]),
                    (&output.column.name.as_str().into(), &output.column.unit.as_str().into())
                );
                match &output.cell {
                    Cell::Text(text) => assert_eq!(shown["text"], text.as_str()),
                    Cell::Flag(flag) => assert_eq!(shown["flag"], *flag),
                    Cell::Absent { reason } => assert_eq!(shown["absent"], reason.as_str()),
                    Cell::Number { .. } => {}
                }
            }
            let names: Vec<&str> = point.snapshots.iter().map(Snapshot::name).collect();
            let stored = read["snapshots"].as_array().unwrap();
            assert_eq!(stored.iter().map(|each| &each["label"]["name"]).collect::<Vec<_>>(), names);
            for (snapshot, read) in point.snapshots.iter().zip(stored) {
                assert_eq!(read["bits"], serde_json::json!(all_bits(snapshot)));
            }
        }
    }

    // The check can fail: the reader refuses a file with one byte changed.
    let file = sample::write_finished(&tempfile::tempdir_in(folder.path()).unwrap().keep());
    let mut bytes = std::fs::read(&file).unwrap();
    let place = bytes.len() / 2;
    bytes[place] ^= 1;
    std::fs::write(&file, bytes).unwrap();
    let refused = run(&python, &[reader.to_str().unwrap(), file.to_str().unwrap(), "--bits"]);
    assert!(refused.unwrap_err().contains("damaged"));
}

/// numpy opens the NPZ; its own `tobytes` of each array is the source of truth for what it understood.
#[test]
fn numpy_opens_the_npz_export() {
    let Some(python) = python() else { return };
    if run(&python, &["-c", "import numpy"]).is_err() {
        eprintln!("skipped: `{python}` has no numpy");
        return;
    }
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("out.npz");
    let snapshot = sample::snapshot("light J-V", 1);
    export(&snapshot, Format::Npz, &file).unwrap();
    let script = "import sys, json, numpy\n\
        data = numpy.load(sys.argv[1], allow_pickle=False)\n\
        print(json.dumps({k: v.tolist() if v.dtype.kind == 'U' else v.tobytes().hex() for k, v in data.items()}))";
    let printed = run(&python, &["-c", script, file.to_str().unwrap()]).unwrap();
    let read: serde_json::Value = serde_json::from_str(&printed).unwrap();
    for table in &snapshot.tables {
        for column in &table.columns {
            let bytes: Vec<u8> = column.values.iter().flat_map(|value| value.to_le_bytes()).collect();
            let hex: String = bytes.iter().map(|byte| format!("{byte:02x}")).collect();
            assert_eq!(read[format!("{}.{}", table.name, column.name)], hex.as_str());
        }
    }
    assert_eq!(read["figures.name"], serde_json::json!(["voc", "ff"]));
    assert_eq!(read["conditions.text"], serde_json::json!(["298.15 K", "AM1.5G", "no"]));
}
