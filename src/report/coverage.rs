//! The grid of a host: when each cell was last covered, how long, and what is overdue.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde::Serialize;

use super::figures::short;
use super::text::{Table, folded, printable};
use crate::host::Cpu;

/// Schema of the document.
pub const SCHEMA: &str = "proofhouse/coverage/1";
/// Milliseconds in a day.
const DAY_MS: f64 = 86_400_000.0;

/// One cell.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CellReport {
    /// Logical cpu.
    pub cpu: Cpu,
    /// The second cpu of a kernel for two.
    pub partner: Option<Cpu>,
    /// Kernel id.
    pub kernel: String,
    /// Variant name.
    pub variant: String,
    /// Footprint in KiB.
    pub kib: u32,
    /// Who else was busy, how hard, after what.
    pub condition: String,
    /// When it was last covered, Unix milliseconds; null: never.
    pub last_ms: Option<u64>,
    /// Processor time inside the kernel, seconds.
    pub busy_s: f64,
}

/// Cells of one kind together.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Sum {
    /// Cells.
    pub cells: u64,
    /// Covered at least once.
    pub covered: u64,
    /// Not covered for longer than the limit, or never.
    pub overdue: u64,
    /// Processor time, seconds.
    pub busy_s: f64,
    /// The longest that any covered cell was left alone, days.
    pub oldest_days: Option<f64>,
}

/// The document `proofhouse/coverage/1`.
#[derive(Clone, Debug, Serialize)]
pub struct CoverageReport {
    /// Names the document's kind.
    pub schema: &'static str,
    /// The ledger.
    pub ledger: String,
    /// Days after which a cell is overdue.
    pub overdue_days: f64,
    /// All of it.
    pub all: Sum,
    /// By condition.
    pub conditions: BTreeMap<String, Sum>,
    /// By kernel.
    pub kernels: BTreeMap<String, Sum>,
    /// Every cell.
    pub cells: Vec<CellReport>,
}

impl CoverageReport {
    /// Of cells, at the host's clock `now_ms`.
    pub fn new(ledger: String, now_ms: u64, overdue_ms: u64, cells: Vec<CellReport>) -> CoverageReport {
        let mut report = CoverageReport {
            schema: SCHEMA,
            ledger,
            overdue_days: overdue_ms as f64 / DAY_MS,
            all: Sum::default(),
            conditions: BTreeMap::new(),
            kernels: BTreeMap::new(),
            cells: Vec::new(),
        };
        for cell in &cells {
            let condition =
                if cell.partner.is_some() { format!("{} in pairs", cell.condition) } else { cell.condition.clone() };
            let sums = [
                &mut report.all,
                report.conditions.entry(condition).or_default(),
                report.kernels.entry(cell.kernel.clone()).or_default(),
            ];
            for sum in sums {
                let age = cell.last_ms.map(|last| now_ms.saturating_sub(last));
                sum.cells += 1;
                sum.covered += u64::from(age.is_some());
                sum.overdue += u64::from(age.is_none_or(|age| age > overdue_ms));
                sum.busy_s += cell.busy_s;
                let days = age.map(|age| age as f64 / DAY_MS);
                sum.oldest_days = match (sum.oldest_days, days) {
                    (Some(a), Some(b)) => Some(a.max(b)),
                    (a, b) => a.or(b),
                };
            }
        }
        report.cells = cells;
        report
    }

    /// The text for people, at most 100 columns.
    pub fn text(&self) -> String {
        let mut out = String::new();
        let head = format!(
            "{} of {} cells covered in {}; {} overdue (never, or not for {} days)",
            self.all.covered,
            self.all.cells,
            printable(&self.ledger),
            self.all.overdue,
            short(self.overdue_days)
        );
        let _ = writeln!(out, "{}", folded(&head));
        for (title, sums) in [("condition", &self.conditions), ("kernel", &self.kernels)] {
            let mut table = Table::new(&[title, "cells", "covered", "overdue", "busy s", "oldest days"]);
            for (name, sum) in sums {
                table.row([
                    name.clone(),
                    sum.cells.to_string(),
                    sum.covered.to_string(),
                    sum.overdue.to_string(),
                    format!("{:.1}", sum.busy_s),
                    sum.oldest_days.map_or("never".to_owned(), short),
                ]);
            }
            let _ = writeln!(out, "\n{}", table.text().trim_end());
        }
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn never_and_long_ago_are_overdue() {
        let cell = |kernel: &str, partner: Option<u32>, last_ms: Option<u64>| CellReport {
            cpu: Cpu(0),
            partner: partner.map(Cpu),
            kernel: kernel.to_owned(),
            variant: "portable".to_owned(),
            kib: 9,
            condition: "all steady 100%".to_owned(),
            last_ms,
            busy_s: if last_ms.is_some() { 2.0 } else { 0.0 },
        };
        let now = 100 * 86_400_000;
        let cells = vec![
            cell("integer.multiply", None, Some(now - 86_400_000)),
            cell("integer.multiply", None, Some(now - 40 * 86_400_000)),
            cell("integer.divide", None, None),
            cell("sync.lock", Some(1), Some(now)),
        ];
        let report = CoverageReport::new("x".into(), now, 30 * 86_400_000, cells);
        assert_eq!((report.all.cells, report.all.covered, report.all.overdue), (4, 3, 2));
        assert_eq!(report.kernels["integer.multiply"].oldest_days, Some(40.0));
        assert_eq!(report.conditions["all steady 100% in pairs"].overdue, 0);
        assert!(report.text().starts_with("3 of 4 cells covered in x; 2 overdue"));
    }
}
