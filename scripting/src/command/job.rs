//! `epiloom job`: a script that runs the parts of a sweep on a cluster with Slurm, and gathers them.

use std::num::NonZeroU64;
use std::path::{Path, PathBuf};

use crate::archive::Share;

use super::exit::Exit;
use super::output::Output;
use super::run_script::default_archive;
use super::script::ScriptArguments;

/// `epiloom job SCRIPT --parts 64`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
    epiloom job map.rhai --parts 64 --time 4:00:00 --partition long > map.job
    bash map.job

submits an array of 64 tasks and a task after it that gathers the parts into map.epiloom. A task that is killed or
requeued goes on from the points that it has stored; a part that is finished is skipped, so the same command after a
failure runs what is missing and no more. A file under the name of a part is always whole: it is written under another
name and renamed. The last task starts whatever became of the others, and names the parts that are missing.

Without Slurm, on any machines that see the same folder:

    for k in $(seq 64); do epiloom run map.rhai --part $k/64; done
    epiloom gather map.part-*-of-64.epiloom -o map.epiloom")]
pub struct Job {
    #[command(flatten)]
    script: ScriptArguments,
    /// Into how many parts every plan is divided
    #[arg(long, value_name = "N")]
    parts: NonZeroU64,
    /// The archive to gather the parts into [default: the script's name with .epiloom]
    #[arg(long, value_name = "FILE.epiloom")]
    out: Option<PathBuf>,
    /// Threads of a task
    #[arg(long, value_name = "N", default_value = "1")]
    threads: NonZeroU64,
    /// End the gathering with code 7 where a point of a sweep failed; the archive is whole all the same
    #[arg(long)]
    strict: bool,
    /// Longest time of a task, as Slurm takes it
    #[arg(long, value_name = "TIME")]
    time: Option<String>,
    /// Partition of the cluster
    #[arg(long, value_name = "NAME")]
    partition: Option<String>,
    /// Account that the time is charged to
    #[arg(long, value_name = "NAME")]
    account: Option<String>,
    /// Memory of a task, as Slurm takes it
    #[arg(long, value_name = "SIZE")]
    memory: Option<String>,
}

impl Job {
    /// Prints the script.
    pub fn run(&self, output: &mut Output) -> Exit {
        // a script that cannot be read is told now, not by every task
        if let Err(fault) = self.script.read() {
            output.diagnostic(&fault, None);
            return Exit::of(fault.code);
        }
        let program = std::env::current_exe().unwrap_or_else(|_| PathBuf::from("epiloom"));
        let folder = std::env::current_dir().unwrap_or_else(|_| PathBuf::from("."));
        let text = self.text(&program, &folder);
        output.result(&text);
        Exit::Done
    }

    fn text(&self, program: &Path, folder: &Path) -> String {
        let parts = self.parts.get();
        let digits = parts.to_string().len();
        let whole = self.out.clone().unwrap_or_else(|| default_archive(&self.script.script, None));
        let stem = default_archive(&self.script.script, Some(Share { number: 1, of: parts }));
        let stem = stem.to_string_lossy().into_owned();
        let (before, after) = stem.rsplit_once(&format!("{:0digits$}-of-", 1)).unwrap_or((&stem, ""));
        let after = format!("-of-{after}");
        let mut options = Vec::new();
        for (option, value) in [
            ("--time", &self.time),
            ("--partition", &self.partition),
            ("--account", &self.account),
            ("--mem", &self.memory),
        ] {
            if let Some(value) = value {
                options.push(quoted(&format!("{option}={value}")));
            }
        }
        let mut run = Vec::new();
        let mut reading = Vec::new();
        for (name, value) in &self.script.set {
            run.push(format!("--set {}", quoted(&format!("{name}={value}"))));
        }
        for each in &self.script.allow_read {
            reading.push(format!("--allow-read {}", quoted(&each.to_string_lossy())));
        }
        run.extend(reading.iter().cloned());
        // the script's folder, where gathering looks for its data files
        let data = match self.script.script.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent.to_string_lossy().into_owned(),
            _ => ".".to_string(),
        };
        let value = |mark: &str| match mark {
            "PARTS" => parts.to_string(),
            "DIGITS" => digits.to_string(),
            "THREADS" => self.threads.to_string(),
            "OPTIONS" => options.join(" "),
            "RUN" => run.join(" "),
            "READING" => reading.join(" "),
            "STRICT" => if self.strict { "--strict" } else { "" }.to_string(),
            "NAME" => quoted(&job_name(&self.script.script)),
            "LOG" => quoted(&log_name(before, digits, &after)),
            "GATHER_LOG" => quoted(&format!("{}.gather.log", patternless(before.trim_end_matches(".part-")))),
            "PROGRAM" => quoted(&program.to_string_lossy()),
            "FOLDER" => quoted(&folder.to_string_lossy()),
            "DATA" => quoted(&data),
            "SCRIPT" => quoted(&self.script.script.to_string_lossy()),
            "WHOLE" => quoted(&whole.to_string_lossy()),
            "BEFORE" => quoted(before),
            "AFTER" => quoted(&after),
            other => format!("§{other}§"),
        };
        TEMPLATE.lines().map(|line| filled(line, &value)).collect()
    }
}

/// A line of the template with its marks replaced: what stands between an odd and an even §. A value is never looked at
/// again.
fn filled(line: &str, value: &dyn Fn(&str) -> String) -> String {
    let pieces = line.split('§').enumerate();
    let text: String =
        pieces.map(|(at, piece)| if at % 2 == 0 { piece.to_string() } else { value(piece) }).collect();
    format!("{}\n", text.trim_end())
}

/// The job. Marks between two § are replaced by quoted values.
const TEMPLATE: &str = r#"#!/bin/bash
# The parts of a run of Epiloom on a cluster with Slurm, and the gathering of them. Start it with bash, not with sbatch:
# it submits itself, the parts that are missing as an array and the gathering after them. Starting it again is safe.
set -eu

epiloom=§PROGRAM§
folder=§FOLDER§
script=§SCRIPT§
whole=§WHOLE§
parts=§PARTS§
before=§BEFORE§
after=§AFTER§

cd "$folder"

# The archive of a part. A file of that name is always whole: it is written under another name and renamed.
part_file() { printf '%s%0§DIGITS§d%s' "$before" "$1" "$after"; }

case "${1:-submit}" in
submit)
    if [ -n "${SLURM_JOB_ID:-}" ]; then
        echo "start this with bash: it submits itself" >&2
        exit 2
    fi
    missing=
    for ((k = 1; k <= parts; k++)); do
        [ -e "$(part_file "$k")" ] || missing="$missing,$k"
    done
    depend=--open-mode=append
    if [ -n "$missing" ]; then
        # appended logs and requeueing: a task that was killed goes on from the points that it has stored
        job=$(sbatch --parsable --requeue --open-mode=append --array="${missing#,}" --job-name=§NAME§ \
            --ntasks=1 --cpus-per-task=§THREADS§ --output=§LOG§ §OPTIONS§ \
            "$0" part)
        job=${job%%;*}
        echo "job $job: the parts ${missing#,} of $parts"
        depend=--dependency=afterany:$job
    else
        echo "all $parts parts are there"
    fi
    # whatever became of the parts: what is missing is named
    job=$(sbatch --parsable --requeue --open-mode=append "$depend" --job-name=§NAME§ \
        --ntasks=1 --cpus-per-task=§THREADS§ --output=§GATHER_LOG§ §OPTIONS§ \
        "$0" gather)
    echo "job ${job%%;*}: gathers them into $whole"
    ;;
part)
    file=$(part_file "$SLURM_ARRAY_TASK_ID")
    if [ -e "$file" ]; then
        echo "$file is there already"
        exit 0
    fi
    exec "$epiloom" run "$script" --part "$SLURM_ARRAY_TASK_ID/$parts" --out "$file" --threads §THREADS§ §RUN§
    ;;
gather)
    set --
    for ((k = 1; k <= parts; k++)); do
        file=$(part_file "$k")
        if [ -e "$file" ]; then set -- "$@" "$file"; fi
    done
    if [ "$#" = 0 ]; then
        echo "none of the $parts parts is there" >&2
        exit 1
    fi
    exec "$epiloom" gather "$@" --out "$whole" --data §DATA§ --threads §THREADS§ §STRICT§ §READING§
    ;;
*)
    echo "unknown step: $1" >&2
    exit 2
    ;;
esac
"#;

/// `text` as one word for a shell.
fn quoted(text: &str) -> String {
    let plain = |c: char| c.is_ascii_alphanumeric() || "-_./=:,+%@".contains(c);
    if !text.is_empty() && text.chars().all(plain) {
        return text.to_string();
    }
    format!("'{}'", text.replace('\'', r"'\''"))
}

/// The name of the job: letters of the script's name that every scheduler takes.
fn job_name(script: &Path) -> String {
    let stem = script.file_stem().unwrap_or_default().to_string_lossy();
    let name: String =
        stem.chars().map(|c| if c.is_ascii_alphanumeric() || "-_.".contains(c) { c } else { '_' }).collect();
    if name.is_empty() { "epiloom".to_string() } else { name }
}

/// A name in which Slurm replaces nothing.
fn patternless(name: &str) -> String {
    // a backslash would switch off the marks of the whole name
    name.replace('%', "%%").replace('\\', "_")
}

/// The log of each task, in Slurm's own mark for its number.
fn log_name(before: &str, digits: usize, after: &str) -> String {
    let after = after.trim_end_matches(".epiloom");
    format!("{}%{digits}a{}.log", patternless(before), patternless(after))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn job(script: &str) -> Job {
        Job {
            script: ScriptArguments {
                script: PathBuf::from(script),
                set: vec![("base".to_string(), "2 um".to_string())],
                allow_read: Vec::new(),
            },
            parts: NonZeroU64::MIN.saturating_add(63),
            out: None,
            threads: NonZeroU64::MIN,
            strict: true,
            time: Some("1:00:00".to_string()),
            partition: None,
            account: Some("o'neil".to_string()),
            memory: None,
        }
    }

    /// Source of truth: the shell's rules of quoting: what stands between single quotes is taken as it is.
    #[test]
    fn values_become_single_words_of_a_shell() {
        assert_eq!(quoted("plain-1.rhai"), "plain-1.rhai");
        assert_eq!(quoted("two words"), "'two words'");
        assert_eq!(quoted("it's $HOME"), r"'it'\''s $HOME'");
        assert_eq!(quoted(""), "''");
        let text = job("a map's §SCRIPT§.rhai").text(Path::new("/opt/epi loom"), Path::new("/tmp"));
        assert!(text.contains(r"script='a map'\''s §SCRIPT§.rhai'"), "{text}");
        assert!(text.contains("epiloom='/opt/epi loom'") && text.contains("--set 'base=2 um'"), "{text}");
        assert!(text.contains("--time=1:00:00") && text.contains(r"'--account=o'\''neil'"), "{text}");
        assert!(!text.contains("--partition") && text.contains("afterany"), "{text}");
        assert!(text.contains("--threads 1 --strict"), "{text}");
    }
}
