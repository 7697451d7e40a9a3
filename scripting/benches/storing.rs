//! What storing sweeps costs: a point stored and synced, a million of them finished, one of a million opened again.
//!
//! `cargo bench -p epiloom --bench storing` prints least times over repetitions, and the most memory that the process
//! took where the system tells (Linux). `STORING_POINTS` sets another number than a million.

use std::path::Path;
use std::time::{Duration, Instant};

use epiloom::archive::{Archive, Cell, Point, PointOutput, RunHeader, SweepColumn, SweepStart, Writer};

/// Points of a batch, as a sweep hands them over.
const BATCH: u64 = 256;

fn start(points: u64) -> SweepStart {
    let column = |name: &str, unit: &str| SweepColumn { name: name.to_owned(), unit: unit.to_owned() };
    SweepStart {
        name: "map".to_owned(),
        step: 0,
        points,
        plan: "grid of bsf (1000) by x (1000)".to_owned(),
        coordinates: vec![column("bsf", "nm"), column("x", "")],
    }
}

/// A point with five figures and their errors, as a J-V curve gives them.
fn point(index: u64) -> Point {
    let number = |value: f64, error| Cell::Number { value, error };
    let figures =
        [("efficiency", ""), ("ff", ""), ("jsc", "mA_per_cm2"), ("pmax", "mW_per_cm2"), ("voc", "V")];
    let value = 1.0 + index as f64 * 1e-7;
    Point {
        index,
        coordinates: vec![number(20.0 + (index % 1000) as f64, None), number((index / 1000) as f64, None)],
        outputs: figures
            .iter()
            .map(|(name, unit)| PointOutput {
                column: SweepColumn { name: (*name).to_owned(), unit: (*unit).to_owned() },
                cell: number(value, Some(value * 1e-6)),
            })
            .collect(),
        warnings: vec!["an illustrative lifetime is in use".to_owned()],
        ..Point::default()
    }
}

/// The most memory that the process has taken so far, MB.
fn most_memory() -> Option<f64> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"))?;
    line.trim().trim_end_matches("kB").trim().parse::<f64>().ok().map(|kilobytes| kilobytes / 1024.0)
}

fn milliseconds(time: Duration) -> f64 {
    time.as_secs_f64() * 1e3
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    // `cargo test --benches` only wants to know that it runs
    let testing = std::env::args().any(|argument| argument == "--test");
    let set = std::env::var("STORING_POINTS").ok().and_then(|text| text.parse().ok());
    let count: u64 = set.unwrap_or(if testing { 2_000 } else { 1_000_000 });
    let folder = tempfile::tempdir()?;
    let path = folder.path().join("map.epiloom");
    let run = RunHeader { script_name: "map.rhai".to_owned(), ..RunHeader::default() };

    let mut writer = Writer::create(&path, &run)?;
    let _ = writer.begin_sweep(&start(count))?;
    let (mut least, mut all) = (f64::INFINITY, Duration::ZERO);
    for first in (0..count).step_by(BATCH as usize) {
        // two threads work at two places of the plan
        let half = count / 2;
        let place = |k: u64| if k.is_multiple_of(2) { k / 2 } else { half + k / 2 };
        let points: Vec<Point> = (first..(first + BATCH).min(count)).map(|k| point(place(k))).collect();
        let per_point = points.len() as f64;
        let begun = Instant::now();
        writer.append_points("map", points)?;
        let time = begun.elapsed();
        all += time;
        least = least.min(time.as_secs_f64() / per_point);
    }
    println!(
        "stored and synced, {BATCH} at a time: {:.2} us a point at least, {:.2} us on average",
        1e6 * least,
        1e6 * all.as_secs_f64() / count as f64
    );
    writer.finish_sweep("map", 0)?;
    let begun = Instant::now();
    let file = writer.finish(&run)?;
    println!(
        "{count} points finished in {:.1} s, {} MB",
        begun.elapsed().as_secs_f64(),
        std::fs::metadata(&file)?.len() >> 20
    );
    if let Some(memory) = most_memory() {
        println!("most memory so far: {memory:.0} MB");
    }
    open(&file, count)
}

fn open(file: &Path, count: u64) -> Result<(), Box<dyn std::error::Error>> {
    let mut least = Duration::MAX;
    for turn in 0..20 {
        let index = (turn * 48_271 + 11) % count;
        let begun = Instant::now();
        let found = Archive::open(file)?.point("map", index)?;
        least = least.min(begun.elapsed());
        assert_eq!(found.point, point(index));
    }
    println!("one point of {count} opened in {:.3} ms", milliseconds(least));
    Ok(())
}
