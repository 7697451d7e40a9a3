//! Sweeps as real processes and files: killed, stopped, on a full disk, in parts; the archive comes out the same.

use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use epiloom::archive::{Archive, Point, StoredPoint};

use crate::support::{Bench, Ran, SMALL_CELL};

/// Cheap points, so that many batches are stored in a moment: what a point gives, prints, stores and fails of.
fn cheap(points: u32) -> String {
    format!(
        r#"let plan = grid(#{{ a: linear(1.0, 2.0, {points}), b: [1.nm, 2.nm] }});
let table = plan.run("map", |p| {{
    let sum = 0.0;
    for i in 0..10 {{ sum += p.a; }}
    if p.a > 1.5 && p.a < 1.51 {{ print(`at ${{p.a}}`); store("note", #{{ sum: sum }}); }}
    if p.a > 1.9 && p.a < 1.91 {{ throw "no such cell"; }}
    #{{ sum: sum, thick: p.b, good: p.a > 1.2 }}
}});
store("best", #{{ sum: table.best("sum").sum }});
"#
    )
}

fn open(path: &Path) -> Option<Archive> {
    Archive::open(path).ok()
}

/// The points of a sweep as they are read.
fn points(archive: &Archive, sweep: &str) -> Vec<Point> {
    let Ok(sweep) = archive.sweep(sweep) else { return Vec::new() };
    let read = |stored: StoredPoint| {
        for place in &stored.snapshots {
            archive.point_snapshot(place).expect("what a point stored is whole");
        }
        stored.point
    };
    archive.points(sweep).map(|stored| read(stored.expect("every point is whole"))).collect()
}

/// The last count of points that a log told: they were durable before it was written.
fn counted(log: &str) -> u64 {
    let counts =
        log.lines().filter_map(|line| line.strip_prefix("sweep `map`: ")?.split(' ').next()?.parse().ok());
    counts.max().unwrap_or(0)
}

/// Numbers in a fixed order: Knuth's linear congruential generator (The Art of Computer Programming, vol. 2).
struct Random(u64);

impl Random {
    fn share(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1_u64 << 53) as f64
    }
}

/// Starts a run of `map.rhai` that logs each batch, killed after that time. What it logged, and whether it had ended.
fn killed_after(bench: &Bench, time: Duration) -> (String, bool) {
    let log = std::fs::File::create(bench.path("log")).expect("writable");
    let mut command = bench.command(&["run", "map.rhai", "--log-every", "0"]);
    let mut child = command.stdout(Stdio::null()).stderr(log).spawn().expect("it starts");
    std::thread::sleep(time);
    let ended = child.try_wait().expect("it can be asked").is_some();
    // SIGKILL on Unix; a process that has just ended needs none
    let _ = child.kill();
    child.wait().expect("it ends");
    (String::from_utf8_lossy(&bench.bytes("log")).into_owned(), ended)
}

/// Source of truth: a run that nothing stopped. Killed at 200 random instants, each time the file opens, every point
/// that was counted is there, and the next run completes to the same bytes.
#[cfg(unix)]
#[test]
fn a_sweep_killed_at_any_instant_loses_no_counted_point() {
    let kills: u32 = std::env::var("EPILOOM_KILLS").ok().and_then(|n| n.parse().ok()).unwrap_or(200);
    let bench = Bench::with("map.rhai", &cheap(1500));
    let began = Instant::now();
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    let whole_run = began.elapsed();
    let whole = bench.bytes("map.epiloom");
    let all = points(&open(&bench.path("map.epiloom")).expect("it opens"), "map");
    assert_eq!(all.len(), 3000);
    let mut random = Random(7);
    let (mut within, mut most) = (0, 0);
    for kill in 0..kills {
        std::fs::remove_file(bench.path("map.epiloom")).expect("it is there");
        let (log, ended) = killed_after(&bench, whole_run.mul_f64(random.share()));
        let told = counted(&log);
        let finished = open(&bench.path("map.epiloom"));
        let left = finished.or_else(|| open(&bench.path("map.epiloom.unfinished")));
        let stored = left.map_or_else(Vec::new, |archive| points(&archive, "map"));
        assert!(stored.len() as u64 >= told, "kill {kill}: {told} were counted, {} are there", stored.len());
        for point in &stored {
            let same = all.iter().find(|each| each.index == point.index);
            assert_eq!(Some(point), same, "kill {kill}");
        }
        within += u32::from(!stored.is_empty() && stored.len() < all.len());
        most = most.max(stored.len());
        assert!(
            ended
                || bench.path("map.epiloom.unfinished").exists()
                || stored.is_empty()
                || stored.len() == all.len()
        );
        if !bench.path("map.epiloom").exists() {
            bench.ends(0, &["run", "map.rhai", "--quiet"]);
        }
        assert!(bench.bytes("map.epiloom") == whole, "kill {kill}, of {} points on", stored.len());
        let _ = std::fs::remove_file(bench.path("map.epiloom.unfinished"));
    }
    println!("{within} of {kills} kills fell within the points, the latest after {most} of {}", all.len());
    assert!(within * 10 >= kills, "only {within} of {kills} kills fell within the points");
}

/// Source of truth: determinism: the same bytes on one thread and on two, and a replay to the bit.
#[test]
fn a_sweep_gives_the_same_bytes_on_any_number_of_threads() {
    let bench = Bench::with("map.rhai", &cheap(300));
    let ran = bench.ends(0, &["run", "map.rhai", "--threads", "1", "--out", "one.epiloom"]);
    assert!(ran.out.contains("sweep `map` (grid of a (300) by b (2)): 600 points, 6 failed"), "{}", ran.out);
    bench.ends(0, &["run", "map.rhai", "--threads", "2", "--out", "two.epiloom", "--quiet"]);
    assert!(bench.bytes("one.epiloom") == bench.bytes("two.epiloom"));
    let again = bench.ends(0, &["replay", "one.epiloom"]);
    assert!(again.out.contains("identical to the bit") && again.out.contains("600 points"), "{}", again.out);
}

/// Source of truth: the promise of Ctrl-C: what is finished is kept and counted, and the next run goes on from it.
#[cfg(unix)]
#[test]
fn a_sweep_stopped_from_the_keyboard_goes_on_where_it_was() {
    let bench = Bench::with("map.rhai", &cheap(20_000));
    let mut command = bench.command(&["run", "map.rhai", "--log-every", "0"]);
    let child = command.stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().expect("it starts");
    let unfinished = bench.path("map.epiloom.unfinished");
    let begun = Instant::now();
    while open(&unfinished).is_none_or(|archive| archive.sweeps().iter().all(|sweep| sweep.count() == 0)) {
        assert!(begun.elapsed() < Duration::from_secs(60), "no point was stored in a minute");
        std::thread::sleep(Duration::from_millis(20));
    }
    let stopped = Command::new("kill").args(["-INT", &child.id().to_string()]).status().expect("kill runs");
    assert!(stopped.success());
    let ran = Ran::of(child.wait_with_output().expect("it ends"));
    assert_eq!(ran.code, 130, "{}", ran.err);
    let kept = points(&open(&unfinished).expect("it opens"), "map").len();
    assert!(kept > 0 && kept as u64 >= counted(&ran.err), "{kept}: {}", ran.err);
    assert!(
        ran.err.contains(&format!("{kept} finished points are kept in map.epiloom.unfinished")),
        "{}",
        ran.err
    );
    assert!(ran.err.contains(" a second, about "), "rate and time left in the log: {}", ran.err);
    let again = bench.ends(0, &["run", "map.rhai", "--threads", "1"]);
    assert!(
        again.err.contains(&format!("{kept} points of sweeps are stored and not solved again")),
        "{}",
        again.err
    );
    let bytes = bench.bytes("map.epiloom");
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    assert!(bench.bytes("map.epiloom") == bytes);
}

/// Source of truth: an unfinished archive of other inputs, or of a changed script, is kept whole under another name.
#[cfg(unix)]
#[test]
fn another_runs_points_are_set_aside_with_the_reason() {
    let script = format!("let scale = input(\"scale\", 1.0);\n{}", cheap(4000));
    let bench = Bench::with("map.rhai", &script);
    let left = |bench: &Bench| {
        for tenths in 1..100 {
            let _ = std::fs::remove_file(bench.path("map.epiloom"));
            killed_after(bench, Duration::from_millis(60 * tenths));
            if open(&bench.path("map.epiloom.unfinished"))
                .is_some_and(|it| it.sweeps().iter().any(|s| s.count() > 0))
            {
                return bench.bytes("map.epiloom.unfinished");
            }
        }
        panic!("no kill fell within the points");
    };
    let before = left(&bench);
    let ran = bench.ends(0, &["run", "map.rhai", "--set", "scale=2"]);
    assert!(
        ran.err.contains("`scale` was 1.0 and is now 2.0") && ran.err.contains("unfinished-1"),
        "{}",
        ran.err
    );
    assert!(bench.bytes("map.epiloom.unfinished-1") == before);
    let before = left(&bench);
    bench.write("map.rhai", &format!("{script}// changed\n"));
    let ran = bench.ends(0, &["run", "map.rhai"]);
    assert!(ran.err.contains("the script has changed") && ran.err.contains("unfinished-2"), "{}", ran.err);
    assert!(bench.bytes("map.epiloom.unfinished-2") == before);
    bench.write("map.rhai", &script);
    let before = left(&bench);
    let ran = bench.ends(0, &["run", "map.rhai", "--anew"]);
    assert!(ran.err.contains("begins anew"), "{}", ran.err);
    assert!(bench.bytes("map.epiloom.unfinished-3") == before);
}

/// Source of truth: the lock of the operating system; the message names the process that this test started.
#[cfg(unix)]
#[test]
fn a_second_run_is_refused_with_the_holder_named() {
    let bench = Bench::with("map.rhai", &cheap(30_000));
    let mut first = bench
        .command(&["run", "map.rhai"])
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn()
        .expect("it starts");
    let holder = bench.path("map.epiloom.unfinished.holder");
    let begun = Instant::now();
    while !holder.exists() && begun.elapsed() < Duration::from_secs(60) {
        std::thread::sleep(Duration::from_millis(10));
    }
    let second = bench.ends(5, &["run", "map.rhai"]);
    let named = format!("process {} on host ", first.id());
    assert!(second.err.contains("E405") && second.err.contains(&named), "{}", second.err);
    first.kill().expect("it was going on");
    first.wait().expect("it ends");
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    assert!(!holder.exists());
    let bytes = bench.bytes("map.epiloom");
    assert!(!String::from_utf8_lossy(&bytes).contains("on host"), "the archive names no host");
}

/// A folder on a disk of its own that holds `kilobytes`, unmounted when dropped; nothing where none may be mounted.
#[cfg(target_os = "linux")]
struct SmallDisk(PathBuf);

#[cfg(target_os = "linux")]
impl SmallDisk {
    fn mounted(at: PathBuf, kilobytes: u32) -> Option<SmallDisk> {
        std::fs::create_dir(&at).expect("writable");
        let size = format!("size={kilobytes}k");
        let mounted = Command::new("mount").args(["-t", "tmpfs", "-o", &size, "tmpfs"]).arg(&at).output();
        mounted.is_ok_and(|output| output.status.success()).then_some(SmallDisk(at))
    }

    fn again(&self, options: &str) {
        let options = format!("remount,{options}");
        let done = Command::new("mount").args(["-o", &options]).arg(&self.0).status().expect("mount runs");
        assert!(done.success());
    }
}

#[cfg(target_os = "linux")]
impl Drop for SmallDisk {
    fn drop(&mut self) {
        let _ = Command::new("umount").arg(&self.0).status();
    }
}

/// Source of truth: a file system that is really full, or a limit on the length of files where none may be mounted: the
/// run says so, what it counted is there, and with room it goes on to the same bytes.
#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_loses_no_counted_point() {
    let bench = Bench::with("map.rhai", &cheap(4000));
    bench.ends(0, &["run", "map.rhai", "--quiet", "--out", "whole.epiloom"]);
    let whole = bench.bytes("whole.epiloom");
    let disk = SmallDisk::mounted(bench.path("small"), 200);
    let arguments = ["run", "map.rhai", "--log-every", "0", "--out", "small/map.epiloom"];
    let ran = match &disk {
        Some(_) => bench.run(&arguments),
        None => {
            println!("no file system can be mounted: the length of files is limited instead");
            // 512 bytes a block; the signal that comes with the limit is ignored, so that the write fails
            let program = bench.command(&[]).get_program().to_owned();
            let mut shell = Command::new("sh");
            shell.current_dir(bench.path("")).args(["-c", "trap '' XFSZ; ulimit -f 300; exec \"$0\" \"$@\""]);
            Ran::of(shell.arg(program).args(arguments).output().expect("sh runs"))
        }
    };
    assert_eq!(ran.code, 5, "{}\n{}", ran.out, ran.err);
    assert!(ran.err.contains("E403"), "{}", ran.err);
    let stored = points(&open(&bench.path("small/map.epiloom.unfinished")).expect("it opens"), "map");
    assert!(!stored.is_empty() && stored.len() < 8000, "{} points", stored.len());
    assert!(stored.len() as u64 >= counted(&ran.err), "{}: {}", stored.len(), ran.err);
    if let Some(disk) = &disk {
        disk.again("size=8m");
    }
    let again = bench.ends(0, &["run", "map.rhai", "--out", "small/map.epiloom"]);
    assert!(again.err.contains(&format!("{} points of sweeps are stored", stored.len())), "{}", again.err);
    assert!(bench.bytes("small/map.epiloom") == whole);
}

/// Source of truth: a folder that cannot be written to: the run says so before it solves anything.
#[cfg(target_os = "linux")]
#[test]
fn a_read_only_folder_is_told_before_anything_is_solved() {
    let bench = Bench::with("map.rhai", &cheap(10));
    let disk = SmallDisk::mounted(bench.path("closed"), 64);
    match &disk {
        Some(disk) => disk.again("ro"),
        None => {
            use std::os::unix::fs::PermissionsExt;
            let closed = std::fs::Permissions::from_mode(0o555);
            std::fs::set_permissions(bench.path("closed"), closed).expect("its own folder");
            if std::fs::write(bench.path("closed/probe"), "").is_ok() {
                println!("skipped: nothing is read-only for this user, and no file system can be mounted");
                return;
            }
        }
    }
    let ran = bench.ends(5, &["run", "map.rhai", "--out", "closed/map.epiloom"]);
    assert!(ran.err.contains("E403") && ran.out.is_empty(), "{}{}", ran.out, ran.err);
}

/// Source of truth: a single run: parts and their gathering give its bytes; what is missing, doubled or foreign is named.
#[test]
fn parts_are_gathered_to_the_bytes_of_a_single_run() {
    let bench = Bench::with("map.rhai", &cheap(200));
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    for part in ["1/3", "2/3", "3/3"] {
        let ran = bench.ends(0, &["run", "map.rhai", "--part", part]);
        assert!(
            ran.out.contains("archive map.part-") && ran.err.contains("gather"),
            "{}{}",
            ran.out,
            ran.err
        );
    }
    let names = ["map.part-1-of-3.epiloom", "map.part-2-of-3.epiloom", "map.part-3-of-3.epiloom"];
    fn gather<'a>(parts: &[&'a str]) -> Vec<&'a str> {
        [&["gather"][..], parts, &["-o", "whole.epiloom"]].concat()
    }
    let missing = bench.ends(3, &gather(&[names[0], names[2]]));
    assert!(
        missing.err.contains("E406") && missing.err.contains("part 2 of 3 is missing"),
        "{}",
        missing.err
    );
    let twice = bench.ends(3, &gather(&[names[0], names[1], names[2], names[1]]));
    assert!(twice.err.contains("twice"), "{}", twice.err);
    assert!(bench.ends(3, &gather(&["map.epiloom"])).err.contains("no part"));
    bench.write("other.rhai", &cheap(201));
    bench.ends(0, &["run", "other.rhai", "--part", "2/3"]);
    let foreign = bench.ends(3, &gather(&[names[0], "other.part-2-of-3.epiloom", names[2]]));
    assert!(foreign.err.contains("scripts"), "{}", foreign.err);
    bench.ends(0, &gather(&names));
    assert!(bench.bytes("whole.epiloom") == bench.bytes("map.epiloom"));
    bench.ends(0, &["replay", names[1]]);
    for wrong in ["0/3", "4/3", "3", "a/b"] {
        bench.ends(2, &["run", "map.rhai", "--part", wrong]);
    }
}

/// Source of truth: the points of the archive through its own reader: what is shown and exported are those.
#[test]
fn sweeps_are_shown_exported_and_compared() {
    let bench = Bench::with("map.rhai", &cheap(100));
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    let all = points(&open(&bench.path("map.epiloom")).expect("it opens"), "map");
    let listing = bench.ends(0, &["show", "map.epiloom"]).out;
    assert!(listing.contains("sweep") && listing.contains("200 points"), "{listing}");
    let table = bench.ends(0, &["show", "map.epiloom", "--table", "map", "--rows", "4"]).out;
    assert_eq!(table.lines().count(), 2 + 4 + 1, "{table}");
    assert!(table.contains("and 196 points more"), "{table}");
    assert_eq!(bench.ends(0, &["show", "map.epiloom", "--table", "map", "--all"]).out.lines().count(), 202);
    let sorted = bench
        .ends(0, &["show", "map.epiloom", "--table", "map", "--sort", "sum", "--descending", "--rows", "1"])
        .out;
    assert!(sorted.lines().nth(2).is_some_and(|line| line.trim_start().starts_with("198 ")), "{sorted}");
    let unknown = bench.ends(2, &["show", "map.epiloom", "--table", "map", "--sort", "sun"]);
    assert!(unknown.err.contains("sum"), "{}", unknown.err);
    let failed = all.iter().find(|point| point.outputs.is_empty()).expect("one fails");
    let shown = bench.ends(0, &["show", "map.epiloom", &format!("map/{}", failed.index)]).out;
    assert!(shown.contains("failed:") && shown.contains("no such cell"), "{shown}");
    let archive = open(&bench.path("map.epiloom")).expect("it opens");
    let sweep = archive.sweep("map").expect("it is there");
    let storing = archive.points(sweep).map(|it| it.expect("whole")).find(|it| !it.snapshots.is_empty());
    let storing = storing.expect("one stores something");
    let name = &storing.snapshots[0].label.name;
    assert!(bench.ends(0, &["show", "map.epiloom", name]).out.contains("sum"));
    bench.ends(2, &["show", "map.epiloom", "map/200"]);
    bench.ends(2, &["show", "map.epiloom", "--table", "mop"]);

    bench.ends(0, &["export", "map.epiloom", "map", "--to", "csv", "-o", "map.csv"]);
    let csv = String::from_utf8(bench.bytes("map.csv")).expect("text");
    let heading: Vec<&str> = csv.lines().next().expect("a heading").split(',').collect();
    assert_eq!(heading, ["point", "a", "b_nm", "good", "sum", "thick_nm", "reason"]);
    for (line, point) in csv.lines().skip(1).zip(&all) {
        let cells: Vec<&str> = line.split(',').collect();
        assert_eq!(cells[0].parse(), Ok(point.index));
        let sum = point.output("sum").and_then(|output| output.cell.number());
        assert_eq!(cells[4].parse().ok().map(f64::to_bits), sum.map(f64::to_bits), "{line}");
    }
    bench.ends(0, &["export", "map.epiloom", "map", "--to", "json", "-o", "map.json"]);
    let json: serde_json::Value = serde_json::from_slice(&bench.bytes("map.json")).expect("JSON");
    let column =
        json["columns"].as_array().expect("columns").iter().find(|c| c["name"] == "sum").expect("sum");
    for (value, point) in column["values"].as_array().expect("values").iter().zip(&all) {
        let sum = point.output("sum").and_then(|output| output.cell.number());
        assert_eq!(value.as_f64().map(f64::to_bits), sum.map(f64::to_bits));
    }

    let same = bench.ends(0, &["compare", "map.epiloom", "map.epiloom"]);
    assert!(same.out.contains("to the bit"), "{}", same.out);
    bench.write("map.rhai", &cheap(100).replace("sum += p.a;", "sum += 2.0 * p.a;"));
    bench.ends(0, &["run", "map.rhai", "--quiet", "--out", "second.epiloom"]);
    let other = bench.ends(4, &["compare", "map.epiloom", "second.epiloom"]);
    for word in ["script, from line", "`best`", "200 points moved", "sum"] {
        assert!(other.out.contains(word), "{word}: {}", other.out);
    }
}

/// Source of truth: two devices whose one material value differs, and errors that the archive carries.
#[test]
fn compare_tells_inputs_materials_and_what_moved() {
    let bench = Bench::with("small.rhai", &format!("{SMALL_CELL}store(\"light\", cell.jv(lamp, [0.V]));"));
    bench.ends(0, &["run", "small.rhai", "--quiet", "--out", "a.epiloom"]);
    bench.ends(0, &["run", "small.rhai", "--quiet", "--out", "b.epiloom", "--set", "base=400nm"]);
    let ran = bench.ends(4, &["compare", "a.epiloom", "b.epiloom"]);
    for word in ["input base", "500 nm", "400 nm", "short-circuit", "beyond its error"] {
        assert!(ran.out.contains(word), "{word}: {}", ran.out);
    }
    let text = std::fs::read_to_string(bench.path("small.rhai")).expect("a script");
    bench.write("small.rhai", &text.replace("electron_mobility: 3000", "electron_mobility: 2900"));
    bench.ends(0, &["run", "small.rhai", "--quiet", "--out", "c.epiloom"]);
    let ran = bench.ends(4, &["compare", "a.epiloom", "c.epiloom"]);
    assert!(ran.out.contains("electron_mobility") && ran.out.contains("2900"), "{}", ran.out);
}

/// Source of truth: numpy and pyarrow themselves read the files; their numbers are those of the archive to the bit.
#[test]
fn exported_sweeps_open_in_numpy_and_pyarrow() {
    let python = std::env::var("EPILOOM_PYTHON").unwrap_or_else(|_| "python3".to_string());
    let has = |module: &str| {
        let found = Command::new(&python).args(["-c", &format!("import {module}")]).output();
        let found = found.is_ok_and(|output| output.status.success());
        if !found {
            println!("skipped: `{python}` has no {module}");
        }
        found
    };
    let bench = Bench::with("map.rhai", &cheap(100));
    bench.ends(0, &["run", "map.rhai", "--quiet"]);
    let all = points(&open(&bench.path("map.epiloom")).expect("it opens"), "map");
    let sums: Vec<String> = all
        .iter()
        .map(|point| point.output("sum").and_then(|output| output.cell.number()))
        .map(|sum| sum.map_or("none".to_string(), |sum| format!("{:016x}", sum.to_bits())))
        .collect();
    let read = |program: &str, file: &str| -> Vec<String> {
        let output =
            Command::new(&python).args(["-c", program]).arg(bench.path(file)).output().expect("Python runs");
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        String::from_utf8_lossy(&output.stdout).lines().map(str::to_string).collect()
    };
    if has("numpy") {
        bench.ends(0, &["export", "map.epiloom", "map", "--to", "npz", "-o", "map.npz"]);
        let program = "import numpy, sys, struct\n\
            z = numpy.load(sys.argv[1], allow_pickle=False)\n\
            assert z['good'].dtype == bool and z['point'].tolist() == list(range(200)), z['good']\n\
            for x in z['sum']: print('none' if x != x else struct.pack('>d', x).hex())";
        assert_eq!(read(program, "map.npz"), sums);
    }
    if has("pyarrow") {
        let ran = bench.run(&["export", "map.epiloom", "map", "--to", "parquet", "-o", "map.parquet"]);
        if ran.code == 2 && ran.err.contains("built without Parquet") {
            println!("skipped: this program was built without the feature `parquet`");
            return;
        }
        assert_eq!(ran.code, 0, "{}", ran.err);
        let program = "import pyarrow.parquet as pq, sys, struct\n\
            t = pq.read_table(sys.argv[1])\n\
            assert t.column_names == ['point', 'a', 'b_nm', 'good', 'sum', 'thick_nm', 'reason'], t.column_names\n\
            assert t['point'].to_pylist() == list(range(200))\n\
            assert set(t['good'].to_pylist()) == {True, False, None}\n\
            assert any('no such cell' in (r or '') for r in t['reason'].to_pylist())\n\
            assert t.schema.metadata[b'unit of b_nm'] == b'nm', t.schema.metadata\n\
            for x in t['sum'].to_pylist(): print('none' if x is None else struct.pack('>d', x).hex())";
        assert_eq!(read(program, "map.parquet"), sums);
    }
}

/// Source of truth: a shell runs what is printed, with programs in the scheduler's place that note their arguments: a
/// script whose name holds blanks and quotes is one word, parts that are there are skipped, the gathering comes after.
#[cfg(unix)]
#[test]
fn a_job_is_a_script_that_a_shell_runs() {
    use std::os::unix::fs::PermissionsExt;
    let script = "it's a \"map\" $HOME.rhai";
    let bench = Bench::with(script, &cheap(50));
    let made = bench.ends(
        0,
        &["job", script, "--parts", "3", "--time", "1:00:00", "--partition", "long", "--account", "bay"],
    );
    bench.write("map.job", &made.out);
    bench.write(
        "sbatch",
        "#!/bin/sh\nfor each; do printf '%s\\n' \"$each\"; done >> calls\necho --- >> calls\necho 17\n",
    );
    let executable = std::fs::Permissions::from_mode(0o755);
    std::fs::set_permissions(bench.path("sbatch"), executable).expect("its own file");
    let path = format!("{}:{}", bench.path("").display(), std::env::var("PATH").unwrap_or_default());
    let shell = |arguments: &[&str], task: Option<&str>| {
        let mut command = Command::new("bash");
        command.current_dir(bench.path("")).arg("map.job").args(arguments).env("PATH", &path);
        command.env_remove("SLURM_JOB_ID");
        if let Some(task) = task {
            command.env("SLURM_ARRAY_TASK_ID", task);
        }
        let ran = Ran::of(command.output().expect("bash runs"));
        assert_eq!(ran.code, 0, "{arguments:?} {task:?}\n{}\n{}", ran.out, ran.err);
        ran
    };
    shell(&["part"], Some("2"));
    shell(&[], None);
    let calls = String::from_utf8(bench.bytes("calls")).expect("text");
    let (array, gather) = calls.split_once("---\n").expect("two calls");
    for word in [
        "--array=1,3\n",
        "--requeue\n",
        "--time=1:00:00\n",
        "--partition=long\n",
        "--account=bay\n",
        "part\n",
    ] {
        assert!(array.contains(word), "{word}: {array}");
    }
    assert!(gather.contains("--dependency=afterany:17\n") && gather.contains("gather\n"), "{gather}");
    for task in ["1", "2", "3"] {
        let ran = shell(&["part"], Some(task));
        assert_eq!(ran.out.contains("there already"), task == "2", "{}", ran.out);
    }
    shell(&["gather"], None);
    bench.ends(0, &["run", script, "--quiet", "--out", "single.epiloom"]);
    assert!(bench.bytes(&script.replace(".rhai", ".epiloom")) == bench.bytes("single.epiloom"));
}
