//! The command line: arguments and wiring, one file a command.

mod args;
mod bench;
mod common;
mod coverage;
mod drill;
mod explain;
mod ledger;
mod lists;
mod live;
mod quantity;
mod reckon;
mod rises;
mod sample;
mod survey;
mod when;
mod window;

use std::io::Write;
use std::process::ExitCode;
use std::time::Instant;

use clap::Parser;

use crate::error::Error;
use crate::exit_code::Exit;
use crate::run::protocol::WorkerArgs;
use crate::run::worker;
use args::{Cli, Command, LedgerCommand};

/// Runs the program. `start` is when it was started: a budget begins there.
pub fn run(start: Instant) -> ExitCode {
    std::panic::set_hook(Box::new(|what| {
        let place = what.location().map_or("an unknown place".to_owned(), |l| format!("{}:{}", l.file(), l.line()));
        let text = what.payload_as_str().unwrap_or("no message");
        complain(&format!("internal error at {place}: {text}; what was synced to the ledger is kept"));
    }));
    std::panic::catch_unwind(|| command(start)).unwrap_or_else(|_| Exit::CannotDo.into())
}

fn command(start: Instant) -> ExitCode {
    let cli = match Cli::try_parse() {
        Ok(cli) => cli,
        Err(error) => return refused(&error),
    };
    let result = match cli.command {
        Command::Worker { cpu, node } => return worker::main(WorkerArgs { cpu: args::worker_cpu(cpu), node }),
        Command::Survey(args) => survey::run(&args),
        Command::Window(args) => window::run(&args, start),
        Command::Drill(args) => drill::run(&args, start),
        Command::Reckon(command) => reckon::run(&command),
        Command::Ledger(LedgerCommand::Show(args)) => ledger::show(&args),
        Command::Ledger(LedgerCommand::Verify(args)) => ledger::verify(&args),
        Command::Ledger(LedgerCommand::Coverage(args)) => coverage::run(&args),
    };
    match result {
        Ok(exit) => exit.into(),
        Err(error) => {
            complain(&error.to_string());
            error.exit().into()
        }
    }
}

/// One line on standard error.
fn complain(text: &str) {
    let line = crate::report::text::printable(&text.replace('\n', " "));
    // nobody is left to tell when standard error is closed
    let _ = writeln!(std::io::stderr(), "proofhouse: {line}");
}

/// Help and version as clap prints them; errors as one line.
fn refused(error: &clap::Error) -> ExitCode {
    if !error.use_stderr() {
        let _ = error.print();
        return ExitCode::SUCCESS;
    }
    if error.kind() == clap::error::ErrorKind::DisplayHelpOnMissingArgumentOrSubcommand {
        let _ = error.print();
        return Exit::Usage.into();
    }
    let rendered = error.to_string();
    let parts: Vec<&str> = rendered
        .lines()
        .map(str::trim)
        .filter(|l| !l.is_empty() && !l.starts_with("Usage:") && !l.starts_with("For more information"))
        .collect();
    let text = parts.join(" ");
    complain(&format!("{}; see --help", text.strip_prefix("error: ").unwrap_or(&text)));
    Exit::Usage.into()
}

/// A result on standard output. A reader that went away is no error of ours.
fn say(text: &str) -> Result<(), Error> {
    let mut out = std::io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(why) if why.kind() != std::io::ErrorKind::BrokenPipe => {
            Err(Error::CannotDo(format!("the result cannot be written to standard output: {why}")))
        }
        _ => Ok(()),
    }
}

/// A document on standard output.
fn say_json(document: &impl serde::Serialize) -> Result<(), Error> {
    let mut text = serde_json::to_string_pretty(document)
        .map_err(|why| Error::CannotDo(format!("the result cannot be made a JSON document: {why}")))?;
    text.push('\n');
    say(&text)
}
