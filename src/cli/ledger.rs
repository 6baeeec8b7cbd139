//! `ledger show` and `ledger verify`.

use super::args::{Format, LedgerArgs, ShowArgs};
use super::{common, say, say_json};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::host::Cpu;
use crate::host::cpulist::CpuSet;
use crate::ledger::filter::Filter;
use crate::ledger::view::Wanted;
use crate::ledger::{self, Condition, View};
use crate::report::ledger::{Ask, Shown, Verified, layout, utc};
use crate::run::driver::unix_ms;

/// What was asked for. A broken ledger is shown as far as it can be relied on, and the exit says so.
pub fn show(args: &ShowArgs) -> Result<Exit, Error> {
    let filter = filter(args, unix_ms())?;
    let gap_ms = u64::try_from(args.ledger.gap.as_millis()).unwrap_or(u64::MAX);
    let mut by = args.by.clone();
    by.sort_unstable();
    by.dedup();
    let wanted = Wanted {
        filter: filter.clone(),
        by: by.clone(),
        episodes: args.episodes,
        timeline: args.timeline,
        words: args.words.then_some(layout::of),
    };
    let view = View::read(&common::ledger_path(&args.ledger.place), &wanted).map_err(common::cannot)?;
    on_record(&view, &filter)?;
    let ask = Ask { confidence: args.ledger.confidence, gap_ms, by, episodes: args.episodes, filter };
    let shown = Shown::new(&view, &ask);
    match args.ledger.output.format {
        Format::Text => say(&shown.text())?,
        Format::Json => say_json(&shown)?,
    }
    Ok(exit(&view.summary.condition))
}

fn filter(args: &ShowArgs, now_ms: u64) -> Result<Filter, Error> {
    let since_ms = args.since.map(|m| m.begin_ms(now_ms));
    let until_ms = args.until.map(|m| m.end_ms(now_ms));
    if let (Some(since), Some(until)) = (since_ms, until_ms)
        && since >= until
    {
        return Err(Error::Usage(format!(
            "--since {} UTC is not before --until {} UTC: nothing lies between them; give the earlier one to --since",
            utc::second(since),
            utc::second(until)
        )));
    }
    Ok(Filter { cpu: args.cpu.map(Cpu), kernels: args.kernels.clone(), since_ms, until_ms })
}

/// A cpu or kernel of which nothing is on record at any time is a slip of the pen, unless damage hides it.
fn on_record(view: &View, filter: &Filter) -> Result<(), Error> {
    let known = |what: String, known: String| {
        let known = if known.is_empty() { "none".to_owned() } else { known };
        match &view.summary.condition {
            Condition::Broken { .. } => Error::CannotDo(format!(
                "{what} is not in the part of the ledger that can be relied on: the ledger is {}",
                view.summary.condition
            )),
            _ => Error::Usage(format!("{what} is not in this ledger; on record are {known}")),
        }
    };
    if let Some(cpu) = filter.cpu
        && !view.known_cpus.contains(&cpu)
    {
        let list: CpuSet = view.known_cpus.iter().copied().collect();
        return Err(known(format!("--cpu {cpu}"), list.to_string()));
    }
    let missing = filter.kernels.iter().find(|p| !view.known_kernels.iter().any(|k| p.matches(k)));
    if let Some(pattern) = missing {
        let list: Vec<&str> = view.known_kernels.iter().map(String::as_str).collect();
        return Err(known(format!("--kernel {pattern}"), list.join(", ")));
    }
    Ok(())
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
