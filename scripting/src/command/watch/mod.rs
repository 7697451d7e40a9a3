//! `epiloom watch`: the report of a run that is not over, on this machine only, renewed as points land.

mod http;

use std::fs::File;
use std::net::{Ipv4Addr, TcpListener};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, AtomicU64, AtomicUsize, Ordering};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

use crate::archive::{Archive, unfinished_path};
use crate::diagnostics::{Diagnostic, codes};
use crate::picture::report::{Contents, Options, page};

use super::exit::Exit;
use super::output::Output;
use super::report_page::file_name;

/// How often the run is looked at.
const LOOK: Duration = Duration::from_millis(200);

/// How long a browser has, after the end of the run, to come for the last state; it asks once a second.
const LAST_CALL: Duration = Duration::from_secs(4);

/// Making pages takes at most one part in so many of the time, so that the run keeps its cores.
const SPARING: u32 = 10;

/// How long an answer that is on its way then is waited for.
const LAST_ANSWER: Duration = Duration::from_secs(60);

/// `epiloom watch FILE`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
Prints an address on this machine, 127.0.0.1, that shows the report of the run so far and renews itself as snapshots
and points are stored. Nobody else can reach it, and it answers to no other name. It ends with the run.")]
pub struct Watch {
    /// The archive that a run is writing: FILE.epiloom, or FILE.epiloom.unfinished
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The port to serve at [default: a free one]
    #[arg(long, value_name = "N", default_value_t = 0, hide_default_value = true)]
    pub port: u16,
}

/// The page as it was made last, and what it was made from.
#[derive(Debug, Default)]
struct Made {
    version: u64,
    html: Arc<str>,
    policy: Arc<str>,
    /// When it was made, and how long that took.
    at: Option<(Instant, Duration)>,
}

/// What the server and the watching loop share.
#[derive(Debug)]
struct Watched {
    finished: PathBuf,
    unfinished: PathBuf,
    running: AtomicBool,
    /// Grows with the file.
    version: AtomicU64,
    /// The last version that a browser has fetched, plus one.
    fetched: AtomicU64,
    /// Whether any browser has come.
    visited: AtomicBool,
    made: Mutex<Made>,
}

impl Watch {
    /// Serves the page until the run ends.
    pub fn run(&self, output: &mut Output) -> Exit {
        match self.watch(output) {
            Ok(exit) => exit,
            Err(fault) => {
                output.diagnostic(&fault, None);
                Exit::of(fault.code)
            }
        }
    }

    fn watch(&self, output: &mut Output) -> Result<Exit, Box<Diagnostic>> {
        let (finished, unfinished) = paths(&self.file);
        let held = File::open(&unfinished).ok().filter(|file| !is_over(file));
        let Some(held) = held else { return Err(Box::new(nobody(&finished, &unfinished))) };
        let refused = |error: std::io::Error| {
            let words = format!("127.0.0.1, port {}, cannot be served: {error}", self.port);
            Box::new(Diagnostic::new(codes::UNWRITABLE, words).help("leave out --port for a free one"))
        };
        let listener = TcpListener::bind((Ipv4Addr::LOCALHOST, self.port)).map_err(refused)?;
        let port = listener.local_addr().map_err(refused)?.port();
        let watched = Arc::new(Watched {
            finished,
            unfinished,
            running: AtomicBool::new(true),
            version: AtomicU64::new(1),
            fetched: AtomicU64::new(0),
            visited: AtomicBool::new(false),
            made: Mutex::new(Made::default()),
        });
        let site = Arc::clone(&watched);
        let busy = Arc::new(AtomicUsize::new(0));
        let answers = Arc::clone(&busy);
        // ends with the process
        std::thread::spawn(move || http::serve(&listener, port, &answers, &move |path| site.answer(path)));
        output.result(&format!("http://127.0.0.1:{port}/\n"));
        let mut length = 0;
        while !is_over(&held) {
            let now = held.metadata().map_or(0, |about| about.len());
            if now != length {
                length = now;
                watched.version.fetch_add(1, Ordering::SeqCst);
            }
            std::thread::sleep(LOOK);
        }
        watched.version.fetch_add(1, Ordering::SeqCst);
        watched.running.store(false, Ordering::SeqCst);
        watched.last_call(&busy);
        if Archive::open(&watched.finished).is_ok_and(|archive| archive.is_finished()) {
            output.remark(&format!("the run has ended: {}", watched.finished.display()));
            return Ok(Exit::Done);
        }
        output.remark(&format!(
            "the run has stopped before its end; what was finished is in {}",
            watched.unfinished.display()
        ));
        Ok(Exit::Archive)
    }
}

impl Watched {
    /// What is at a path of the site.
    fn answer(&self, path: &str) -> Option<http::Answer> {
        self.visited.store(true, Ordering::SeqCst);
        match path {
            "/" => {
                let version = self.version.load(Ordering::SeqCst);
                let mut made = self.made.lock().unwrap_or_else(PoisonError::into_inner);
                if made.version != version {
                    *made = self.make(version);
                }
                self.fetched.store(version + 1, Ordering::SeqCst);
                Some(http::Answer::page(&made.html, &made.policy))
            }
            "/state" => {
                // whether it runs is read first: a version read after the end is the last one
                let running = self.running.load(Ordering::SeqCst);
                let newest = self.version.load(Ordering::SeqCst);
                let made = self.made.lock().unwrap_or_else(PoisonError::into_inner);
                let rests = made.at.is_some_and(|(at, took)| at.elapsed() < took * SPARING);
                let version = if running && rests { made.version } else { newest };
                Some(http::Answer::json(format!("{{\"version\":{version},\"running\":{running}}}")))
            }
            _ => None,
        }
    }

    /// The page of what the file holds now; a file that is being moved is looked for once more.
    fn make(&self, version: u64) -> Made {
        let begun = Instant::now();
        let look = || {
            let running = self.running.load(Ordering::SeqCst);
            let both = [&self.finished, &self.unfinished];
            let order: &[&PathBuf] = if running { &both[1..] } else { &both };
            order.iter().find_map(|path| Archive::open(path).ok())
        };
        let contents = look().or_else(look).map_or_else(Contents::default, |archive| {
            let mut contents = Contents::of(&archive, &file_name(&self.finished));
            if self.running.load(Ordering::SeqCst) {
                // the frame that is being written is no damage
                contents.troubles.clear();
            }
            contents
        });
        let made = page(&contents, Options { watching: true, version, ..Options::default() });
        Made {
            version,
            html: made.html.into(),
            policy: made.policy.into(),
            at: Some((Instant::now(), begun.elapsed())),
        }
    }

    /// Waits until a browser that has come has the last state, or has had time to ask for it.
    fn last_call(&self, busy: &AtomicUsize) {
        let ended = Instant::now();
        let last = self.version.load(Ordering::SeqCst) + 1;
        while self.visited.load(Ordering::SeqCst) {
            std::thread::sleep(LOOK);
            let has_it = self.fetched.load(Ordering::SeqCst) == last || ended.elapsed() > LAST_CALL;
            let sent = busy.load(Ordering::SeqCst) == 0 || ended.elapsed() > LAST_ANSWER;
            if has_it && sent {
                return;
            }
        }
    }
}

/// The finished and the unfinished name of an archive, whichever was given.
fn paths(file: &Path) -> (PathBuf, PathBuf) {
    let text = file.to_string_lossy();
    match text.strip_suffix(".unfinished") {
        Some(finished) => (PathBuf::from(finished), file.to_path_buf()),
        None => (file.to_path_buf(), unfinished_path(file)),
    }
}

/// Whether the run that wrote this file has let it go: a run holds the file locked as long as it lives.
fn is_over(file: &File) -> bool {
    let free = file.try_lock_shared().is_ok();
    if free {
        // an error here leaves the lock to the end of this process, which is near
        let _ = file.unlock();
    }
    free
}

fn nobody(finished: &Path, unfinished: &Path) -> Diagnostic {
    let shown = finished.display();
    let fault = Diagnostic::new(codes::UNREADABLE, format!("no run is writing `{shown}`"));
    if finished.exists() {
        fault.help(format!("the run has ended: `epiloom report {shown} -o report.html` writes its page"))
    } else if unfinished.exists() {
        let left = unfinished.display();
        fault.help(format!(
            "a run has stopped there: `epiloom report {left} -o report.html` shows what it finished"
        ))
    } else {
        fault.help(format!("start one first: `epiloom run SCRIPT --out {shown}`"))
    }
}
