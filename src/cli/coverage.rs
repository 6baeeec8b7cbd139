//! `ledger coverage`: the grid of this host against its ledger.

use super::args::{CoverageArgs, Format};
use super::{common, say, say_json};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::plan::{self, Site};
use crate::report::coverage::{CellReport, CoverageReport};
use crate::run::driver::unix_ms;

/// Runs the command.
pub fn run(args: &CoverageArgs) -> Result<Exit, Error> {
    let host = common::host()?;
    let seats = common::seats(&host, &args.choice)?;
    let (units, _) = common::units(&args.choice)?;
    let path = common::ledger_path(&args.place);
    if !path.exists() {
        return Err(Error::CannotDo(format!(
            "ledger: there is none at {}; run a window first, or name it with --ledger",
            path.display()
        )));
    }
    let history = common::read_history(&host, &path)?;
    let site = Site::of(&host, &seats);
    let cells = plan::cells(&site, &units, args.budget).into_iter().map(|cell| {
        let done = match cell.partner {
            Some(partner) => history.done_together(cell.cpu, partner, cell.unit),
            None => history.done(cell.cpu, cell.unit, cell.setting),
        };
        CellReport {
            cpu: cell.cpu,
            partner: cell.partner,
            kernel: cell.unit.kernel.to_owned(),
            variant: cell.unit.variant.to_string(),
            kib: cell.unit.size.0,
            condition: cell.setting.to_string(),
            last_ms: (done.last_ms > 0).then_some(done.last_ms),
            busy_s: done.busy_ns as f64 / 1e9,
        }
    });
    let overdue_ms = u64::try_from(args.overdue.as_millis()).unwrap_or(u64::MAX);
    let report = CoverageReport::new(path.display().to_string(), unix_ms(), overdue_ms, cells.collect());
    match args.output.format {
        Format::Text => say(&report.text())?,
        Format::Json => say_json(&report)?,
    }
    Ok(Exit::Clear)
}
