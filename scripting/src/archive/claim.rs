//! Taking hold of an unfinished file: its lock, and what an earlier run has left in it.

use std::ffi::OsString;
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use super::error::ArchiveError;
use super::reader::{Archive, Source};
use super::storage::{Opening, Storage, StoredFile};

/// The locked unfinished file, which the writer and those who read what an earlier run has left share.
#[derive(Clone, Debug)]
pub(crate) struct Held(Arc<Mutex<Box<dyn StoredFile>>>);

impl Held {
    /// The file. It has no state but its position, which every call sets anew.
    pub(crate) fn file(&self) -> MutexGuard<'_, Box<dyn StoredFile>> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// The file as it is now, to be read from.
    pub(crate) fn source(&self) -> std::io::Result<Box<dyn Source>> {
        let length = self.file().length()?;
        Ok(Box::new(HeldSource { held: self.clone(), length }))
    }
}

#[derive(Debug)]
struct HeldSource {
    held: Held,
    length: u64,
}

impl Source for HeldSource {
    fn length(&self) -> u64 {
        self.length
    }

    fn read_at(&self, offset: u64, buffer: &mut [u8]) -> std::io::Result<()> {
        self.held.file().read_at(offset, buffer)
    }
}

/// What stands in an unfinished file that was just locked.
pub(crate) enum Left {
    /// Nothing that anybody stored.
    Nothing,
    /// What an earlier run has stored.
    Archive(Box<Archive>),
    /// Something that cannot be read as an archive, and why.
    Other(String),
}

pub(crate) fn with_suffix(path: &Path, suffix: &str) -> PathBuf {
    let mut name: OsString = path.as_os_str().to_owned();
    name.push(suffix);
    PathBuf::from(name)
}

/// Opens and locks the unfinished file, and looks what is in it.
pub(crate) fn claim(storage: &dyn Storage, unfinished: &Path) -> Result<(Held, Left), ArchiveError> {
    let failed = |action, source| ArchiveError::Io { action, path: unfinished.to_owned(), source };
    // Each turn either claims the file, or finds that another run has just set it aside or finished it.
    for _ in 0..100 {
        let mut file = storage.open(unfinished, Opening::AsItIs).map_err(|source| failed("open", source))?;
        if !file.try_lock().map_err(|source| failed("lock", source))? {
            return Err(ArchiveError::HeldByAnotherRun { path: unfinished.to_owned() });
        }
        if !file.stands_at(unfinished).map_err(|source| failed("open", source))? {
            continue;
        }
        let held = Held(Arc::new(Mutex::new(file)));
        let left = left_in(&held, unfinished)?;
        return Ok((held, left));
    }
    Err(ArchiveError::HeldByAnotherRun { path: unfinished.to_owned() })
}

fn left_in(held: &Held, unfinished: &Path) -> Result<Left, ArchiveError> {
    let failed = |source| ArchiveError::Io { action: "read", path: unfinished.to_owned(), source };
    let source = held.source().map_err(failed)?;
    if source.length() == 0 {
        return Ok(Left::Nothing);
    }
    Ok(match Archive::from_source(source, unfinished) {
        Ok(archive) => {
            let points = archive.sweeps().iter().any(|sweep| sweep.count() > 0);
            if archive.entries().is_empty() && !points && !archive.is_damaged() {
                Left::Nothing
            } else {
                Left::Archive(Box::new(archive))
            }
        }
        // Neither ours nor readable: somebody's file, kept. A torn first frame holds nothing.
        Err(ArchiveError::NoWholeFrame { .. }) => Left::Nothing,
        Err(error @ ArchiveError::Io { .. }) => return Err(error),
        Err(error) => Left::Other(error.to_string()),
    })
}

/// Renames the unfinished file to a name that is free.
pub(crate) fn set_aside(storage: &dyn Storage, unfinished: &Path) -> Result<PathBuf, ArchiveError> {
    let aside = free_name(storage, unfinished)?;
    storage.rename(unfinished, &aside).map_err(|source| ArchiveError::Io {
        action: "set aside",
        path: unfinished.to_owned(),
        source,
    })?;
    Ok(aside)
}

fn free_name(storage: &dyn Storage, unfinished: &Path) -> Result<PathBuf, ArchiveError> {
    let mut number = 1_u32;
    loop {
        let aside = with_suffix(unfinished, &format!("-{number}"));
        let taken = storage.exists(&aside).map_err(|source| ArchiveError::Io {
            action: "look for",
            path: aside.clone(),
            source,
        })?;
        match number.checked_add(1) {
            Some(next) if taken => number = next,
            _ => return Ok(aside),
        }
    }
}
