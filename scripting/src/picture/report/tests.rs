//! The page as bytes; what a browser makes of it is tested end to end.

use super::*;
use crate::archive::{
    Cell, Column, Label, Layer, Point, PointOutput, RunHeader, Snapshot, Stack, Status, SweepColumn, Table,
    Value,
};

/// Source of truth: the digests that the vendor folder's table gives, and the version that the library itself states.
#[test]
fn the_vendored_library_is_the_recorded_one() {
    let table = include_str!("vendor/README.md");
    for (name, text) in
        [("uPlot.iife.min.js", UPLOT), ("uPlot.min.css", UPLOT_STYLE), ("LICENSE", UPLOT_LICENCE)]
    {
        let digest: String = Sha256::digest(text).iter().map(|byte| format!("{byte:02x}")).collect();
        assert!(table.contains(&format!("{digest}  uplot/{name}")), "{name} is {digest}");
    }
    assert!(UPLOT.contains(&format!("(v{UPLOT_VERSION})")) && table.contains(UPLOT_VERSION));
    assert!(UPLOT_LICENCE.contains("MIT"));
}

fn snapshot(name: &str, rows: usize) -> Snapshot {
    let x: Vec<f64> = (0..rows).map(|i| i as f64 / 3.0).collect();
    // no pattern that packing could use
    let mut state = 12345_u64;
    let mut noise = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        (state >> 11) as f64 / (1_u64 << 53) as f64
    };
    let y = (0..rows).map(|_| noise()).collect();
    Snapshot {
        label: Label { name: name.to_string(), kind: "table".to_string(), ..Label::default() },
        tables: vec![Table::new("table", vec![Column::new("x_V", "V", x), Column::new("y", "", y)])],
        stack: Stack {
            name: "bar".to_string(),
            layers: vec![Layer {
                name: "<script>".to_string(),
                thickness: Value::number(1.0, "um"),
                ..Layer::default()
            }],
            settings: Vec::new(),
        },
        ..Snapshot::default()
    }
}

fn contents(snapshots: Vec<Snapshot>) -> Contents {
    let run = RunHeader {
        script_name: "a.rhai".to_string(),
        script_text: "let a = 1;".to_string(),
        ..RunHeader::default()
    };
    Contents {
        file: "a.epiloom".to_string(),
        run: Some(run),
        snapshots: snapshots.into_iter().map(|each| Held::Whole(Box::new(each))).collect(),
        finished: true,
        ..Contents::default()
    }
}

fn records(page: &Page) -> serde_json::Value {
    let block =
        page.html.split("id=\"records\">").nth(1).and_then(|rest| rest.split('<').next()).expect("records");
    let bytes = STANDARD.decode(block).expect("base64");
    serde_json::from_slice(&miniz_oxide::inflate::decompress_to_vec_zlib(&bytes).expect("deflate"))
        .expect("JSON")
}

/// Source of truth: the limit that is asked for, filled to more than nine tenths; an archive that fits keeps every row.
#[test]
fn a_page_keeps_to_its_size_and_wastes_none_of_it() {
    let small = page(&contents(vec![snapshot("one", 300)]), Options::default());
    assert!(small.rows.is_none() && small.thinned == 0 && small.html.len() < SIZE);
    let many: Vec<Snapshot> = (0..12).map(|i| snapshot(&format!("snapshot {i}"), 20_000)).collect();
    let large = page(&contents(many), Options::default());
    assert!(large.html.len() <= SIZE && large.html.len() * 10 > SIZE * 9, "{}", large.html.len());
    assert_eq!(large.thinned, 12);
    let records = records(&large);
    let table = &records["snapshots"][0]["tables"][0];
    assert_eq!(table["rows"], 20_000);
    assert!(
        table["held"].as_u64() <= large.rows.map(|rows| rows as u64) && table["held"].as_u64() > Some(1000)
    );
}

fn swept(points: usize, rows: usize) -> Contents {
    let mut made = contents(Vec::new());
    let column = |name: &str, unit: &str| SweepColumn { name: name.to_string(), unit: unit.to_string() };
    let number = |value: f64, error: Option<f64>| Cell::Number { value, error };
    let mut sweep = HeldSweep {
        name: "map".to_string(),
        plan: "grid of a by b".to_string(),
        coordinates: vec![column("a", "nm"), column("b", "")],
        ..HeldSweep::default()
    };
    for index in 0..points {
        made.inner.push(Held::Whole(Box::new(snapshot(&format!("map/{index}/curve"), rows))));
        let (a, b) = ((index % 4) as f64, (index / 4) as f64);
        let failed = index == 3;
        let outputs = vec![
            PointOutput { column: column("voc", "V"), cell: number(a + b, Some(1e-6)) },
            PointOutput { column: column("words", ""), cell: Cell::Text("<b>".to_string()) },
        ];
        sweep.points.push(HeldPoint {
            point: Point {
                index: index as u64,
                coordinates: vec![number(10.0 * a, None), number(b, None)],
                outputs: if failed { Vec::new() } else { outputs },
                status: if failed { Status::Failed { reason: "no".to_string() } } else { Status::Solved },
                ..Point::default()
            },
            snapshots: vec![index],
        });
    }
    made.sweeps.push(sweep);
    made
}

/// Source of truth: the sweep itself: every point with its place in the page, a map of its output, the failed one a hole.
#[test]
fn a_sweep_is_a_map_whose_points_know_their_curves() {
    let made = page(&swept(12, 20), Options::default());
    let records = records(&made);
    assert_eq!(records["listed"], 0);
    let sweep = &records["sweeps"][0];
    assert_eq!(sweep["points"].as_array().map(Vec::len), Some(12));
    assert_eq!(sweep["failed"], 1);
    for (index, point) in sweep["points"].as_array().expect("points").iter().enumerate() {
        let place = point["snapshots"][0].as_u64().expect("a place") as usize;
        assert_eq!(records["snapshots"][place]["name"], format!("map/{index}/curve"));
    }
    let maps: Vec<_> =
        sweep["charts"].as_array().expect("charts").iter().filter(|each| each["kind"] == "map").collect();
    assert_eq!(maps.len(), 1);
    assert_eq!(sweep["columns"][0]["name"], "a_nm");
    assert_eq!(sweep["columns"][2]["error"]["name"], "voc_error_V");
    assert_eq!(sweep["columns"][3]["texts"][0], "<b>");
}

/// Source of truth: the limit: points lose their curves, evenly, where nothing else helps; their figures stay.
#[test]
fn a_large_sweep_keeps_every_point_and_some_of_the_curves() {
    let size = 400_000;
    let made = page(&swept(600, 60), Options { size: Some(size), ..Options::default() });
    assert!(made.html.len() <= size && made.every > 1, "{} every {}", made.html.len(), made.every);
    let records = records(&made);
    let points = records["sweeps"][0]["points"].as_array().expect("points");
    assert_eq!(points.len(), 600);
    let with =
        points.iter().filter(|point| !point["snapshots"].as_array().expect("a list").is_empty()).count();
    assert_eq!(with, 600_usize.div_ceil(made.every));
    assert!(points.iter().all(|point| point["stored"] == 1));
}

/// Source of truth: the standard's rules: texts are escaped in markup, and data blocks hold letters of base64 alone.
#[test]
fn no_text_becomes_markup() {
    let mut made = contents(vec![snapshot("</script><b>", 5)]);
    made.file = "<i>.epiloom".to_string();
    made.troubles = vec!["<u>".to_string()];
    if let Some(run) = &mut made.run {
        run.script_name = "<s>.rhai".to_string();
        run.script_text = "// </title><script>\nlet a = \"</pre>\";".to_string();
    }
    let html = page(&made, Options::default()).html;
    for bad in ["<b>", "<i>.", "<u>", "<s>", "</title><script>\n", "\"</pre>"] {
        assert!(!html.contains(bad), "{bad}");
    }
    assert!(html.contains("&lt;/script&gt;&lt;b&gt;") && html.contains("&lt;s&gt;"));
}
