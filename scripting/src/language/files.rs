//! The only way from a script to a file: reading, below the script's folder or a folder that the command line opened.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::Read;
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex};

use crate::diagnostics::codes;

use super::fault::Fault;
use super::session::{DataFile, RunOptions, Script};

/// The files that a script may read, and those it has read.
pub struct Files {
    folder: Option<PathBuf>,
    allowed: Vec<PathBuf>,
    given: BTreeMap<String, Arc<Vec<u8>>>,
    read: Mutex<BTreeMap<String, Arc<Vec<u8>>>>,
    limit: u64,
}

impl Files {
    /// The files open to a script.
    pub fn new(script: &Script, options: &RunOptions) -> Self {
        let folder = script.folder.as_ref().and_then(|f| f.canonicalize().ok());
        let mut allowed: Vec<PathBuf> =
            options.allow_read.iter().filter_map(|d| d.canonicalize().ok()).collect();
        allowed.extend(folder.clone());
        Files {
            folder,
            allowed,
            given: script.files.iter().map(|(name, bytes)| (name.clone(), Arc::new(bytes.clone()))).collect(),
            read: Mutex::new(BTreeMap::new()),
            limit: options.limits.file,
        }
    }

    /// The same files, none of them read yet.
    pub fn afresh(&self) -> Self {
        Files {
            folder: self.folder.clone(),
            allowed: self.allowed.clone(),
            given: self.given.clone(),
            read: Mutex::new(BTreeMap::new()),
            limit: self.limit,
        }
    }

    /// The bytes of a file by the name the script gives it, and whether this is the first reading.
    ///
    /// A file keeps, for the whole run, the bytes it had when it was first read.
    ///
    /// # Errors
    /// A fault that says whether the file lies outside, is missing, or is too large.
    pub fn read(&self, name: &str) -> Result<(DataFile, bool), Fault> {
        let key = name.replace('\\', "/");
        let mut read = self.read.lock().unwrap_or_else(|poisoned| poisoned.into_inner());
        if let Some(bytes) = read.get(&key) {
            return Ok((DataFile { name: key, bytes: Arc::clone(bytes) }, false));
        }
        let bytes = match self.given.get(&key) {
            Some(bytes) => Arc::clone(bytes),
            None if !self.given.is_empty() && self.folder.is_none() => {
                return Err(Fault::new(
                    codes::REPLAY_INPUT,
                    format!("the data file `{key}` is not in the archive"),
                ));
            }
            None => Arc::new(self.read_from_disk(&key)?),
        };
        read.insert(key.clone(), Arc::clone(&bytes));
        Ok((DataFile { name: key, bytes }, true))
    }

    fn read_from_disk(&self, name: &str) -> Result<Vec<u8>, Fault> {
        let outside = || {
            Fault::new(codes::OUTSIDE, format!("the file `{name}` lies outside the script's folder"))
                .help("put the file beside the script, or open its folder: --allow-read FOLDER")
        };
        let Some(folder) = &self.folder else { return Err(outside()) };
        let resolved = folder.join(name).canonicalize();
        let path = match resolved {
            Ok(path) => path,
            // whether a file outside exists is nobody's business
            Err(_) if !self.inside_lexically(folder, name) => return Err(outside()),
            Err(error) => return Err(unreadable(name, &error.to_string())),
        };
        if !self.allowed.iter().any(|dir| path.starts_with(dir)) {
            return Err(outside());
        }
        let mut file = File::open(&path).map_err(|e| unreadable(name, &e.to_string()))?;
        let metadata = file.metadata().map_err(|e| unreadable(name, &e.to_string()))?;
        if !metadata.is_file() {
            return Err(unreadable(name, "it is no regular file"));
        }
        let mut bytes = Vec::new();
        (&mut file)
            .take(self.limit + 1)
            .read_to_end(&mut bytes)
            .map_err(|e| unreadable(name, &e.to_string()))?;
        if bytes.len() as u64 > self.limit {
            return Err(Fault::new(
                codes::TOO_LARGE,
                format!("the file `{name}` is larger than {} MB", self.limit >> 20),
            ));
        }
        Ok(bytes)
    }

    /// Whether a name that does not resolve would lie below an open folder, by its words alone.
    fn inside_lexically(&self, folder: &Path, name: &str) -> bool {
        use std::path::Component;
        let mut path = folder.to_path_buf();
        for part in Path::new(name).components() {
            match part {
                Component::ParentDir => {
                    path.pop();
                }
                Component::RootDir | Component::Prefix(_) => path = PathBuf::from(part.as_os_str()),
                Component::CurDir => {}
                Component::Normal(word) => path.push(word),
            }
        }
        self.allowed.iter().any(|dir| path.starts_with(dir))
    }
}

fn unreadable(name: &str, why: &str) -> Fault {
    Fault::new(codes::UNREADABLE, format!("the file `{name}` cannot be read: {}", why.to_lowercase()))
}
