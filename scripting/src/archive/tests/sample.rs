//! Small archives for the tests, with every kind of record and awkward numbers in them.

use std::path::{Path, PathBuf};

use crate::archive::*;

/// A run with inputs, a data file and a tolerance.
pub(super) fn run() -> RunHeader {
    let mut run = RunHeader {
        program_version: "0.1.0".to_owned(),
        script_name: "larch_bay.rhai".to_owned(),
        script_text: "let bsf = input(\"bsf\", 80.nm); // µ\n".to_owned(),
        tolerances: vec![Condition::new("update", Value::number(1e-10, ""))],
        ..RunHeader::default()
    };
    let input =
        Input { default: Value::number(80.0, "nm"), used: Value::number(50.0, "nm"), overridden: true };
    run.inputs.insert("bsf".to_owned(), input);
    run.inputs.insert("dark".to_owned(), Input { used: Value::Flag(true), ..Input::default() });
    run.data_files.insert("sun.csv".to_owned(), DataFile { blake3: "0f".repeat(32), length: 77 });
    run
}

/// A snapshot of that name and step with a full set of records.
pub(super) fn snapshot(name: &str, step: u64) -> Snapshot {
    let voltage = vec![0.0, 0.5, -0.0, 1.0 + f64::EPSILON * step as f64];
    let current = vec![-28.4, f64::NAN, 1e-27, f64::NEG_INFINITY];
    Snapshot {
        label: Label {
            name: name.to_owned(),
            kind: "light J-V".to_owned(),
            order: OrderKey { step, point: 0 },
            status: Status::Solved,
        },
        conditions: vec![
            Condition::new("temperature", Value::number(298.15, "K")),
            Condition::new("light", Value::text("AM1.5G")),
            Condition::new("lit from the rear", Value::Flag(false)),
        ],
        figures: vec![
            Figure {
                name: "voc".to_owned(),
                value: Some(1.0421),
                error: Some(3e-9),
                unit: "V".to_owned(),
                reason: None,
                meshes: vec![MeshValue { nodes: 200, value: 1.04 }, MeshValue { nodes: 399, value: 1.042 }],
            },
            Figure { name: "ff".to_owned(), reason: Some("no junction".to_owned()), ..Figure::default() },
        ],
        tables: vec![
            Table::new(
                "points",
                vec![
                    Column::new("voltage_V", "V", voltage),
                    Column::new("current_density_mA_per_cm2", "mA/cm2", current),
                ],
            ),
            Table::new("empty", vec![Column::new("depth_um", "um", vec![])]),
        ],
        ledgers: vec![Ledger {
            title: "photons".to_owned(),
            lines: vec![LedgerLine {
                group: "base".to_owned(),
                label: "absorbed".to_owned(),
                value: Some(27.9),
                unit: "mA/cm2".to_owned(),
                share: Some(0.93),
                note: "not independently checked".to_owned(),
            }],
        }],
        stack: Stack {
            name: "Larch Bay 12".to_owned(),
            layers: vec![Layer {
                name: "base".to_owned(),
                material: "GaAs".to_owned(),
                thickness: Value::number(3.0, "um"),
                doping: "acceptors 1e17 per cm3".to_owned(),
                settings: vec![Condition::new("optics", Value::text("inert"))],
            }],
            settings: vec![Condition::new("statistics", Value::text("Fermi-Dirac"))],
        },
        materials: vec![MaterialValue {
            layer: "base".to_owned(),
            material: "GaAs".to_owned(),
            parameter: "gap".to_owned(),
            value: Value::number(1.424, "eV"),
            source: "from memory".to_owned(),
            note: "valid 77 K to 500 K".to_owned(),
        }],
        warnings: vec!["the lifetime is illustrative".to_owned()],
    }
}

/// A snapshot with hardly anything in it, of a step that failed.
pub(super) fn failed(name: &str, step: u64) -> Snapshot {
    let status = Status::Failed { reason: "no convergence in layer `base` at 0.7 V".to_owned() };
    let label = Label {
        name: name.to_owned(),
        kind: "bias point".to_owned(),
        order: OrderKey { step, point: 0 },
        status,
    };
    Snapshot { label, ..Snapshot::default() }
}

/// Three snapshots, handed over out of order.
pub(super) fn snapshots() -> Vec<Snapshot> {
    vec![snapshot("dark J-V", 2), failed("bands", 1), snapshot("light J-V", 0)]
}

/// Writes an unfinished archive of the three snapshots and leaves it, as a killed run does.
pub(super) fn write_unfinished(folder: &Path) -> PathBuf {
    let mut writer = Writer::create(&folder.join("run.epiloom"), &RunHeader::default()).unwrap();
    writer.update_run(&run()).unwrap();
    for snapshot in snapshots() {
        writer.append(&snapshot).unwrap();
    }
    writer.unfinished().to_owned()
}

/// Writes a finished archive of the three snapshots.
pub(super) fn write_finished(folder: &Path) -> PathBuf {
    let mut writer = Writer::create(&folder.join("run.epiloom"), &run()).unwrap();
    for snapshot in snapshots() {
        writer.append(&snapshot).unwrap();
    }
    writer.finish(&run()).unwrap()
}

/// A sweep of nine indices, two of which its filter leaves out.
pub(super) fn sweep_start() -> SweepStart {
    let column = |name: &str, unit: &str| SweepColumn { name: name.to_owned(), unit: unit.to_owned() };
    SweepStart {
        name: "map".to_owned(),
        step: 1,
        points: 9,
        plan: "grid of bsf (3) by alloy (3)".to_owned(),
        coordinates: vec![column("bsf", "nm"), column("alloy", "")],
    }
}

/// The points of that sweep with every kind of cell, out of order: solved, failed, with lines, warnings and snapshots.
pub(super) fn points() -> Vec<Point> {
    let output = |name: &str, unit: &str, cell: Cell| PointOutput {
        column: SweepColumn { name: name.to_owned(), unit: unit.to_owned() },
        cell,
    };
    [5, 0, 8, 2, 3, 7, 6]
        .into_iter()
        .map(|index: u64| {
            let number = 1.0 + index as f64 / 3.0;
            let mut point = Point {
                index,
                coordinates: vec![
                    Cell::Number { value: 10.0 * number, error: None },
                    Cell::Text(["GaAs", "AlGaAs"][index as usize % 2].to_owned()),
                ],
                outputs: vec![
                    output("efficiency", "", Cell::Number { value: number, error: Some(1e-9) }),
                    output("good", "", Cell::Flag(index.is_multiple_of(2))),
                    output("note", "", Cell::Text("as grown".to_owned())),
                    output("voc", "V", Cell::Number { value: -0.0, error: None }),
                ],
                ..Point::default()
            };
            match index {
                2 => {
                    point.outputs.clear();
                    point.status = Status::Failed { reason: "no convergence at 0.7 V".to_owned() };
                }
                3 => {
                    // another unit under the same name, a number that is none, and nothing with its reason
                    point.outputs[1] =
                        output("good", "", Cell::Absent { reason: "not looked at".to_owned() });
                    point.outputs[3] = output("voc", "mV", Cell::Number { value: f64::NAN, error: None });
                }
                5 => {
                    point.printed = vec!["as grown".to_owned(), String::new()];
                    point.warnings = vec!["the lifetime is illustrative".to_owned()];
                }
                6 | 7 => point.snapshots = vec![of_point(index, "bands"), of_point(index, "light J-V")],
                _ => {}
            }
            point
        })
        .collect()
}

/// What a point stores.
fn of_point(index: u64, name: &str) -> Snapshot {
    let mut made = failed(&point_snapshot_name("map", index, name), 1);
    made.label.order.point = index;
    made.tables = vec![Table::new("bands", vec![Column::new("depth_um", "um", vec![0.5, index as f64])])];
    made
}

/// Hands the sweep to a writer: three batches.
pub(super) fn write_sweep(writer: &mut Writer<'_>) {
    assert_eq!(writer.begin_sweep(&sweep_start()).unwrap().count(), 0);
    for batch in points().chunks(3) {
        writer.append_points("map", batch.to_vec()).unwrap();
    }
    writer.finish_sweep("map", 2).unwrap();
}

/// Two snapshots with a sweep between them, unfinished.
pub(super) fn write_swept_unfinished(folder: &Path) -> PathBuf {
    let mut writer = Writer::create(&folder.join("swept.epiloom"), &run()).unwrap();
    writer.append(&snapshot("light J-V", 0)).unwrap();
    write_sweep(&mut writer);
    writer.append(&failed("bands", 2)).unwrap();
    writer.unfinished().to_owned()
}

/// The same, finished.
pub(super) fn write_swept_finished(folder: &Path) -> PathBuf {
    let mut writer = Writer::create(&folder.join("swept.epiloom"), &run()).unwrap();
    writer.append(&failed("bands", 2)).unwrap();
    write_sweep(&mut writer);
    writer.append(&snapshot("light J-V", 0)).unwrap();
    writer.finish(&run()).unwrap()
}
