//! The exports against the snapshot they were made of.

use std::io::Read;

use super::sample;
use crate::archive::export::{Format, csv_documents, export, json_listing, json_snapshot, npz};
use crate::archive::*;

/// Names and units in the header, one line a row; each number reads back as the same bits (RFC 4180 form).
#[test]
fn csv_has_units_in_its_header_and_numbers_that_read_back() {
    let snapshot = sample::snapshot("light J-V", 1);
    let documents = csv_documents(&snapshot).unwrap();
    let suffixes: Vec<Option<&str>> = documents.iter().map(|each| each.suffix.as_deref()).collect();
    assert_eq!(suffixes, [None, Some("empty"), Some("figures"), Some("ledger")]);
    let text = String::from_utf8(documents[0].bytes.clone()).unwrap();
    assert_eq!(text.lines().next().unwrap(), "voltage_V,current_density_mA_per_cm2");
    let columns = &snapshot.tables[0].columns;
    for (row, line) in text.lines().skip(1).enumerate() {
        for (cell, column) in line.split(',').zip(columns) {
            assert_eq!(cell.parse::<f64>().unwrap().to_bits(), column.values[row].to_bits(), "{line}");
        }
    }
    assert_eq!(text.lines().count(), 5);
    let figures = String::from_utf8(documents[2].bytes.clone()).unwrap();
    assert_eq!(figures, "figure,value,numerical_error,unit,reason\nvoc,1.0421,3e-9,V,\nff,,,,no junction\n");
}

/// JSON numbers are read back by an independent parser and compared by their bits; null carries its reason.
#[test]
fn json_holds_everything_and_reads_back_to_the_bit() {
    let snapshot = sample::snapshot("light J-V", 1);
    let json: serde_json::Value = serde_json::from_slice(&json_snapshot(&snapshot).unwrap()).unwrap();
    for (column, view) in
        snapshot.tables[0].columns.iter().zip(json["tables"][0]["columns"].as_array().unwrap())
    {
        assert_eq!(view["name"], column.name.as_str());
        for (row, (value, shown)) in column.values.iter().zip(view["values"].as_array().unwrap()).enumerate()
        {
            if value.is_finite() {
                assert_eq!(shown.as_f64().unwrap().to_bits(), value.to_bits());
            } else {
                assert!(shown.is_null());
                let reasons = view["not_numbers"].as_array().unwrap();
                assert!(reasons.iter().any(|each| each["row"] == row));
            }
        }
    }
    assert_eq!(json["figures"][0]["value"].as_f64().unwrap().to_bits(), 1.0421_f64.to_bits());
    assert!(json["figures"][1]["value"].is_null());
    assert_eq!(json["figures"][1]["reason"], "no junction");
    assert_eq!(json["conditions"][0]["value"]["unit"], "K");
    assert_eq!(json["stack"]["layers"][0]["thickness"]["value"], 3.0);
    assert_eq!(json["materials"][0]["source"], "from memory");
    assert_eq!(json["ledgers"][0]["lines"][0]["share"], 0.93);
    assert_eq!(json["status"], "solved");
    let failed: serde_json::Value =
        serde_json::from_slice(&json_snapshot(&sample::failed("bands", 1)).unwrap()).unwrap();
    assert!(failed["failure"].as_str().unwrap().contains("0.7 V"));
}

/// The listing holds the run as it was written, and the names in order.
#[test]
fn the_json_listing_holds_run_and_names() {
    let folder = tempfile::tempdir().unwrap();
    let archive = Archive::open(&sample::write_finished(folder.path())).unwrap();
    let json: serde_json::Value = serde_json::from_slice(&json_listing(&archive).unwrap()).unwrap();
    assert_eq!(json["run"]["script_text"], sample::run().script_text.as_str());
    assert_eq!(json["run"]["inputs"][0]["used"]["value"], 50.0);
    assert_eq!(json["run"]["data_files"][0]["name"], "sun.csv");
    assert_eq!(json["snapshots"][2]["name"], "dark J-V");
    assert_eq!(json["finished"], true);
}

/// The zip opens with its own library; the array bytes are the numbers (numpy is asked in another test).
#[test]
fn npz_holds_one_array_a_column_and_the_same_bytes_each_time() {
    let mut snapshot = sample::snapshot("light J-V", 1);
    snapshot.tables[1].name = "../points".to_owned();
    snapshot.tables[1].columns = vec![Column::new("x", "", vec![]), Column::new("x", "", vec![])];
    let bytes = npz(&snapshot).unwrap();
    assert_eq!(bytes, npz(&snapshot).unwrap());
    let mut zip = zip::ZipArchive::new(std::io::Cursor::new(bytes)).unwrap();
    let names: Vec<String> = zip.file_names().map(|name| name.unwrap().into_owned()).collect();
    assert!(names.contains(&".._points.x_2.npy".to_owned()), "{names:?}");
    let mut array = Vec::new();
    zip.by_name("points.voltage_V.npy").unwrap().read_to_end(&mut array).unwrap();
    let expected: Vec<u8> =
        snapshot.tables[0].columns[0].values.iter().flat_map(|value| value.to_le_bytes()).collect();
    assert_eq!(array.len() % 64, expected.len() % 64);
    assert!(array.ends_with(&expected));
}

/// Every file stands under its own name, whole, and nothing else is left in the folder.
#[test]
fn an_export_leaves_the_files_it_names_and_no_others() {
    let folder = tempfile::tempdir().unwrap();
    let snapshot = sample::snapshot("light J-V", 1);
    let mut expected = Vec::new();
    // Parquet takes sweeps alone
    for (word, format) in Format::ALL.into_iter().filter(|(_, format)| *format != Format::Parquet) {
        let path = folder.path().join(format!("out.{word}"));
        std::fs::write(&path, "an older export").unwrap();
        expected.extend(export(&snapshot, Format::named(word).unwrap(), &path).unwrap());
        assert!(std::fs::read(&path).unwrap().len() > 40, "{format:?}");
    }
    let mut there: Vec<_> =
        std::fs::read_dir(folder.path()).unwrap().map(|each| each.unwrap().path()).collect();
    there.sort();
    expected.sort();
    assert_eq!(there, expected);
    assert!(expected.contains(&folder.path().join("out-figures.csv")));
    let nowhere = folder.path().join("none").join("out.csv");
    assert!(matches!(export(&snapshot, Format::Csv, &nowhere), Err(ArchiveError::Io { .. })));
}
