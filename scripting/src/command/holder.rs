//! Who writes an archive: a small file beside the unfinished one, for whoever is refused.

use std::path::{Path, PathBuf};

use crate::archive::unfinished_path;

/// The file that names this run while it writes an archive; gone when this is dropped.
///
/// It is no lock: that is the operating system's, on the unfinished file itself, and ends with the process. A file that
/// a killed run has left is overwritten by the next one, and read only where the lock is held.
#[derive(Debug)]
pub struct Holder {
    path: PathBuf,
}

impl Holder {
    /// Names this process for the archive at `path`. Where that cannot be written, nothing is: the lock holds all the
    /// same.
    pub fn name(path: &Path) -> Holder {
        let path = beside(path);
        let text = format!("process {} on host {}\n", std::process::id(), host());
        // a full disk is told of by the archive's own writer
        let _ = std::fs::write(&path, text);
        Holder { path }
    }
}

impl Drop for Holder {
    fn drop(&mut self) {
        let _ = std::fs::remove_file(&self.path);
    }
}

/// Who writes the archive at `path`, as far as that is written beside it: `process 4711 on host n0`.
pub fn holder_of(path: &Path) -> Option<String> {
    let text = std::fs::read_to_string(beside(path)).ok()?;
    let line = text.lines().next()?.trim();
    (line.len() < 300 && line.starts_with("process ")).then(|| line.to_string())
}

fn beside(path: &Path) -> PathBuf {
    let mut name = unfinished_path(path).into_os_string();
    name.push(".holder");
    PathBuf::from(name)
}

/// The name of this machine.
fn host() -> String {
    let told = std::fs::read_to_string("/proc/sys/kernel/hostname").ok();
    let told = told.or_else(|| std::env::var("HOSTNAME").ok()).or_else(|| std::env::var("COMPUTERNAME").ok());
    told.map(|name| name.trim().to_string())
        .filter(|name| !name.is_empty())
        .unwrap_or_else(|| "unknown".to_string())
}
