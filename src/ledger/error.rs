//! What can go wrong with a ledger, each with its place and a remedy, on one line.

use std::io;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::ledger::condition::{Because, Condition};
use crate::ledger::names;

/// An error of the ledger. Cheap to clone: a journal that failed gives the same error for ever after.
#[derive(Clone, Debug, thiserror::Error)]
pub enum Error {
    /// The path, or something on the way to it, is not a folder.
    #[error("{path} is not a folder: a ledger is a folder, give the path of one")]
    NotAFolder {
        /// The path.
        path: PathBuf,
    },
    /// Nothing there to read.
    #[error("{path} holds no ledger: give the folder that a job wrote its ledger to")]
    NoLedger {
        /// The path.
        path: PathBuf,
    },
    /// The file system is mounted read-only.
    #[error("cannot {doing} {path}: the file system is read-only; give a folder on one that can be written")]
    ReadOnly {
        /// The path.
        path: PathBuf,
        /// What was being done.
        doing: &'static str,
    },
    /// The operating system refuses.
    #[error("cannot {doing} {path}: permission denied; give a folder that this user may write to, or change its owner")]
    Forbidden {
        /// The path.
        path: PathBuf,
        /// What was being done.
        doing: &'static str,
    },
    /// A folder of another program.
    #[error("{path} is not a ledger and not empty ({found}): nothing was written; give a new or empty folder")]
    Foreign {
        /// The path.
        path: PathBuf,
        /// What is in it.
        found: String,
    },
    /// No space or quota left.
    #[error("cannot {doing} {path}: no space is left; free some and start again, what was synced is kept")]
    Full {
        /// The path.
        path: PathBuf,
        /// What was being done.
        doing: &'static str,
    },
    /// Another writer has it.
    #[error("{path} is being written by another process: wait for it to end, or give this job a folder of its own")]
    Locked {
        /// The path.
        path: PathBuf,
    },
    /// Written by a later version.
    #[error("{path} is {found}, this program knows {known}: use the version that wrote it, or a new folder", known = names::SCHEMA)]
    Newer {
        /// The path.
        path: PathBuf,
        /// Its version.
        found: String,
    },
    /// The chain does not hold; nothing may be appended to it.
    #[error(
        "{path} is {condition}; nothing is appended to it: see `ledger verify`, then go on in a new folder or let \
         `ledger salvage` write what can be read to one"
    )]
    Broken {
        /// The path.
        path: PathBuf,
        /// Where and why.
        condition: Box<Condition>,
    },
    /// An event that would not come back as it went in. Nothing was written, the journal goes on.
    #[error(
        "a {kind} record cannot be written to {path}: {because}; this is a fault of the program or of the core it runs on"
    )]
    Unrecordable {
        /// The path.
        path: PathBuf,
        /// Kind of the event.
        kind: &'static str,
        /// What happens to it.
        because: String,
    },
    /// Anything else that the operating system says.
    #[error("cannot {doing} {path}: {source}")]
    Io {
        /// The path.
        path: PathBuf,
        /// What was being done.
        doing: &'static str,
        /// The operating system's words.
        source: Arc<io::Error>,
    },
}

impl Error {
    /// Sorts an error of the operating system into those that have a remedy of their own.
    pub fn io(path: &Path, doing: &'static str, source: io::Error) -> Error {
        let path = path.to_path_buf();
        match source.kind() {
            io::ErrorKind::NotADirectory => Error::NotAFolder { path },
            io::ErrorKind::ReadOnlyFilesystem => Error::ReadOnly { path, doing },
            io::ErrorKind::PermissionDenied => Error::Forbidden { path, doing },
            io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded => Error::Full { path, doing },
            _ => Error::Io { path, doing, source: Arc::new(source) },
        }
    }

    /// Why a ledger in this condition may not be appended to; `None` if it may.
    pub fn refusing(path: &Path, condition: &Condition) -> Option<Error> {
        match condition {
            Condition::Clean | Condition::TornTail { .. } => None,
            Condition::Broken { because: Because::Version(found), .. } => {
                Some(Error::Newer { path: path.to_path_buf(), found: format!("of line version {found}") })
            }
            broken => Some(Error::Broken { path: path.to_path_buf(), condition: Box::new(broken.clone()) }),
        }
    }
}
