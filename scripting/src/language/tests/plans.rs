//! Scripts that sweep: plans, captured values in every way of writing, failures, threads, parts, tables.

use super::*;
use crate::archive::{Cell, Status};

/// The same script on this many threads.
fn on(threads: usize) -> RunOptions {
    RunOptions { threads: Some(threads), ..RunOptions::default() }
}

fn run_on(text: &str, threads: usize) -> Recorder {
    let (outcome, recorder) = run_with(text, on(threads));
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    recorder
}

/// Source of truth: the specification's example, counted by hand: 3 x 15 x 13 points, names in the alphabet's order, the last fastest.
#[test]
fn the_specified_grid_has_its_points() {
    let lines = printed(
        r#"
        let plan = grid(#{ bsf: [20.nm, 50.nm, 100.nm], x: linear(0.2, 0.9, 15), na: logarithmic(1e16.per_cm3, 1e19.per_cm3, 13) });
        print(plan);
        let p = plan.point(195 + 15 + 1);
        print(`${p.bsf} ${p.na} ${p.x}`);
        print(grid([#{ x: [1, 2] }, #{ a: [10, 20, 30] }]).point(4));
        "#,
    );
    assert_eq!(lines[0], "plan: grid of bsf (3) by na (13) by x (15), 585 points");
    assert_eq!(lines[1], "50 nm 1.778279e16 cm^-3 0.25");
    assert_eq!(lines[2], "#{\"a\": 20, \"x\": 2}");
}

/// Source of truth: what the same closure gives when it is called by hand, point by point; a point's copy of `n` is its own.
#[test]
fn captured_values_may_be_used_in_any_way() {
    let lines = printed(
        r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let cell = stack("d", [layer("n", gaas, 100.nm, donors(1e18.per_cm3)), layer("p", gaas, 1.um, acceptors(1e17.per_cm3))]);
        let n = 0;
        let list = [cell, cell];
        let map = #{ cell: cell, inner: #{ t: 2.um, list: [1, 2] } };
        let add = |k| { n += k; n };
        let twice = |k| add.call(k) + add.call(k);
        fn helper(c, t) { c["p"].thickness = t; c }
        let plan = grid(#{ k: range(1, 40) });
        let t = plan.run("captures", |p| {
            n += 1;
            cell["p"].thickness = p.k * 1.um;
            list[0]["p"].thickness = p.k * 1.um;
            list.push(cell);
            map.inner.list.push(p.k);
            map.cell["n"].thickness = p.k * 1.nm;
            let other = helper(cell, 7.um);
            let inside = || cell["p"].thickness + 1.um;
            let later = twice.call(p.k);
            #{ n: n, later: later, own: cell["p"].thickness, first: list[0]["p"].thickness, second: list[1]["p"].thickness, count: list.len(),
               kept: map.inner.list.len(), window: map.cell["n"].thickness, other: other["p"].thickness, inside: inside.call() }
        });
        let near = |a, b| abs(a / b - 1) < 1e-12;
        let wrong = t.filter(|r| r.n != 1 + 2 * r.k || r.later != 2 + 3 * r.k || r.count != 3 || r.kept != 3 || !near.call(r.second, 1.um)
            || !near.call(r.own, r.k * 1.um) || !near.call(r.first, r.k * 1.um) || !near.call(r.window, r.k * 1.nm)
            || !near.call(r.other, 7.um) || !near.call(r.inside, (r.k + 1) * 1.um));
        print(`${t.len} ${wrong.len}`);
        print(`${n} ${cell["p"].thickness} ${list.len()} ${map.inner.list.len()} ${map.cell["n"].thickness}`);
        "#,
    );
    assert_eq!(lines, ["39 0", "0 1 um 2 2 100 nm"]);
}

/// Source of truth: sums by hand; a closure may use the variable whose method it is given to, in a chain of calls, in a
/// function, in a point and through another closure; a variable that is assigned anew, or holds an array, gets a message.
#[test]
fn a_closure_may_use_the_variable_whose_method_it_is_given_to() {
    let lines = printed(
        r#"
        let plan = grid(#{ x: [1, 2, 3] });
        let t = plan.run("a", |p| #{ y: p.x * plan.size });
        print(t.sum("y"));
        print(t.filter(|r| r.y > t.mean("y")).len);
        print(t.filter(|r| r.x > 1).derive("part", |r| r.y / t.sum("y")).sum("part") * 6);
        let above = |r| r.y > t.mean("y");
        print(`${t.filter(above).len} ${t.filter(|r| above.call(r)).len}`);
        let tables = [t, t];
        tables[1] = tables[0].filter(|r| r.y >= t.mean("y"));
        print(tables[1].len);
        fn below(x, own) { own.filter(|r| r.y < x * own.mean("y")).len }
        fn kept(x, rows) { rows = rows.filter(|r| r.y > x); rows.len }
        print(`${below(1, t)} ${kept(3, t)}`);
        let inner = plan.run("b", |p| #{ n: plan.run("inner", |q| plan.size * p.x).sum("value"), m: plan.filter(|q| q.x < plan.size).size });
        print(`${inner.sum("n")} ${inner.sum("m")}`);
        let n = 0;
        print(t.filter(|r| { n += 1; r.y > t.mean("y") }).len + n);
        "#,
    );
    assert_eq!(lines, ["18", "1", "5", "1 1", "2", "1 2", "54 9", "4"]);
    let fault = fails("let list = [1, 2];\nlet n = list.map(|x| x / list.len()); // ~ E107");
    assert!(fault.help.is_some_and(|help| help.contains("take a copy above")));
    fails("let t = table([#{ x: 1 }, #{ x: 2 }]);\nt = t.filter(|r| r.x > t.mean(\"x\")); // ~ E107");
}

/// Source of truth: the specification: sweeps in functions and inside points; sums computed by hand.
#[test]
fn sweeps_nest_and_stand_in_functions() {
    let text = r#"
        fn study(name, factor) {
            grid(#{ x: [1, 2, 3] }).run(name, |p| {
                let inner = grid(#{ y: [10, 20] }).run("inner", |q| { print(`y ${q.y}`); store("seen", #{ y: q.y }); p.x * q.y * factor });
                store("row", #{ x: p.x });
                #{ sum: inner.sum("value"), rows: inner.len }
            })
        }
        print(study("once", 1).sum("sum"));
        print(study("twice", 2).sum("sum"));
    "#;
    let recorder = run_on(text, 2);
    let (prints, sums): (Vec<_>, Vec<_>) = recorder.lines.iter().partition(|line| line.contains('y'));
    assert_eq!(sums, ["180", "360"]);
    assert_eq!(prints[1], "once[0]: inner[1]: y 20");
    let (start, points, left_out) = &recorder.sweeps[1];
    assert_eq!((start.name.as_str(), start.step, points.len(), *left_out), ("twice", 1, 3, Some(0)));
    let names: Vec<&str> = points[2].snapshots.iter().map(|s| s.name()).collect();
    assert_eq!(names, ["twice/2/inner/0/seen", "twice/2/inner/1/seen", "twice/2/inner", "twice/2/row"]);
    assert!(points[2].snapshots.iter().all(|s| s.label.order.step == 1 && s.label.order.point == 2));
    fails(
        "let plan = grid(#{ x: [1, 2] });\nlet a = plan.run(\"a\", |p| p.x);\nlet b = plan.run(\"a\", |p| p.x); // ~ E119",
    );
}

/// Source of truth: a run on one thread; every record of every point, and every line, to the bit.
#[test]
fn threads_change_nothing() {
    let text = r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let cell = stack("d", [layer("n", gaas, 100.nm, donors(1e18.per_cm3)), layer("p", gaas, 1.um, acceptors(1e17.per_cm3))]);
        cell.accuracy = 0.01;
        let sun = spectrum("AM1.5G");
        let plan = latin_hypercube(#{ t: normal(1.um, 20.percent), na: log_normal(1e17.per_cm3, 0.5) }, 8, 3).filter(|p| p.t < 1.1.um);
        let table = plan.run("map", |p| {
            cell["p"].thickness = p.t;
            cell["p"].doping = acceptors(p.na);
            let point = cell.at(0.6.V, sun);
            print(point.current_density);
            if p.na > 2e17.per_cm3 { throw "too much"; }
            store("point", #{ j: point.current_density });
            #{ j: point.current_density, word: if p.t > 1.um { "thick" } else { "thin" }, thin: p.t < 1.um }
        });
        print(table);
        print(table.failures);
    "#;
    let (one, two) = (run_on(text, 1), run_on(text, 2));
    assert_eq!(one.lines, two.lines);
    assert_eq!(one.sweeps, two.sweeps);
    let (_, points, left_out) = &one.sweeps[0];
    assert!(
        points.iter().any(|p| p.status != Status::Solved) && left_out.is_some_and(|n| n > 0),
        "{points:?} {left_out:?}"
    );
}

/// Source of truth: the specification: a failed point is a row with its reason, the others go on, the summary counts them; a
/// panic and a runaway loop are failures of their point.
#[test]
fn a_failed_point_is_kept_with_its_reason() {
    let text = r#"
        let t = grid(#{ k: range(0, 12) }).run("risky", |p| { // ~ W330
            if p.k == 2 { throw "no such wafer"; }
            if p.k == 3 { panic_for_a_test(); }
            if p.k == 5 { let t = 1.nm + 1.V; }
            if p.k == 7 { let list = []; list[3] }
            if p.k == 9 { loop { } }
            #{ value: p.k, none: if p.k > 3 { () } else { 1.V } }
        });
        print(`${t.len} ${t.failed} ${t.sum("value")} ${t.statistics("none").absent}`);
        for f in t.failures { print(`${f.k} ${f.reason}`); }
    "#;
    let mut options = on(2);
    options.limits.point_operations = 10_000;
    let (outcome, recorder) = run_with(text, options.clone());
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(
        recorder.lines,
        [
            "7 5 40 5",
            "2 line 3: [E116] no such wafer",
            "3 [E900] a fault of the program itself: planted",
            "5 line 5: [E201] a length (1 nm) cannot be added to a voltage (1 V); 1 nm and 1 V",
            "7 line 6: [E115] there is no entry 3 in an array of 0",
            "9 line 2: [E500] the point did more than 10000 operations; stopped here",
        ]
    );
    assert!(recorder.sweeps[0].1.iter().filter(|p| p.status != Status::Solved).count() == 5);
    assert!(outcome.warnings[0].message.contains("5 of 12 points"), "{:?}", outcome.warnings);
    expect_diagnostics(text, options);
    fails("let t = grid(#{ k: [1, 2] }).run(\"none\", |p| { throw \"no\"; }); // ~ E330");
    let lines = printed(
        "let r = \"\"; try { grid(#{ k: [1, 2] }).run(\"none\", |p| nm + V); } catch (e) { r = e.message; }\nprint(r);",
    );
    assert_eq!(lines, ["all 2 points of the sweep `none` failed"]);
}

/// Source of truth: the specification: warnings of the points are kept with each point and told once for each code.
#[test]
fn warnings_of_points_are_gathered() {
    let text = r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let cell = stack("d", [layer("n", gaas, 100.nm, donors(1e18.per_cm3)), layer("p", gaas, 1.um, acceptors(1e17.per_cm3))]);
        let t = grid(#{ k: [1, 2, 3] }).run("lit", |p| { // ~ W331
            if p.k > 1 { cell.front_reflectance = [[400.nm, 0.1], [900.nm, 0.1]]; }
            cell.at(0.V, spectrum("AM1.5G")).current_density
        });
    "#;
    let outcome = expect_diagnostics(text, on(2));
    assert_eq!(outcome.warnings[0].message, "of 3 points of the sweep `lit` some have warnings: W302 at 2");
    let (_, recorder) = run_with(text, on(1));
    assert!(recorder.sweeps[0].1[0].warnings.is_empty());
    assert!(recorder.sweeps[0].1[2].warnings.iter().all(|w| w.starts_with("[W302]")));
}

/// Source of truth: a change that nothing uses is lost in a point as it is elsewhere, and fails that point alone.
#[test]
fn a_lost_change_fails_its_point() {
    let text = r#"
        let gaas = material("GaAs", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });
        let cell = stack("d", [layer("p", gaas, 1.um, acceptors(1e17.per_cm3))]);
        fn thin(c) { c["p"].thickness = 5.nm; }
        let t = grid(#{ k: [0, 1, 2] }).run("edits", |p| { // ~ W330
            if p.k == 1 { thin(cell); }
            p.k
        });
        print(`${t.len} ${t.failures[0].reason.contains("E113")}`);
    "#;
    let (_, recorder) = run_with(text, on(2));
    assert_eq!(recorder.lines, ["2 true"]);
    expect_diagnostics(text, on(2));
}

/// Source of truth: an uninterrupted run: points that are stored are not solved again, and nothing else changes.
#[test]
fn stored_points_are_not_solved_again() {
    let text = r#"
        let t = random(#{ x: uniform(0, 1) }, 300, 5).run("squares", |p| { print("solved"); #{ square: p.x * p.x } });
        print(t.mean("square"));
        print(t[299]);
    "#;
    let whole = run_on(text, 2);
    let mut points = whole.sweeps[0].1.clone();
    points.retain(|point| point.index % 3 != 1);
    points.reverse();
    let mut recorder =
        Recorder { stored: BTreeMap::from([("squares".to_string(), points)]), ..Recorder::default() };
    let outcome = run(&script(text), on(2), &mut recorder);
    assert!(outcome.errors.is_empty());
    assert_eq!(recorder.sweeps, whole.sweeps);
    assert_eq!(recorder.lines.iter().filter(|line| line.ends_with("solved")).count(), 100);
    assert_eq!(recorder.lines[100..], whole.lines[300..]);
    // what does not belong to the plan is refused
    let stray = Point { index: 300, ..Point::default() };
    let mut recorder =
        Recorder { stored: BTreeMap::from([("squares".to_string(), vec![stray])]), ..Recorder::default() };
    let outcome = run(&script(text), on(1), &mut recorder);
    assert_eq!(outcome.errors.iter().map(|e| e.code).collect::<Vec<_>>(), [codes::UNWRITABLE]);
}

/// Source of truth: the specification of parts: shares that are disjoint and complete; a table of a share is not read, plans that
/// do not depend on it are run; all points together give what one run gives.
#[test]
fn parts_solve_their_share_of_every_plan() {
    let text = r#"
        let first = grid(#{ x: range(0, 10) }).filter(|p| p.x != 4).run("first", |p| { store("own", #{ x: p.x }); p.x * 2 });
        let second = grid(#{ x: range(0, 7) }).run("second", |p| p.x);
        store("before", #{ a: 1 });
        store("table", first);
        let third = list([#{ x: first.sum("value") }]).run("third", |p| p.x);
        print(third[0].value);
    "#;
    let whole = run_on(text, 2);
    assert_eq!(whole.lines, ["82"]);
    let mut gathered: BTreeMap<String, Vec<Point>> = BTreeMap::new();
    for number in 1..=3 {
        let (outcome, recorder) = run_with(text, RunOptions { part: Some(Part { number, of: 3 }), ..on(2) });
        assert!(outcome.errors.is_empty() && recorder.lines.is_empty() && recorder.snapshots.is_empty());
        assert_eq!(outcome.waits_for.as_deref(), Some("first"));
        let names: Vec<&str> = recorder.sweeps.iter().map(|(start, ..)| start.name.as_str()).collect();
        assert_eq!(names, ["first", "second"]);
        for (start, points, left_out) in recorder.sweeps {
            assert!(points.iter().all(|p| p.index % 3 == number - 1));
            let share = (0..start.points).filter(|k| k % 3 == number - 1).count() as u64;
            assert_eq!(left_out, Some(share - points.len() as u64));
            gathered.entry(start.name).or_default().extend(points);
        }
    }
    let mut recorder = Recorder { stored: gathered, ..Recorder::default() };
    let outcome = run(&script(text), on(1), &mut recorder);
    assert!(outcome.errors.is_empty() && outcome.waits_for.is_none());
    recorder.sweeps.iter_mut().for_each(|(_, points, _)| points.sort_by_key(|p| p.index));
    assert_eq!(
        (recorder.lines, recorder.snapshots, recorder.sweeps),
        (whole.lines, whole.snapshots, whole.sweeps)
    );
}

/// Source of truth: a listener that cannot keep points stops the script with its own words, an interrupt with E503 and the finished
/// points handed over.
#[test]
fn a_sweep_stops_cleanly() {
    struct Full;
    impl Sink for Full {
        fn snapshot(&mut self, _: Snapshot) -> Result<(), String> {
            Ok(())
        }
        fn points(&mut self, _: &SweepStart, _: Vec<Point>) -> Result<(), String> {
            Err("the disk is full".to_string())
        }
    }
    let text = "let t = grid(#{ x: range(0, 10000) }).run(\"t\", |p| p.x);\nprint(t.len);";
    let outcome = run(&script(text), on(2), &mut Full);
    assert_eq!(
        (outcome.errors[0].code, outcome.errors[0].message.as_str()),
        (codes::UNWRITABLE, "the disk is full")
    );

    /// Raises the interrupt once points have come.
    struct Impatient(Recorder, std::sync::Arc<std::sync::atomic::AtomicBool>);
    impl Sink for Impatient {
        fn print(&mut self, line: &str) {
            self.0.print(line);
        }
        fn snapshot(&mut self, _: Snapshot) -> Result<(), String> {
            Ok(())
        }
        fn sweep(&mut self, sweep: &SweepStart) -> Result<StoredPoints, String> {
            self.0.sweep(sweep)
        }
        fn points(&mut self, sweep: &SweepStart, points: Vec<Point>) -> Result<(), String> {
            self.1.store(true, std::sync::atomic::Ordering::Relaxed);
            self.0.points(sweep, points)
        }
    }
    let text = "let t = grid(#{ x: range(0, 100000) }).run(\"t\", |p| { let sum = 0; for i in range(0, 1000) { sum += i; } p.x });\nprint(t.len);";
    let interrupt = std::sync::Arc::new(std::sync::atomic::AtomicBool::new(false));
    let mut sink = Impatient(Recorder::default(), std::sync::Arc::clone(&interrupt));
    let outcome = run(&script(text), RunOptions { interrupt, ..on(2) }, &mut sink);
    assert!(outcome.interrupted && sink.0.lines.is_empty(), "{:?} {:?}", outcome.errors, sink.0.lines);
    let points = &sink.0.sweeps[0].1;
    assert!(
        !points.is_empty() && points.len() < 100_000 && points.iter().all(|p| p.status == Status::Solved)
    );
}

/// Source of truth: the limits: closures that the engine's own functions call count, in a point and outside; what all points do
/// together is bounded.
#[test]
fn limits_hold_in_points() {
    let mut options = on(2);
    options.limits.operations = 100_000;
    expect_diagnostics(
        "let a = []; a.pad(1000, 1); a.map(|x| { for i in range(0, 100) { } x }); // ~ E500",
        options.clone(),
    );
    options.limits.sweep_operations = 1_000_000;
    let text =
        "let t = grid(#{ x: range(0, 100) }).run(\"t\", |p| { for i in range(0, 20000) { } p.x }); // ~ E500";
    expect_diagnostics(text, options.clone());
    options.limits.sweep_points = 1000;
    expect_diagnostics("grid(#{ x: range(0, 1001) }).run(\"t\", |p| p.x); // ~ E502", options);
    // a sweep inside a point draws on the operations of the point
    let mut options = on(2);
    options.limits.point_operations = 50_000;
    let text = "let t = grid(#{ x: [1, 2] }).run(\"t\", |p| grid(#{ y: range(0, 100) }).run(\"u\", |q| { for i in range(0, 1000) { } q.y }).len); // ~ E330";
    expect_diagnostics(text, options);
}

/// Source of truth: the rules of plans, each broken once.
#[test]
fn what_is_no_plan_is_refused() {
    fails("grid(#{}); // ~ E130");
    fails("grid(#{ x: [] }); // ~ E130");
    fails("grid(#{ x: [1, 2.nm] }); // ~ E130");
    fails("grid(#{ x: [1, \"a\"] }); // ~ E130");
    fails("grid(#{ x: [[1], [2]] }); // ~ E130");
    fails("grid(#{ x: normal(1.nm, 5.percent) }); // ~ E130");
    fails("grid(3); // ~ E107");
    fails("zip(#{ x: [1, 2], y: [1, 2, 3] }); // ~ E130");
    fails("list([#{ x: 1 }, #{ y: 1 }]); // ~ E130");
    fails("list([]); // ~ E130");
    fails("grid(#{ x: [1] }) * grid(#{ x: [2] }); // ~ E130");
    fails("grid(#{ x: [1] }) + grid(#{ y: [2] }); // ~ E130");
    fails("random(#{ x: uniform(1, 2) }, 0); // ~ E130");
    fails("random(#{ x: uniform(1, 2) }, 10, -1); // ~ E130");
    fails("uniform(2, 1); // ~ E130");
    fails("triangular(1.nm, 5.nm, 3.nm); // ~ E130");
    fails("normal(30.nm, 5); // ~ E200");
    fails("normal(30.nm, -5.percent); // ~ E130");
    fails("log_normal(-1, 0.2); // ~ E130");
    fails("grid(#{ x: [1, 2] }).point(2); // ~ E115");
    fails("grid(#{ x: [1, 2] }).runn(\"a\", |p| p.x); // ~ E102");
    fails("grid(#{ x: [1, 2] }).sizes; // ~ E105");
    fails("grid(#{ x: [1, 2] }).run(\"a\", 5); // ~ E107");
    fails("grid(#{ x: [1, 2] }).run(\" \", |p| p.x); // ~ E122");
    fails("table([#{ a: 1 }, #{ b: 1 }]); // ~ E107");
    fails("table(3); // ~ E107");
    fails("let t = grid(#{ x: [1, 2] }).run(\"a\", || 1); // ~ E330");
    fails("let t = grid(#{ x: [1, 2] }).run(\"a\", |p| #{ x: 3 }); // ~ E330");
    fails("let t = grid(#{ x: [1, 2] }).run(\"a\", |p| #{ y: [1] }); // ~ E330");
    fails("let t = grid(#{ x: [1, 2] }).filter(|p| 3).run(\"a\", |p| 1); // ~ E330");
    let nouns = printed(
        "let list = [1]; let grid = 2; let normal = 3; let random = 4; print(list[0] + grid + normal + random);",
    );
    assert_eq!(nouns, ["10"]);
}

/// Source of truth: small tables, worked out by hand.
#[test]
fn tables_answer() {
    let lines = printed(
        r#"
        let t = grid(#{ a: [1, 2, 3], b: ["n", "p"] }).run("t", |p| #{ v: p.a * (if p.b == "n" { 10.mV } else { -20.mV }), a: p.a, odd: p.a % 2 == 1 });
        print(t.columns);
        print(t.best("v").v);
        print(t.best("v", "lowest").a);
        print(t.sort("v")[0].v);
        print(t.sort("b", "falling")[0].b);
        print(t["v"][1]);
        print(t.a[5] + 1);
        print(t[-1].b);
        print(t.filter(|r| r.odd && r.b == "n")["a"]);
        print(t.group("b", |part| #{ mean: part.mean("v"), rows: part.len }));
        print(t.group("a")[1].table.len);
        print(t.pivot("a", "b", "v").values);
        print(t.derive("double", |r| r.v * 2).max("double"));
        print(t.yield(|r| r.v > 0.V));
        print(t.quantile("v", 0.5));
        print(abs(t.filter(|r| r.b == "n").fit("a", "v", "line").slope - 10.mV) < 1e-12.mV);
        let n = 0; for row in t.rows { n += row.a; } for row in t { n += row.a; } print(n);
        let all = t;
        print(t.filter(|r| r.v > all.mean("v") && all.len == 6).len);
        let seen = 0; t.filter(|r| { seen += 1; true }); print(seen);
        let plan = grid(#{ x: [1, 2] });
        print(plan.run("own", |p| all.len + t.len).sum("value"));
        store("derived", t.group("b", |part| #{ mean: part.mean("v") }));
        "#,
    );
    assert_eq!(
        lines,
        [
            "[\"a\", \"b\", \"odd\", \"v\"]",
            "0.03 V",
            "3",
            "-0.06 V",
            "p",
            "-0.02 V",
            "4",
            "p",
            "[1, 3]",
            "table `t`: 2 rows\n  b  mean (V)  rows\n  n      0.02     3\n  p     -0.04     3",
            "2",
            "[[0.01 V, 0.02 V, 0.03 V], [-0.02 V, -0.04 V, -0.06 V]]",
            "0.06 V",
            "50 %",
            "-0.005 V",
            "true",
            "24",
            "3",
            "6",
            "24",
        ]
    );
    let t = "let t = grid(#{ a: [1, 2], b: [1, 2] }).run(\"t\", |p| #{ v: p.a, w: \"x\", none: () });\n";
    for rest in [
        "t.mean(\"vv\"); // ~ E115",
        "t.mean(\"w\"); // ~ E107",
        "t.mean(\"none\"); // ~ E107",
        "t.filter(|r| r.v > 5).mean(\"v\"); // ~ E131",
        "t.filter(|r| r.v > 5).yield(|r| r.v > 6); // ~ E131",
        "t[4]; // ~ E115",
        "t.best(\"v\", \"least\"); // ~ E122",
        "t.fit(\"v\", \"a\", \"cubic\"); // ~ E122",
        "t.fit(\"v\", \"b\", \"parabola\"); // ~ E132",
        "t.quantile(\"v\", 2); // ~ E219",
        "t.derive(\"a\", |r| 1); // ~ E122",
        "t.filter(|r| 3); // ~ E107",
        "t.pivot(\"a\", \"w\", \"v\"); // ~ E122",
    ] {
        fails(&format!("{t}{rest}"));
    }
}

/// Source of truth: the specification: a check solves nothing and finds unknown names, units and options inside closures; what
/// depends on figures that are not solved is not complained of.
#[test]
fn a_check_looks_into_closures() {
    let checked = RunOptions { check_only: true, ..RunOptions::default() };
    let head = "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"d\", [layer(\"n\", gaas, 100.nm, donors(1e18.per_cm3)), layer(\"p\", gaas, 1.um, acceptors(1e17.per_cm3))]);\nlet sun = spectrum(\"AM1.5G\");\nlet plan = grid(#{ t: [1.um, 2.um] });\n";
    let good = r#"let map = plan.run("map", |p| { cell["p"].thickness = p.t; let jv = cell.jv(sun); store("jv", jv); #{ eta: jv.efficiency, voc: jv.voc, good: jv.voc > 1.V } });
let best = map.best("eta");
let fine = grid(#{ t: linear(best.t - 100.nm, best.t + 100.nm, 5) }).run("fine", |p| #{ eta: best.eta });
if map.len > 3 && map.filter(|r| r.eta > 0.2).len > 0 { print(map.fit("t", "eta", "parabola").extremum_at + 1.nm); }
for r in map.rows { print(r.voc + 1.V); }
print(map.yield(|r| r.voc > 1.V)); print(map.mean("voc") + 1.V); print(map.pivot("t", "good", "voc").values);
let g = map.group("good", |part| #{ m: part.mean("voc") }); print(g.max("m") + 1.V);
"#;
    expect_diagnostics(&format!("{head}{good}"), checked.clone());
    for bad in [
        "plan.run(\"map\", |p| cell.jv(sunn).voc); // ~ E101",
        "plan.run(\"map\", |p| cell.iv(sun).voc); // ~ E102",
        "plan.run(\"map\", |p| { cell[\"p\"].thickness = 5.furlong; cell.jv(sun).voc }); // ~ E204",
        "plan.run(\"map\", |p| { cell.front = ohmic(#{ velocity: 1 }); 1 }); // ~ E108",
        "plan.run(\"map\", |p| cell.jv(sun).voc + 1); // ~ E200",
        "plan.run(\"map\", |p| p.thickness); // ~ E115",
        "let map = plan.run(\"map\", |p| #{ voc: cell.jv(sun).voc });\nmap.mean(\"vok\"); // ~ E115",
        "let map = plan.run(\"map\", |p| #{ voc: cell.jv(sun).voc });\nmap.filter(|r| r.vok > 1.V); // ~ E115",
        "plan.filter(|p| p.u > 1.um).run(\"map\", |p| 1); // ~ E115",
    ] {
        expect_diagnostics(&format!("{head}{bad}"), checked.clone());
    }
}

/// Source of truth: sizes: a million points with three coordinates and two figures; 500 MB for the whole process is the specified
/// bound, of which a table may take a fifth. (The listener keeps only a count.)
#[test]
fn a_million_points_stay_small() {
    struct Counter(u64);
    impl Sink for Counter {
        fn print(&mut self, line: &str) {
            assert_eq!(line, "1000000 499999.5");
        }
        fn snapshot(&mut self, _: Snapshot) -> Result<(), String> {
            Ok(())
        }
        fn points(&mut self, _: &SweepStart, points: Vec<Point>) -> Result<(), String> {
            self.0 += points.len() as u64;
            let cell = |p: &Point| matches!(p.outputs[0].cell, Cell::Number { .. });
            if points.iter().all(cell) { Ok(()) } else { Err("no number".to_string()) }
        }
    }
    let text = "let t = grid(#{ a: range(0, 100), b: range(0, 100), c: range(0, 100) }).run(\"t\", |p| #{ k: 10000 * p.a + 100 * p.b + p.c, m: p.a });\nprint(`${t.len} ${t.mean(\"k\")}`);";
    let mut options = on(2);
    options.limits.memory = 400 << 20;
    let mut sink = Counter(0);
    let outcome = run(&script(text), options, &mut sink);
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    assert_eq!(sink.0, 1_000_000);
}

/// Source of truth: the coordinates that the script itself gives: a mistyped one is told with its neighbour, by a run and by a
/// check.
#[test]
fn a_mistyped_coordinate_is_told_with_those_there_are() {
    let text = "let t = grid(#{ base: [1, 2], na: 3 }).run(\"t\", |p| p.bas); // ~ E330";
    let told = fails(text).notes.join("\n");
    assert!(told.contains("[E115] the map has no entry `bas`; the point itself has `base`, `na`"), "{told}");
    let checked = RunOptions { check_only: true, ..RunOptions::default() };
    let outcome = expect_diagnostics(&text.replace("E330", "E115"), checked);
    assert_eq!(outcome.errors[0].help.as_deref(), Some("did you mean `base`?"));
}
