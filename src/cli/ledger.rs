//! `ledger show` and `ledger verify`.

use super::args::{Format, LedgerArgs};
use super::{common, say, say_json};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::ledger::{self, Condition, Scope, Tally};
use crate::report::ledger::{Shown, Verified};

/// Sums, exposure and bounds. A broken ledger is shown as far as it can be relied on, and the exit says so.
pub fn show(args: &LedgerArgs) -> Result<Exit, Error> {
    let path = common::ledger_path(&args.place);
    let (tally, summary) = Tally::read(&path, Scope::default()).map_err(common::cannot)?;
    let gap_ms = u64::try_from(args.gap.as_millis()).unwrap_or(u64::MAX);
    let shown = Shown::new(&tally, &summary, args.confidence, gap_ms);
    match args.output.format {
        Format::Text => say(&shown.text())?,
        Format::Json => say_json(&shown)?,
    }
    Ok(exit(&summary.condition))
}

/// The chain from end to end.
pub fn verify(args: &LedgerArgs) -> Result<Exit, Error> {
    let path = common::ledger_path(&args.place);
    let summary = ledger::verify(&path).map_err(common::cannot)?;
    let name = path.display().to_string();
    let verified = Verified::new(&name, &summary);
    match args.output.format {
        Format::Text => say(&verified.text())?,
        Format::Json => say_json(&verified)?,
    }
    Ok(exit(&summary.condition))
}

fn exit(condition: &Condition) -> Exit {
    match condition {
        Condition::Clean | Condition::TornTail { .. } => Exit::Clear,
        Condition::Broken { .. } => Exit::CannotDo,
    }
}
