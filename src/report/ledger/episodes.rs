//! Episodes of wrong outputs: when, where, in what.

use std::fmt::Write;

use serde::Serialize;

use super::utc;
use crate::host::Cpu;
use crate::ledger::wrongs::Wrongs;
use crate::report::text::{Table, folded, printable};

/// Kernels that a row names.
const NAMED: usize = 2;

/// One episode of one cpu, or of two together.
#[derive(Clone, Debug, Serialize)]
pub struct EpisodeLine {
    cpu: Cpu,
    #[serde(skip_serializing_if = "Option::is_none")]
    partner: Option<Cpu>,
    first_ms: u64,
    last_ms: u64,
    first: String,
    last: String,
    kernels: Vec<String>,
    mismatches: u64,
    slices: u64,
}

/// All episodes by their begin.
pub fn lines(wrongs: &Wrongs, only: Option<Cpu>, gap_ms: u64) -> Vec<EpisodeLine> {
    let mut lines = Vec::new();
    for (seat, work) in &wrongs.seats {
        if only.is_some_and(|c| c != seat.cpu && Some(c) != seat.partner) {
            continue;
        }
        lines.extend(work.episodes(gap_ms).into_iter().map(|e| EpisodeLine {
            cpu: seat.cpu,
            partner: seat.partner,
            first_ms: e.episode.first_ms,
            last_ms: e.episode.last_ms,
            first: utc::second(e.episode.first_ms),
            last: utc::second(e.episode.last_ms),
            kernels: e.kernels.iter().map(|k| wrongs.kernels.name(*k).to_owned()).collect(),
            mismatches: u64::try_from(e.episode.mismatches).unwrap_or(u64::MAX),
            slices: e.episode.slices,
        }));
    }
    lines.sort_by_key(|l| (l.first_ms, l.cpu, l.partner));
    lines
}

/// For people.
pub fn text(lines: &[EpisodeLine], gap_ms: u64) -> String {
    let gap = humantime::format_duration(std::time::Duration::from_millis(gap_ms));
    if lines.is_empty() {
        return "\nNo episode: no slice with a wrong output is on record.\n".to_owned();
    }
    let mut out =
        format!("\nEpisodes of each cpu in all its work; quiet of more than {gap} ends one. Times are UTC:\n");
    let mut table = Table::new(&["begin", "end", "cpu", "wrong", "slices", "kernels"]);
    for line in lines {
        let seat = match line.partner {
            None => line.cpu.to_string(),
            Some(partner) => format!("{} with {partner}", line.cpu),
        };
        let mut kernels: Vec<String> = line.kernels.iter().take(NAMED).map(|k| printable(k)).collect();
        if line.kernels.len() > NAMED {
            kernels.push(format!("{} more", line.kernels.len() - NAMED));
        }
        table.row([
            line.first.clone(),
            line.last.clone(),
            seat,
            line.mismatches.to_string(),
            line.slices.to_string(),
            kernels.join(", "),
        ]);
    }
    out.push_str(&table.text());
    if lines.iter().any(|l| l.partner.is_some()) {
        let together = "\"a with b\": the two worked together, and the episode is held against neither.";
        let _ = writeln!(out, "{}", folded(together));
    }
    out
}
