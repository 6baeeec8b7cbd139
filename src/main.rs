//! The command `proofhouse`.

use std::process::ExitCode;
use std::time::Instant;

fn main() -> ExitCode {
    proofhouse::cli::run(Instant::now())
}
