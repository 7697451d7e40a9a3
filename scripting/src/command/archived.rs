//! The script of an archive, ready to run again.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use crate::archive::RunHeader;
use crate::diagnostics::{Diagnostic, codes};
use crate::language::Script;

use super::inputs;

/// The script that an archive holds, with its data files as they were, by their digests: from `data`, or from the folder
/// of the archive, or from folders that were opened.
///
/// # Errors
/// A data file that is not there or has changed.
pub fn archived_script(
    run: &RunHeader,
    data: Option<&Path>,
    archive: &Path,
    allow_read: &[PathBuf],
) -> Result<Script, Box<Diagnostic>> {
    let folder = match (data, archive.parent()) {
        (Some(folder), _) => folder,
        (None, Some(parent)) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    };
    let mut files = BTreeMap::new();
    for (name, recorded) in &run.data_files {
        let fault = |why: &str| {
            Diagnostic::new(codes::REPLAY_INPUT, format!("the data file `{name}` {why}")).help(
                "give the script's folder, --data DIR, and other folders it was given, --allow-read DIR",
            )
        };
        let path =
            inside(folder, allow_read, name).ok_or_else(|| fault("is not in the folder of data files"))?;
        let length = path.metadata().map(|m| m.len()).ok();
        if length != Some(recorded.length) {
            return Err(Box::new(fault("is not as long as it was")));
        }
        let bytes = std::fs::read(&path).map_err(|e| fault(&format!("cannot be read: {e}")))?;
        if blake3::hash(&bytes).to_hex().as_str() != recorded.blake3 {
            return Err(Box::new(fault("has changed since the archive was written")));
        }
        files.insert(name.clone(), bytes);
    }
    Ok(Script { name: run.script_name.clone(), text: run.script_text.clone(), folder: None, files })
}

/// The inputs that were set from outside the script, as `--set` takes them.
pub fn overrides(run: &RunHeader) -> Vec<(String, String)> {
    let set = run.inputs.iter().filter(|(_, input)| input.overridden);
    set.map(|(name, input)| (name.clone(), inputs::typed(&input.used))).collect()
}

/// The regular file of this name, below the folder or one that was opened; an archive from elsewhere reaches no other.
fn inside(folder: &Path, allowed: &[PathBuf], name: &str) -> Option<PathBuf> {
    let path = folder.join(name).canonicalize().ok()?;
    let open = |folder: &Path| folder.canonicalize().is_ok_and(|folder| path.starts_with(folder));
    let found = open(folder) || allowed.iter().any(|folder| open(folder));
    (found && path.is_file()).then_some(path)
}
