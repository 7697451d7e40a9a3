//! What a sweep costs beside its solutions: the script of a point, plans, tables, threads. Least times of a few runs, and
//! ratios of times of one run, which load changes least.

use std::collections::BTreeMap;
use std::hint::black_box;
use std::time::{Duration, Instant};

use epiloom::archive::{Point, Snapshot, SweepStart};
use epiloom::language::{RunOptions, Script, Sink, run};

/// A listener that keeps nothing.
struct Nothing;

impl Sink for Nothing {
    fn snapshot(&mut self, snapshot: Snapshot) -> Result<(), String> {
        black_box(snapshot);
        Ok(())
    }
    fn points(&mut self, _: &SweepStart, points: Vec<Point>) -> Result<(), String> {
        black_box(points);
        Ok(())
    }
}

/// Runs a script on so many threads.
fn script(text: &str, threads: usize) {
    let script =
        Script { name: "bench.rhai".into(), text: text.into(), folder: None, files: BTreeMap::new() };
    let options = RunOptions { threads: Some(threads), ..RunOptions::default() };
    let outcome = run(&script, options, &mut Nothing);
    assert!(outcome.errors.is_empty(), "{:?}", outcome.errors);
}

/// The cell of the first scenario, as a closure edits it.
const CELL: &str = r#"
let gaas    = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
let barrier = material("AlGaAs", #{ x: 0.30, electron_lifetime: 1.ns, hole_lifetime: 1.ns });
let wide    = material("AlGaAs", #{ x: 0.80, electron_lifetime: 1.ns, hole_lifetime: 1.ns });
let cell = stack("cell", [
    layer("window",             wide,     30.nm, donors(2e18.per_cm3)),
    layer("emitter",            gaas,    120.nm, donors(2e18.per_cm3)),
    layer("base",               gaas,    3.0.um, acceptors(1e17.per_cm3)),
    layer("back surface field", barrier,  80.nm, acceptors(2e18.per_cm3)),
    layer("buffer",             gaas,    300.nm, acceptors(5e18.per_cm3)),
]);
let sun = spectrum("AM1.5G");
"#;

/// A sweep of so many points whose closure edits the cell in three places, and gives three figures of `given`.
fn sweep(points: u32, given: &str) -> String {
    format!(
        "{CELL}
let plan = random(#{{ base: normal(3.um, 5.percent), bsf: uniform(40.nm, 90.nm), na: log_normal(1e17.per_cm3, 0.2) }}, {points});
let table = plan.run(\"sweep\", |p| {{
    cell[\"base\"].thickness = p.base;
    cell[\"base\"].doping = acceptors(p.na);
    cell[\"back surface field\"].thickness = p.bsf;
    {given}
}});"
    )
}

const SOLVED: &str = "let jv = cell.figures(sun); #{ efficiency: jv.efficiency, voc: jv.voc, jsc: jv.jsc }";
const UNSOLVED: &str =
    "let t = cell[\"base\"].thickness; #{ efficiency: t / 1.um, voc: t * 1e6.V_per_m, jsc: t }";

/// The least time of a few runs.
fn least(runs: usize, mut f: impl FnMut()) -> Duration {
    let once = |f: &mut dyn FnMut()| {
        let start = Instant::now();
        f();
        start.elapsed()
    };
    (0..runs).map(|_| once(&mut f)).min().unwrap_or_default()
}

/// Prints a least time.
fn timed(name: &str, text: &str, threads: usize) {
    println!("{:>10.2?}  {name}", least(5, || script(text, threads)));
}

/// The script's share of a point, and what a second thread brings.
fn ratios() {
    let empty = least(5, || script(CELL, 1));
    let unsolved = least(5, || script(&sweep(4000, UNSOLVED), 1)).saturating_sub(empty) / 4000;
    let one = least(3, || script(&sweep(60, SOLVED), 1)).saturating_sub(empty) / 60;
    let two = least(3, || script(&sweep(60, SOLVED), 2)).saturating_sub(empty) / 60;
    println!("{unsolved:>10.2?}  a point that edits the cell and solves nothing");
    println!("{one:>10.2?}  a point with figures of merit");
    println!("{:>8.3} %  the script's share of a point", 100.0 * unsolved.as_secs_f64() / one.as_secs_f64());
    println!("{:>10.2}  two threads over one", one.as_secs_f64() / two.as_secs_f64());
}

fn plans() {
    let points = |plan: &str| format!("let plan = {plan};\nfor k in range(0, 10000) {{ plan.point(k); }}");
    let grid = points("grid(#{ a: linear(0, 1, 100), b: linear(0, 1, 100), c: linear(0, 1, 100) })");
    timed("10,000 points of a grid, asked for by a script", &grid, 1);
    for filling in ["random", "latin_hypercube", "low_discrepancy"] {
        let plan = format!("{filling}(#{{ a: normal(1, 2), b: uniform(1, 2), c: normal(1, 3) }}, 10000)");
        timed(&format!("the same, {filling}"), &points(&plan), 1);
    }
}

fn tables() {
    const MADE: &str = "let t = grid(#{ a: range(0, 100), b: range(0, 1000) }).run(\"t\", |p| #{ c: p.a * p.b, d: p.a + p.b });\n";
    for (name, rest) in [
        ("a sweep of 100,000 points that solves nothing, two threads", ""),
        ("the same and ten statistics", "for i in range(0, 10) { t.statistics(\"c\"); }"),
        ("the same and a filter by a closure", "t.filter(|r| r.c > 5000);"),
        ("the same and a sort", "t.sort(\"c\");"),
        ("the same, grouped", "t.group(\"a\", |part| #{ m: part.mean(\"c\") });"),
    ] {
        timed(name, &format!("{MADE}{rest}"), 2);
    }
}

fn main() {
    ratios();
    plans();
    tables();
}
