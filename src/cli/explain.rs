//! `window --explain`: the plan as a document, without running it and without touching the ledger.

use kernels::catalogue;

use super::args::{Format, WindowArgs};
use super::common;
use super::{say, say_json};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::host::Host;
use crate::plan::{self, Brief, Grid, Plan, Site, Unit};
use crate::report::gathering::GridReport;
use crate::report::plan::{PhaseReport, PlanReport, SliceReport, TrackReport};
use crate::run::driver::unix_ms;

/// Plans and prints.
pub fn run(args: &WindowArgs, host: &Host, site: &Site, units: &[Unit], seed: u64) -> Result<Exit, Error> {
    let path = common::ledger_path(&args.place);
    let history = common::read_history(host, &path)?;
    let plan = plan::plan(&Brief {
        site,
        units,
        history: &history,
        budget: args.budget.saturating_sub(common::OVERHEAD),
        now_ms: unix_ms(),
        seed,
        seeds: &common::seeds_of,
    });
    let report = report(&plan, args.budget.as_secs_f64(), seed, site, path.display().to_string());
    match args.output.format {
        Format::Text => say(&report.text())?,
        Format::Json => say_json(&report)?,
    }
    Ok(Exit::Clear)
}

/// The grid as reports have it.
pub fn grid(grid: &Grid) -> GridReport {
    let windows = (grid.windows > 0).then_some(grid.windows);
    GridReport { cells: grid.cells, uncovered_before: grid.uncovered, windows }
}

fn report(plan: &Plan, budget_s: f64, seed: u64, site: &Site, ledger: String) -> PlanReport {
    let phases = plan.phases.iter().map(|phase| PhaseReport {
        aim: phase.aim.name(),
        setting: phase.setting.to_string(),
        seconds: phase.seconds,
        idle: 1.0 - phase.setting.pace.duty() * busy_cpus(phase) as f64 / site.seats.len().max(1) as f64,
        tracks: phase
            .tracks
            .iter()
            .map(|(cpu, slices)| TrackReport {
                cpu: *cpu,
                slices: slices
                    .iter()
                    .map(|s| SliceReport {
                        kernel: s.unit.kernel.to_owned(),
                        variant: s.unit.variant.to_string(),
                        kib: s.unit.size.0,
                        level: site.level(s.unit.size, *cpu, phase.setting).map(|l| l.to_string()),
                        partner: s.partner,
                        seeds: s.seeds.clone(),
                        fresh: s.fresh,
                    })
                    .collect(),
            })
            .collect(),
    });
    PlanReport::new(budget_s, seed, site.seats.len(), ledger, plan.left_out, grid(&plan.grid), phases.collect())
}

/// Cpus with work in a phase, partners included.
fn busy_cpus(phase: &plan::Phase) -> usize {
    let width = |(_, slices): &(_, Vec<plan::Planned>)| {
        let kernel = slices.first().and_then(|s| catalogue::find(s.unit.kernel));
        kernel.map_or(0, |k| k.cpus())
    };
    phase.tracks.iter().map(width).sum()
}
