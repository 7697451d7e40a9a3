//! The exit codes, in one table that `--help` prints.

use std::process::ExitCode;

use crate::diagnostics::{Code, codes};

/// How a command ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Exit {
    /// All was done.
    Done,
    /// The script has a fault, or something in it could not be solved.
    Fault,
    /// The command line is wrong.
    Usage,
    /// An archive is damaged, cut off, unfinished, foreign or newer.
    Archive,
    /// A replay gave other numbers.
    Differs,
    /// A file cannot be read or written.
    File,
    /// A fault of Epiloom itself.
    Internal,
    /// All was done, but points of a sweep failed, and whoever asked wants to know.
    PointsFailed,
    /// Stopped from the keyboard.
    Interrupted,
}

/// Code and meaning of every way to end.
pub const TABLE: &[(Exit, u8, &str)] = &[
    (Exit::Done, 0, "all was done"),
    (Exit::Fault, 1, "the script has a fault, or something in it could not be solved"),
    (Exit::Usage, 2, "the command line is wrong"),
    (
        Exit::Archive,
        3,
        "an archive is damaged, cut off, unfinished, foreign or newer; what is whole was shown; or parts make no whole",
    ),
    (
        Exit::Differs,
        4,
        "a replay gave other numbers, or archives that were compared differ beyond numerical error",
    ),
    (Exit::File, 5, "a file cannot be read or written"),
    (Exit::Internal, 6, "a fault of Epiloom itself"),
    (Exit::PointsFailed, 7, "with --strict: points of a sweep failed; the archive is whole all the same"),
    (Exit::Interrupted, 130, "stopped from the keyboard; what was finished is kept"),
];

impl Exit {
    /// The number that the shell sees.
    pub fn code(self) -> u8 {
        TABLE.iter().find(|(exit, ..)| *exit == self).map_or(6, |&(_, code, _)| code)
    }

    /// How a command ends that met this diagnostic outside a script.
    pub fn of(code: Code) -> Exit {
        match code {
            codes::UNREADABLE
            | codes::UNWRITABLE
            | codes::OTHER_ARCHIVE
            | codes::BUSY
            | codes::REPLAY_INPUT => Exit::File,
            codes::NOT_AN_ARCHIVE | codes::NEWER_ARCHIVE | codes::TORN_ARCHIVE | codes::DAMAGED_FRAME => {
                Exit::Archive
            }
            codes::UNKNOWN_SNAPSHOT
            | codes::NOT_EXPORTABLE
            | codes::NO_PICTURE
            | codes::UNKNOWN_CODE
            | codes::UNKNOWN_MATERIAL => Exit::Usage,
            codes::REPLAY_DIFFERS => Exit::Differs,
            codes::NOT_PARTS => Exit::Archive,
            codes::INTERRUPTED => Exit::Interrupted,
            codes::INTERNAL => Exit::Internal,
            _ => Exit::Fault,
        }
    }
}

impl From<Exit> for ExitCode {
    fn from(exit: Exit) -> ExitCode {
        ExitCode::from(exit.code())
    }
}

/// The table as `--help` prints it.
pub fn help() -> String {
    let rows: Vec<String> =
        TABLE.iter().map(|(_, code, meaning)| format!("  {code:>3}  {meaning}")).collect();
    format!(
        "Exit codes:\n{}\n\nResults go to standard output, everything else to standard error.",
        rows.join("\n")
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the table itself must cover every ending once, with codes a shell can tell apart.
    #[test]
    fn every_ending_has_its_own_code() {
        let all = [
            Exit::Done,
            Exit::Fault,
            Exit::Usage,
            Exit::Archive,
            Exit::Differs,
            Exit::File,
            Exit::Internal,
            Exit::PointsFailed,
            Exit::Interrupted,
        ];
        let codes: std::collections::BTreeSet<u8> = all.into_iter().map(Exit::code).collect();
        assert_eq!(codes.len(), all.len());
        assert_eq!(TABLE.len(), all.len());
    }
}
