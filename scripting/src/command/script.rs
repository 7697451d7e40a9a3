//! Reading the script that a verb is given.

use std::path::{Path, PathBuf};

use crate::diagnostics::{Diagnostic, SourceText, codes};
use crate::language::{RunOptions, Script};

/// Bytes of the largest script that is read.
const LARGEST: u64 = 8 << 20;

/// What the verbs that take a script have in common.
#[derive(clap::Args, Debug)]
pub struct ScriptArguments {
    /// The script, a .rhai file
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub script: PathBuf,
    /// Override an input of the script; the value is a number and its unit, `bsf_thickness=50nm`
    #[arg(long = "set", value_name = "NAME=VALUE", value_parser = name_and_value)]
    pub set: Vec<(String, String)>,
    /// Let the script read data files below this folder too (its own folder is always open)
    #[arg(long, value_name = "DIR", value_hint = clap::ValueHint::DirPath)]
    pub allow_read: Vec<PathBuf>,
}

fn name_and_value(text: &str) -> Result<(String, String), String> {
    match text.split_once('=') {
        Some((name, value)) if !name.trim().is_empty() && !value.trim().is_empty() => {
            Ok((name.trim().to_string(), value.trim().to_string()))
        }
        _ => Err("expected NAME=VALUE, such as bsf_thickness=50nm".to_string()),
    }
}

impl ScriptArguments {
    /// The script, ready to run.
    ///
    /// # Errors
    /// A file that cannot be read, is too large, or is not text in UTF-8.
    pub fn read(&self) -> Result<Script, Diagnostic> {
        let name = self.script.file_name().map_or_else(String::new, |n| n.to_string_lossy().into_owned());
        let folder = match self.script.parent() {
            Some(parent) if parent.as_os_str().is_empty() => PathBuf::from("."),
            Some(parent) => parent.to_path_buf(),
            None => PathBuf::from("."),
        };
        Ok(Script { name, text: read_text(&self.script)?, folder: Some(folder), files: Default::default() })
    }

    /// How it is run.
    pub fn options(&self) -> RunOptions {
        RunOptions { set: self.set.clone(), allow_read: self.allow_read.clone(), ..RunOptions::default() }
    }

    /// The script's text under the name a person gave it, for messages.
    pub fn source(&self, script: &Script) -> SourceText {
        SourceText::new(self.script.display().to_string(), script.text.clone())
    }
}

fn read_text(path: &Path) -> Result<String, Diagnostic> {
    let shown = path.display();
    let unreadable = |why: String| {
        Diagnostic::new(codes::UNREADABLE, format!("the script `{shown}` cannot be read: {why}"))
    };
    let metadata = std::fs::metadata(path).map_err(|e| unreadable(e.to_string()))?;
    if !metadata.is_file() {
        return Err(unreadable("it is no file".to_string()));
    }
    if metadata.len() > LARGEST {
        return Err(unreadable(format!("it is larger than {} MB", LARGEST >> 20)));
    }
    let bytes = std::fs::read(path).map_err(|e| unreadable(e.to_string()))?;
    String::from_utf8(bytes).map_err(|error| {
        let valid = &error.as_bytes()[..error.utf8_error().valid_up_to()];
        let line = valid.iter().filter(|b| **b == b'\n').count() + 1;
        unreadable(format!("line {line} is not text in UTF-8"))
            .help("save it as UTF-8, or check that it is a script")
    })
}
