//! The one place where what went wrong becomes a line for people and a code for the shell.

use crate::exit_code::Exit;

/// Why a command ends without a result. Messages are lower-case fragments that name the place and the remedy.
#[derive(Debug, thiserror::Error)]
pub enum Error {
    /// The arguments make no sense.
    #[error("{0}")]
    Usage(String),
    /// The arguments make sense, but the job cannot be done.
    #[error("{0}")]
    CannotDo(String),
}

impl Error {
    /// The code for the shell.
    pub fn exit(&self) -> Exit {
        match self {
            Error::Usage(_) => Exit::Usage,
            Error::CannotDo(_) => Exit::CannotDo,
        }
    }
}
