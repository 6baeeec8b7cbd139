//! What the shell is told. "Mismatch found" and "the tool failed" never share a code.

use std::process::ExitCode;

/// One code a meaning.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Exit {
    /// Nothing wrong was seen; the report states the bound that this gives.
    Clear,
    /// Bad arguments.
    Usage,
    /// The job could not be done, or not all of it.
    CannotDo,
    /// A core is to be watched.
    Watch,
    /// A core is to be withdrawn.
    Withdraw,
}

impl Exit {
    /// The number.
    pub fn code(self) -> u8 {
        match self {
            Exit::Clear => 0,
            Exit::Usage => 2,
            Exit::CannotDo => 3,
            Exit::Watch => 10,
            Exit::Withdraw => 20,
        }
    }
}

impl From<Exit> for ExitCode {
    fn from(exit: Exit) -> ExitCode {
        ExitCode::from(exit.code())
    }
}
