//! Epiloom: the script language, the archive, pictures and the command line.

pub mod archive;
pub mod command;
pub mod diagnostics;
pub mod figure_text;
pub mod language;
pub mod picture;
pub mod record_text;
