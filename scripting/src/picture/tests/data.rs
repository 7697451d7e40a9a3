//! What charts hold, against the numbers that went in.

use crate::archive::{Column, Label, Snapshot, Table};
use crate::picture::chart::{BarRole, Body, Role, Scale, si_unit};
use crate::picture::charts::{self, Choice, Columns, Numbers};
use crate::picture::{Chart, Kind, PictureError, View, draw, overlay, terminal, ticks};

use super::sample;

fn chart(snapshot: &Snapshot, kind: Kind) -> Chart {
    charts::chart(snapshot, kind, &Choice::default()).unwrap()
}

fn table(columns: Vec<(&str, Vec<f64>)>) -> Snapshot {
    let columns = columns.into_iter().map(|(name, values)| Column::new(name, "", values)).collect();
    Snapshot {
        label: Label { name: "t".to_string(), kind: "table".to_string(), ..Label::default() },
        tables: vec![Table::new("table", columns)],
        ..Snapshot::default()
    }
}

/// Source of truth: the numbers of the snapshot; a chart keeps every bit of them.
#[test]
fn charts_change_no_number() {
    let snapshot = sample::light("light J-V", 29.0);
    let Body::Curves(curves) = chart(&snapshot, Kind::CurrentVoltage).body else { panic!("no curves") };
    let stored =
        &snapshot.table("points").unwrap().column("extrapolated_current_density_mA_per_cm2").unwrap().values;
    assert_eq!(&curves.panels[0].series[0].y, stored);
    let point = sample::profiles(false);
    for kind in [Kind::Bands, Kind::Carriers, Kind::Field, Kind::Rates] {
        let Body::Curves(curves) = chart(&point, kind).body else { panic!("no curves") };
        for series in &curves.panels[0].series {
            let columns = &point.table("profiles").unwrap().columns;
            assert!(columns.iter().any(|column| column.values == series.y), "{kind:?} {}", series.name);
        }
        let names: Vec<&str> = curves.regions.iter().map(|region| region.name.as_str()).collect();
        assert_eq!(names, ["window", "emitter", "base"]);
        assert_eq!((curves.regions[1].from, curves.regions[1].to), (0.03, 0.15));
    }
}

/// Source of truth: photons are conserved: what is stacked from below and from above leaves what no layer absorbs.
#[test]
fn a_stacked_response_adds_up_to_one() {
    let snapshot = sample::response();
    let Body::Curves(curves) = chart(&snapshot, Kind::Response).body else { panic!("no curves") };
    let of = |name: &str| snapshot.table("response").unwrap().column(name).unwrap().values.clone();
    let series = &curves.panels[0].series;
    let absorbed = series.iter().rfind(|each| each.role == Role::Absorbed).unwrap();
    let lost = series.iter().rfind(|each| each.role == Role::Lost).unwrap();
    for k in 0..absorbed.y.len() {
        let layers = of("absorbed in window")[k] + of("absorbed in emitter")[k] + of("absorbed in base")[k];
        assert!((absorbed.y[k] - layers).abs() <= 4.0 * f64::EPSILON);
        let kept_out = 1.0 - of("shaded_share")[k] - of("reflected_share")[k];
        assert!((lost.base[k] - kept_out).abs() <= 4.0 * f64::EPSILON);
        assert!(absorbed.y[k] <= lost.base[k] + 4.0 * f64::EPSILON);
    }
}

/// Source of truth: the ledger's own lines; bars begin where the last one ended, and their sum is kept whatever is
/// summed up. Rounding of a dozen additions: 16 epsilon of what came in.
#[test]
fn a_waterfall_loses_exactly_what_the_ledger_loses() {
    let Body::Waterfall(waterfall) = chart(&sample::profiles(false), Kind::Ledger).body else {
        panic!("no waterfall")
    };
    let titles: Vec<&str> = waterfall.stages.iter().map(|stage| stage.title.as_str()).collect();
    assert_eq!(titles, ["Photons", "Electrons", "Power"]);
    for stage in &waterfall.stages {
        let bars = &stage.bars;
        let income = bars[0].value;
        let mut level = income;
        for bar in &bars[1..bars.len() - 1] {
            assert_eq!(bar.from, level, "{}", bar.name);
            level = bar.to;
        }
        let left = bars.last().unwrap();
        assert_eq!(left.role, BarRole::Left);
        assert!((level - left.value).abs() <= 16.0 * f64::EPSILON * income, "{}: {level}", stage.title);
    }
    let electrons = &waterfall.stages[1].bars;
    assert!(electrons.iter().any(|bar| bar.name == "11 smaller losses"), "{electrons:?}");
    assert_eq!(electrons.last().unwrap().value, 27.0);
}

/// Source of truth: the highest of the sample's values, found by hand; a grid keeps each value in its place.
#[test]
fn maps_keep_their_values_and_find_the_best_point() {
    let columns = sample::sweep();
    let Body::Map(map) = charts::table::chart("sweep", &columns, Kind::Map, &Choice::default()).unwrap().body
    else {
        panic!("no map")
    };
    let values = &columns.columns[2].values;
    let best = (0..values.len())
        .filter(|k| values[*k].is_finite())
        .max_by(|a, b| values[*a].total_cmp(&values[*b]))
        .unwrap();
    let point = &map.points[map.best.unwrap()];
    assert_eq!(
        (point.x, point.y, point.z),
        (columns.columns[0].values[best], columns.columns[1].values[best], values[best])
    );
    let grid = map.grid.unwrap();
    assert_eq!((grid.x.len(), grid.y.len()), (9, 7));
    for point in &map.points {
        let column = grid.x.iter().position(|v| *v == point.x).unwrap();
        let row = grid.y.iter().position(|v| *v == point.y).unwrap();
        assert_eq!(grid.z[row * 9 + column].to_bits(), point.z.to_bits());
    }
    assert_eq!((map.x.scale, map.y.scale), (Scale::Log, Scale::Linear));
    let least = Choice { least_is_best: true, ..Choice::default() };
    let Body::Map(map) = charts::table::chart("sweep", &columns, Kind::Map, &least).unwrap().body else {
        panic!("no map")
    };
    let best = map.points[map.best.unwrap()].z;
    assert!(map.points.iter().all(|p| p.z.is_nan() || p.z >= best));
}

/// Source of truth: counting by hand, each value once, both ends included.
#[test]
fn histograms_count_every_value_once() {
    let snapshot = table(vec![("value", (0..100).map(f64::from).collect())]);
    let Body::Histogram(histogram) = chart(&snapshot, Kind::Histogram).body else { panic!("no histogram") };
    let group = &histogram.groups[0];
    assert_eq!(group.counts.iter().sum::<u64>(), 100);
    for (edges, count) in group.edges.windows(2).zip(&group.counts) {
        let last = edges[1] == 99.0;
        let inside =
            (0..100).map(f64::from).filter(|v| *v >= edges[0] && (*v < edges[1] || last && *v <= edges[1]));
        assert_eq!(inside.count() as u64, *count);
    }
    assert_eq!((group.quantiles, group.mean), ([49.5, 4.95, 94.05], 49.5));
    // one value only, and values that are all the same
    for values in [vec![3.0], vec![2.0; 30]] {
        let count = values.len() as u64;
        let Body::Histogram(same) = chart(&table(vec![("value", values)]), Kind::Histogram).body else {
            panic!("no histogram")
        };
        assert_eq!(same.groups[0].counts.iter().sum::<u64>(), count);
    }
}

/// Source of truth: the specification: what is off-scale, zero on a logarithmic scale or thinned is said.
#[test]
fn what_a_picture_leaves_out_is_said() {
    let notes = |chart: &Chart, view: &View| draw(chart, view).unwrap().notes.join("; ");
    let light = chart(&sample::light("light J-V", 29.0), Kind::CurrentVoltage);
    assert!(notes(&light, &View::default()).contains("off-scale: current density up to"));
    let view = View { y_range: Some((-20.0, 0.0)), ..View::default() };
    assert!(notes(&light, &view).contains("values of current density"), "{}", notes(&light, &view));
    let dark = chart(&sample::dark(), Kind::CurrentVoltage);
    assert!(notes(&dark, &View::default()).contains("current density of zero (1 value)"));
    // A value that is nothing but the rounding of an error does not stretch the axis by decades.
    let mut uncertain = sample::dark();
    let columns = &mut uncertain.tables[0].columns;
    let near_zero = 10;
    let current = &mut columns[1].values;
    let error = current
        .iter()
        .enumerate()
        .map(|(k, j)| if k == near_zero { 1e-39 } else { 1e-5 * j.abs() })
        .collect();
    current[near_zero] = 1e-40;
    columns.push(Column::new("error_mA_per_cm2", "mA_per_cm2", error));
    let uncertain = chart(&uncertain, Kind::CurrentVoltage);
    assert!(notes(&uncertain, &View::default()).contains("zero within its numerical error (1 value)"));
    let Body::Curves(curves) = uncertain.body else { panic!("no curves") };
    assert!(curves.panels[0].y.range.0 > 1e-26, "{:?}", curves.panels[0].y.range);
    let deep = chart(&sample::profiles(true), Kind::Bands);
    assert!(notes(&deep, &View::default()).contains("off-scale: depths below"));
    let rows = 50_000;
    let x: Vec<f64> = (0..rows).map(f64::from).collect();
    let y = x.iter().map(|x| epiloom_solver::math::elementary::sin(x / 50.0)).collect();
    let long = chart(&table(vec![("x", x), ("y", y)]), Kind::Lines);
    assert!(notes(&long, &View::default()).contains("thinned for drawing"));
}

/// Source of truth: the scale that trade and data ask for: 25 decades of dark current are shown as such.
#[test]
fn scales_are_chosen_by_the_data() {
    let Body::Curves(dark) = chart(&sample::dark(), Kind::CurrentVoltage).body else { panic!("no curves") };
    let y = &dark.panels[0].y;
    assert_eq!((y.scale, y.magnitude), (Scale::Log, true));
    assert!(y.range.0 <= 1.1e-24, "{:?}", y.range);
    assert_eq!(dark.panels[1].series[0].role, Role::Ideality);
    let Body::Curves(thick) = chart(&sample::profiles(true), Kind::Bands).body else { panic!("no curves") };
    assert_eq!(thick.x.scale, Scale::Log);
    let Body::Curves(thin) = chart(&sample::profiles(false), Kind::Bands).body else { panic!("no curves") };
    assert_eq!(thin.x.scale, Scale::Linear);
}

/// Source of truth: the points by hand: a coordinate of texts is no axis; each text has a curve of its own, by its name.
#[test]
fn texts_that_were_varied_part_the_curves() {
    let column = |name: &str, values: Vec<f64>, varied: bool| Numbers {
        name: name.to_string(),
        values,
        varied,
        ..Numbers::default()
    };
    let window = column("window", Vec::new(), true).counting(&[Some("GaInP"), Some("AlInP")].repeat(3));
    let velocity = column("velocity", vec![1.0, 1.0, 10.0, 10.0, 100.0, 100.0], true);
    let efficiency = column("efficiency", vec![0.25, 0.26, 0.24, 0.255, 0.2, 0.21], false);
    let columns = Columns { columns: vec![window, velocity, efficiency], ..Columns::default() };
    assert_eq!(columns.kinds(), [Kind::Lines]);
    let drawn = charts::table::chart("t", &columns, Kind::Lines, &Choice::default()).unwrap();
    let Body::Curves(curves) = drawn.body else { panic!("no curves") };
    let series = &curves.panels[0].series;
    assert_eq!(curves.x.label, "Velocity");
    let names: Vec<&str> = series.iter().map(|each| each.name.as_str()).collect();
    assert_eq!(names, ["window GaInP", "window AlInP"]);
    assert_eq!((&series[0].x, &series[0].y), (&vec![1.0, 10.0, 100.0], &vec![0.25, 0.24, 0.2]));
    assert_eq!(series[1].y, [0.26, 0.255, 0.21]);
}

/// Source of truth: the plan: a decade in equal ratios is shown in such, one in equal steps is not, nor is less than a decade.
#[test]
fn a_plan_in_ratios_gets_a_logarithmic_axis() {
    let along = |densities: [f64; 4]| {
        let mut columns = sample::sweep();
        let rows = columns.columns[0].values.len();
        columns.columns[0].values = (0..rows).map(|row| densities[row % 4]).collect();
        let map = charts::table::chart("sweep", &columns, Kind::Map, &Choice::default()).unwrap();
        let Body::Map(map) = map.body else { panic!("no map") };
        map.x.scale
    };
    assert_eq!(along([1e16, 2.154_434_690_03e16, 4.641_588_833_61e16, 1e17]), Scale::Log);
    assert_eq!(along([1e16, 4e16, 7e16, 1e17]), Scale::Linear);
    assert_eq!(along([1e16, 2e16, 4e16, 8e16]), Scale::Linear);
    assert_eq!(along([1e16, 2e16, 1e17, 6e17]), Scale::Log);
}

/// Source of truth: the specification of errors: what is wrong, what there is, the near name.
#[test]
fn wrong_wishes_are_told_with_what_there_is() {
    let light = sample::light("light J-V", 29.0);
    let error = charts::chart(&light, Kind::Bands, &Choice::default()).unwrap_err();
    assert_eq!(error.to_string(), "the snapshot `light J-V` (light J-V) gives no chart `bands`");
    assert_eq!(error.help().unwrap(), "it gives `jv`, `power`");
    let columns = sample::sweep();
    let choice = Choice { y: vec!["eficiency".to_string()], ..Choice::default() };
    let error = charts::table::chart("sweep", &columns, Kind::Lines, &choice).unwrap_err();
    assert!(error.help().unwrap().starts_with("did you mean `efficiency`?"), "{error:?}");
    let mixed = overlay::overlay(vec![chart(&light, Kind::Power), chart(&light, Kind::CurrentVoltage)]);
    assert!(matches!(mixed, Err(PictureError::NotTogether { .. })));
    let empty = Snapshot::default();
    assert!(matches!(charts::first(&empty), Err(PictureError::Nothing { .. })));
    let view = View { y_scale: Some(Scale::Log), y_range: Some((-1.0, 2.0)), ..View::default() };
    let error = draw(&chart(&light, Kind::CurrentVoltage), &view).unwrap_err();
    assert!(error.to_string().contains("begins above zero"), "{error}");
}

/// Source of truth: a hostile name must come out as text; the drawing stays one that an XML reader takes.
#[test]
fn names_are_text_and_never_markup() {
    let snapshot = sample::light("<script>alert(\"1\")</script> & \u{1} \u{202e}ключ", 29.0);
    let svg = draw(&chart(&snapshot, Kind::CurrentVoltage), &View::default()).unwrap().svg;
    assert!(!svg.contains("<script"), "{svg}");
    assert!(crate::picture::convert::bytes(&svg, crate::picture::Format::Png).is_ok());
    assert!(svg.chars().all(|c| c == '\n' || !c.is_control()));
}

/// Source of truth: the SI's way to write units, by hand.
#[test]
fn units_are_written_without_a_solidus() {
    for (unit, words) in [
        ("mA_per_cm2", "mA cm^-2"),
        ("per_cm3", "cm^-3"),
        ("per_cm3_s", "cm^-3 s^-1"),
        ("V_per_cm", "V cm^-1"),
        ("um", "\u{b5}m"),
        ("cm2_per_Vs", "cm^2 V^-1 s^-1"),
        ("ohm_cm2", "\u{3a9} cm^2"),
        ("cm_per_s", "cm s^-1"),
        ("", ""),
    ] {
        assert_eq!(si_unit(unit), words, "{unit}");
    }
}

/// Source of truth: round numbers by hand.
#[test]
fn ticks_are_round() {
    assert_eq!(ticks::linear(0.0, 1.06, 6).values, [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]);
    assert_eq!(ticks::linear(-31.0, 8.0, 5).values, [-30.0, -20.0, -10.0, 0.0]);
    assert_eq!(ticks::decades(3e-25, 2e3, 6), [-20, -15, -10, -5, 0]);
    assert_eq!(ticks::decades(1.0, 1e3, 6), [0, 1, 2, 3]);
    assert!(ticks::linear(f64::NAN, 1.0, 5).values.len() == 1);
}

/// Source of truth: the terminal view as it is meant, drawn by hand for a small stack.
#[test]
fn the_terminal_shows_the_stack_and_a_curve() {
    let snapshot = sample::light("light J-V", 29.0);
    let drawing = terminal::stack(&snapshot.stack, 80);
    let lines: Vec<&str> = drawing.lines().collect();
    // one row for 30 nm and 120 nm, two for 2.5 um; rules between
    assert_eq!(lines.len(), 1 + 1 + 1 + 1 + 1 + 1 + 2 + 1, "{drawing}");
    assert!(
        lines[2].contains("window") && lines[2].contains("30 nm") && lines[2].contains("donors 2e18 cm^-3")
    );
    let widths: std::collections::BTreeSet<usize> = lines[1..].iter().map(|l| l.chars().count()).collect();
    assert_eq!(widths.len(), 1, "{drawing}");
    assert!(terminal::stack(&snapshot.stack, 40).lines().all(|line| line.chars().count() <= 40));
    let plot = terminal::plot(&chart(&snapshot, Kind::CurrentVoltage), 80);
    assert!(plot.contains("mA cm\u{207b}\u{b2}") && plot.contains("Voltage / V"), "{plot}");
    assert!(plot.lines().all(|line| line.chars().count() <= 80), "{plot}");
    assert!(terminal::plot(&chart(&snapshot, Kind::CurrentVoltage), 30).is_empty());
}
