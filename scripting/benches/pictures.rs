//! Benchmarks of pictures: a table of a million points into each format, and a usual figure.

use criterion::{Criterion, criterion_group, criterion_main};

use epiloom::archive::{Column, Label, Snapshot, Table};
use epiloom::picture::charts::{self, Choice};
use epiloom::picture::{Format, Kind, View, convert, draw};

/// A table of two columns: a wave that rises.
fn table(rows: u32) -> Snapshot {
    let x: Vec<f64> = (0..rows).map(|k| f64::from(k) * 1e-3).collect();
    let y = x.iter().map(|x| epiloom_solver::math::elementary::sin(x * 37.0) + x * 1e-3).collect();
    Snapshot {
        label: Label { name: "long table".to_string(), kind: "table".to_string(), ..Label::default() },
        tables: vec![Table::new(
            "table",
            vec![Column::new("time_s", "s", x), Column::new("signal_mV", "mV", y)],
        )],
        ..Snapshot::default()
    }
}

fn picture(snapshot: &Snapshot, format: Format) -> usize {
    let chart = charts::chart(snapshot, Kind::Lines, &Choice::default()).expect("a table gives lines");
    let drawing = draw(&chart, &View::default()).expect("lines can be drawn");
    convert::bytes(&drawing.svg, format).expect("a drawing becomes a file").len()
}

fn pictures(criterion: &mut Criterion) {
    let (long, short) = (table(1_000_000), table(100));
    let mut group = criterion.benchmark_group("pictures");
    group.sample_size(10);
    for (name, format) in [("svg", Format::Svg), ("png", Format::Png), ("pdf", Format::Pdf)] {
        group.bench_function(format!("a million points as {name}"), |b| b.iter(|| picture(&long, format)));
    }
    group.bench_function("100 points as svg", |b| b.iter(|| picture(&short, Format::Svg)));
    group.finish();
}

criterion_group!(benches, pictures);
criterion_main!(benches);
