//! Parts of a sweep on a real scheduler: Slurm on this one machine, a task killed and requeued, and the gathering.

use std::path::PathBuf;
use std::process::{Command, Output};
use std::time::{Duration, Instant};

use epiloom::archive::Archive;

use crate::support::{Bench, workspace};

/// A cluster that ends with the test.
struct Cluster {
    folder: PathBuf,
}

fn one_node(step: &str, folder: &std::path::Path) -> Output {
    let script = workspace().join("tests/cluster/one-node");
    Command::new(script).arg(step).arg(folder).output().expect("bash is there")
}

impl Cluster {
    fn up(folder: PathBuf) -> Cluster {
        let cluster = Cluster { folder };
        let output = one_node("up", &cluster.folder);
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        cluster
    }

    /// Runs a command of the scheduler; what it prints.
    fn ask(&self, bench: &Bench, program: &str, arguments: &[&str]) -> String {
        let mut command = Command::new(program);
        command.args(arguments).current_dir(bench.path("")).env("SLURM_CONF", self.folder.join("slurm.conf"));
        let output = command.output().unwrap_or_else(|error| panic!("{program}: {error}"));
        let error = String::from_utf8_lossy(&output.stderr);
        assert!(output.status.success(), "{program} {arguments:?}: {error}");
        String::from_utf8_lossy(&output.stdout).trim().to_string()
    }
}

impl Drop for Cluster {
    fn drop(&mut self) {
        let _ = one_node("down", &self.folder);
    }
}

/// Waits for a state, never for a time alone.
fn wait_for<T>(what: &str, mut look: impl FnMut() -> Option<T>) -> T {
    let begun = Instant::now();
    loop {
        if let Some(found) = look() {
            return found;
        }
        assert!(begun.elapsed() < Duration::from_secs(280), "gave up waiting for {what}");
        std::thread::sleep(Duration::from_millis(100));
    }
}

/// Source of truth: a single run: an array of four tasks, one of them killed half-way and requeued, and the gathering
/// after it give the same bytes.
#[test]
fn a_job_array_with_a_requeued_task_gives_the_bytes_of_a_single_run() {
    let there =
        |program: &str| Command::new(program).arg("-V").output().is_ok_and(|output| output.status.success());
    let root = Command::new("id").arg("-u").output().is_ok_and(|output| output.stdout == b"0\n");
    if !root || !["slurmctld", "slurmd", "sbatch", "munged"].iter().all(|program| there(program)) {
        println!(
            "skipped: no Slurm here, or not root: the same job runs against a stand-in of the scheduler elsewhere"
        );
        return;
    }
    let script = r#"let plan = grid(#{ a: linear(1.0, 2.0, 4000), b: [1.nm, 2.nm, 3.nm] });
let table = plan.run("map", |p| {
    let sum = 0.0;
    for i in 0..3000 { sum += p.a; }
    #{ sum: sum, thick: p.b }
});
store("best", #{ sum: table.best("sum").sum });
"#;
    let bench = Bench::with("the map.rhai", script);
    let cluster = Cluster::up(bench.path("cluster"));
    let job = bench.ends(0, &["job", "the map.rhai", "--parts", "4"]).out;
    bench.write("map.job", &job);
    let told = cluster.ask(&bench, "bash", &["map.job"]);
    let array = told.split_whitespace().nth(1).expect("a number").trim_end_matches(':').to_string();
    let second = format!("{array}_2");
    let part = bench.path("the map.part-2-of-4.epiloom.unfinished");
    let stored = wait_for("points of the second part", || {
        let archive = Archive::open(&part).ok()?;
        archive.sweeps().first().map(|sweep| sweep.count()).filter(|count| *count > 0)
    });
    // killed and put back into the queue; there it would wait two minutes
    cluster.ask(&bench, "scontrol", &["requeue", &second]);
    wait_for("the second task to be pending", || {
        let state = cluster.ask(&bench, "squeue", &["--noheader", "--jobs", &second, "--format=%T"]);
        (state == "PENDING").then_some(())
    });
    assert!(part.exists(), "it was killed before it had finished");
    cluster.ask(&bench, "scontrol", &["update", &format!("JobId={second}"), "StartTime=now"]);
    wait_for("the queue to be empty", || {
        cluster.ask(&bench, "squeue", &["--noheader", "--format=%i"]).is_empty().then_some(())
    });
    let log = |name: &str| String::from_utf8_lossy(&bench.bytes(name)).into_owned();
    let gathered = log("the map.gather.log");
    assert!(bench.path("the map.epiloom").exists(), "{gathered}\n{}", log("the map.part-2-of-4.log"));
    assert!(
        log("the map.part-2-of-4.log").contains("points of sweeps are stored and not solved again"),
        "{stored}"
    );
    bench.ends(0, &["run", "the map.rhai", "--quiet", "--out", "single.epiloom"]);
    assert!(bench.bytes("the map.epiloom") == bench.bytes("single.epiloom"));
}
