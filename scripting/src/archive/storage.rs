//! The file operations that the archive needs, behind a trait so that tests can make them fail.
//!
//! What the writer counts on: after `sync` returned, the bytes of the file survive a power cut; a
//! rename replaces the target whole or not at all; after `sync_folder` the rename survives too.
//! What it does not count on: anything about bytes written since the last `sync`.

use std::fmt::Debug;
use std::fs::{File, OpenOptions, TryLockError};
use std::io::{self, Read, Seek, SeekFrom, Write};
use std::path::Path;

/// How a file is opened for writing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Opening {
    /// As it is; made when it does not exist.
    AsItIs,
    /// It must not exist yet.
    New,
    /// Emptied; made when it does not exist.
    Emptied,
}

/// A folder's worth of files.
pub trait Storage: Debug + Send + Sync {
    /// Opens a file for reading and writing.
    fn open(&self, path: &Path, opening: Opening) -> io::Result<Box<dyn StoredFile>>;
    /// Whether a file of that name exists.
    fn exists(&self, path: &Path) -> io::Result<bool>;
    /// Renames a file, replacing the target.
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()>;
    /// Removes a file.
    fn remove(&self, path: &Path) -> io::Result<()>;
    /// Makes renames and new names in the folder of that file durable.
    fn sync_folder(&self, file: &Path) -> io::Result<()>;
}

/// One open file.
pub trait StoredFile: Debug + Send {
    /// Its length in bytes.
    fn length(&mut self) -> io::Result<u64>;
    /// Fills the buffer from that place.
    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> io::Result<()>;
    /// Writes all bytes at that place.
    fn write_at(&mut self, offset: u64, bytes: &[u8]) -> io::Result<()>;
    /// Cuts the file to that length.
    fn cut(&mut self, length: u64) -> io::Result<()>;
    /// Makes what was written durable.
    fn sync(&mut self) -> io::Result<()>;
    /// Takes the exclusive lock, held until the file is dropped; false when another holds it.
    fn try_lock(&mut self) -> io::Result<bool>;
    /// Whether the file still stands under that name.
    fn stands_at(&mut self, path: &Path) -> io::Result<bool>;
}

/// The file system of the machine.
#[derive(Clone, Copy, Debug, Default)]
pub struct Disk;

impl Storage for Disk {
    fn open(&self, path: &Path, opening: Opening) -> io::Result<Box<dyn StoredFile>> {
        let mut options = OpenOptions::new();
        options.read(true).write(true);
        match opening {
            Opening::AsItIs => options.create(true).truncate(false),
            Opening::New => options.create_new(true),
            Opening::Emptied => options.create(true).truncate(true),
        };
        Ok(Box::new(DiskFile(options.open(path)?)))
    }

    fn exists(&self, path: &Path) -> io::Result<bool> {
        path.try_exists()
    }

    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        std::fs::rename(from, to)
    }

    fn remove(&self, path: &Path) -> io::Result<()> {
        std::fs::remove_file(path)
    }

    #[cfg(unix)]
    fn sync_folder(&self, file: &Path) -> io::Result<()> {
        let folder = match file.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent,
            _ => Path::new("."),
        };
        File::open(folder)?.sync_all()
    }

    // Elsewhere a folder cannot be opened as a file; the rename itself is as durable as it gets.
    #[cfg(not(unix))]
    fn sync_folder(&self, _file: &Path) -> io::Result<()> {
        Ok(())
    }
}

#[derive(Debug)]
struct DiskFile(File);

impl StoredFile for DiskFile {
    fn length(&mut self) -> io::Result<u64> {
        Ok(self.0.metadata()?.len())
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> io::Result<()> {
        self.0.seek(SeekFrom::Start(offset))?;
        self.0.read_exact(buffer)
    }

    fn write_at(&mut self, offset: u64, bytes: &[u8]) -> io::Result<()> {
        self.0.seek(SeekFrom::Start(offset))?;
        self.0.write_all(bytes)
    }

    fn cut(&mut self, length: u64) -> io::Result<()> {
        self.0.set_len(length)
    }

    fn sync(&mut self) -> io::Result<()> {
        self.0.sync_all()
    }

    fn try_lock(&mut self) -> io::Result<bool> {
        match self.0.try_lock() {
            Ok(()) => Ok(true),
            Err(TryLockError::WouldBlock) => Ok(false),
            Err(TryLockError::Error(error)) => Err(error),
        }
    }

    #[cfg(unix)]
    fn stands_at(&mut self, path: &Path) -> io::Result<bool> {
        use std::os::unix::fs::MetadataExt;
        let own = self.0.metadata()?;
        match std::fs::metadata(path) {
            Ok(there) => Ok(own.dev() == there.dev() && own.ino() == there.ino()),
            Err(error) if error.kind() == io::ErrorKind::NotFound => Ok(false),
            Err(error) => Err(error),
        }
    }

    // Elsewhere an open, locked file cannot be renamed or removed by another process.
    #[cfg(not(unix))]
    fn stands_at(&mut self, _path: &Path) -> io::Result<bool> {
        Ok(true)
    }
}
