//! Sums by cpu, core, kernel and so on: as lines of the document and as tables.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde::Serialize;
use serde_json::Value;

use super::columns::{columns, headings};
use super::utc;
use crate::host::Cpu;
use crate::ledger::groups::{Dimension, Label};
use crate::ledger::{Cell, CellKey, Tally, View};
use crate::report::figures::{Figures, short};
use crate::report::text::{Table, folded, printable};

/// Said below tables of sums over more than one cell.
pub const POOLED: &str = " A row that puts different work together says of a rate its average over that work, and no rate of \
                          any one cell.";

/// One sum; `together` where two cpus did the work.
#[derive(Clone, Debug, Serialize)]
pub struct SumLine {
    #[serde(flatten)]
    label: BTreeMap<&'static str, Value>,
    together: bool,
    #[serde(flatten)]
    figures: Figures,
    #[serde(skip)]
    text: String,
}

/// The sums by `dimension`, which is none of the tally's.
pub fn lines(view: &View, dimension: Dimension, figures: &dyn Fn(&Cell) -> Figures) -> Vec<SumLine> {
    let mut lines = Vec::new();
    for (label, pooled) in view.groups.by(dimension) {
        let (value, text) = match label {
            Label::Number(n) if dimension == Dimension::Day => (Value::from(utc::day(*n)), utc::day(*n)),
            Label::Number(n) => (Value::from(*n), n.to_string()),
            Label::Name(name) => (Value::from(name.as_str()), printable(name)),
        };
        for (cell, together) in [(&pooled.alone, false), (&pooled.together, true)] {
            if cell.slices > 0 {
                let label = BTreeMap::from([(dimension.word(), value.clone())]);
                lines.push(SumLine { label, together, figures: figures(cell), text: text.clone() });
            }
        }
    }
    lines
}

/// The table of such sums.
pub fn table(dimension: Dimension, lines: &[SumLine]) -> String {
    let mut out = format!("\nBy {}", dimension.word());
    out.push_str(match dimension {
        Dimension::Condition => ", footprints put together",
        Dimension::Day => " (UTC) on which the slice began",
        _ => "",
    });
    out.push_str(":\n");
    let pairs = lines.iter().any(|l| l.together);
    let mut table = Table::new(&headings(if pairs { &["", "cpus"] } else { &[""] }));
    for line in lines {
        let who = pairs.then(|| if line.together { "two" } else { "one" }.to_owned());
        table.row([line.text.clone()].into_iter().chain(who).chain(columns(&line.figures)));
    }
    out.push_str(&table.text());
    out
}

/// What a cpu did together with others.
#[derive(Clone, Copy, Debug, Default, Serialize)]
pub struct Together {
    /// Runs.
    pub runs: u64,
    /// Wrong ones, which nobody has told apart.
    pub mismatches: u64,
}

/// One cpu, all its work together.
#[derive(Clone, Debug, Serialize)]
pub struct CpuLine {
    pub cpu: Cpu,
    #[serde(flatten)]
    pub figures: Figures,
    pub together: Together,
    pub lost: u64,
    pub findings: u64,
}

impl CpuLine {
    /// Anything but clean slices.
    pub fn eventful(&self) -> bool {
        self.figures.episodes > 0 || self.together.mismatches > 0 || self.lost > 0 || self.findings > 0
    }
}

/// Every cpu.
pub fn cpus(tally: &Tally, only: Option<Cpu>, figures: &dyn Fn(&Cell) -> Figures) -> Vec<CpuLine> {
    let narrow = |n: u128| u64::try_from(n).unwrap_or(u64::MAX);
    let wanted = tally.cpus.iter().filter(|(cpu, _)| only.is_none_or(|c| c == **cpu));
    wanted
        .map(|(cpu, total)| CpuLine {
            cpu: *cpu,
            figures: figures(&total.all),
            together: Together { runs: narrow(total.together.runs), mismatches: narrow(total.together.mismatches) },
            lost: total.lost.len() as u64,
            findings: total.findings.len() as u64,
        })
        .collect()
}

/// The table of cpus. Beyond `most` of them, those with nothing but clean slices share one line.
pub fn cpu_table(lines: &[CpuLine], most: usize) -> String {
    let mut out = "\nBy cpu, all work together:\n".to_owned();
    let (shown, folded_away): (Vec<&CpuLine>, Vec<&CpuLine>) =
        lines.iter().partition(|l| lines.len() <= most || l.eventful());
    if !shown.is_empty() {
        let mut table = Table::new(&headings(&["cpu"]));
        for line in shown {
            table.row([line.cpu.to_string()].into_iter().chain(columns(&line.figures)));
        }
        out.push_str(&table.text());
    }
    let least = folded_away.iter().min_by(|a, b| a.figures.busy_s.total_cmp(&b.figures.busy_s));
    if let (Some(least), Some(most)) =
        (least, folded_away.iter().max_by(|a, b| a.figures.busy_s.total_cmp(&b.figures.busy_s)))
    {
        let bound = least.figures.per_hour.as_ref().map_or("unknown".to_owned(), |r| short(r.interval.upper));
        let text = format!(
            "{} cpus with nothing wrong on record, {} to {} s busy each: for the least busy one (cpu {}) fewer than {bound} \
             wrong per busy hour. --by cpu lists them.",
            folded_away.len(),
            short(least.figures.busy_s),
            short(most.figures.busy_s),
            least.cpu
        );
        let _ = writeln!(out, "{}", folded(&text));
    }
    let together: Vec<String> = lines
        .iter()
        .filter(|l| l.together.mismatches > 0)
        .map(|l| format!("cpu {}: {} of {}", l.cpu, l.together.mismatches, l.together.runs))
        .collect();
    if !together.is_empty() {
        let text = format!(
            "Wrong together with another cpu, counted for both and held against neither until a third core tells them apart: \
             {} runs.",
            together.join("; ")
        );
        let _ = writeln!(out, "{}", folded(&text));
    }
    out
}

/// One cell.
#[derive(Clone, Debug, Serialize)]
pub struct CellLine {
    core: u32,
    cpus: Vec<Cpu>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    partners: Vec<Cpu>,
    kernel: String,
    variant: String,
    condition: String,
    #[serde(flatten)]
    figures: Figures,
}

/// Every cell.
pub fn cells(tally: &Tally, figures: &dyn Fn(&Cell) -> Figures) -> Vec<CellLine> {
    let line = |(key, cell): (&CellKey, &Cell)| CellLine {
        core: key.core,
        cpus: cell.cpus.iter().copied().collect(),
        partners: cell.partners.iter().copied().collect(),
        kernel: key.kernel.clone(),
        variant: key.variant.clone(),
        condition: key.condition.clone(),
        figures: figures(cell),
    };
    tally.cells.iter().map(line).collect()
}

/// All but the core: what cores can be held against each other in.
type Work<'a> = (&'a str, &'a str, &'a str);

fn by_work(tally: &Tally) -> BTreeMap<Work<'_>, Vec<(u32, &Cell)>> {
    let mut works: BTreeMap<Work<'_>, Vec<(u32, &Cell)>> = BTreeMap::new();
    for (key, cell) in &tally.cells {
        works.entry((&key.kernel, &key.variant, &key.condition)).or_default().push((key.core, cell));
    }
    works
}

/// Rows of a table of cells under headings of their own.
struct CellTable {
    table: Table,
    headings: Vec<Option<String>>,
}

impl CellTable {
    fn new() -> CellTable {
        CellTable { table: Table::new(&headings(&["core", "cpus"])), headings: Vec::new() }
    }

    fn row(&mut self, core: String, cell: &Cell, figures: Figures) {
        let list = |cpus: &std::collections::BTreeSet<Cpu>| {
            let some: Vec<String> = cpus.iter().take(4).map(Cpu::to_string).collect();
            format!("{}{}", some.join(","), if cpus.len() > 4 { ",…" } else { "" })
        };
        let with = if cell.partners.is_empty() { String::new() } else { format!(" with {}", list(&cell.partners)) };
        self.table.row([core, format!("{}{with}", list(&cell.cpus))].into_iter().chain(columns(&figures)));
        self.headings.push(None);
    }

    fn head(&mut self, work: &Work<'_>) {
        if let Some(last) = self.headings.last_mut() {
            *last = Some(printable(&format!("{} {}, {}", work.0, work.1, work.2)));
        }
    }

    fn text(&self) -> String {
        let text = self.table.text();
        let mut lines = text.lines();
        let mut out = format!("{}\n", lines.next().unwrap_or_default());
        for (line, heading) in lines.zip(&self.headings) {
            if let Some(heading) = heading {
                let _ = writeln!(out, "{heading}");
            }
            let _ = writeln!(out, "{line}");
        }
        out
    }
}

/// The table of all cells, cores below each other.
pub fn all_cells(tally: &Tally, figures: &dyn Fn(&Cell) -> Figures) -> String {
    let mut table = CellTable::new();
    for (work, cores) in by_work(tally) {
        for (nth, (core, cell)) in cores.iter().enumerate() {
            table.row(core.to_string(), cell, figures(cell));
            if nth == 0 {
                table.head(&work);
            }
        }
    }
    format!("\nBy core, kernel, variant and condition:\n{}", table.text())
}

/// The cells with something wrong beside the other cores in the same work, and what the clear ones come to.
pub fn wrong_cells(tally: &Tally, figures: &dyn Fn(&Cell) -> Figures) -> String {
    let mut table = CellTable::new();
    let mut wrong = 0;
    for (work, cores) in by_work(tally) {
        let (bad, good): (Vec<_>, Vec<_>) = cores.into_iter().partition(|(_, cell)| !cell.bad.is_empty());
        for (nth, (core, cell)) in bad.iter().enumerate() {
            table.row(core.to_string(), cell, figures(cell));
            if nth == 0 {
                table.head(&work);
            }
        }
        wrong += bad.len();
        if !bad.is_empty() && !good.is_empty() {
            let mut others = Cell::default();
            good.iter().for_each(|(_, cell)| others.merge(cell));
            let figures = figures(&others);
            let name = format!("{} other{}", good.len(), if good.len() == 1 { "" } else { "s" });
            table.row(name, &others, figures);
        }
    }
    let mut out = String::new();
    if wrong > 0 {
        let _ = write!(out, "\nCells with something wrong, and the other cores in the same work:\n{}", table.text());
    }
    let clear = tally.cells.iter().filter(|(_, cell)| cell.bad.is_empty() && cell.busy_ns > 0);
    let least = clear.clone().min_by_key(|(_, cell)| cell.busy_ns);
    if let Some((key, cell)) = least {
        let bound = figures(cell).per_hour.map_or("unknown".to_owned(), |r| short(r.interval.upper));
        let text = format!(
            "{} of {} cells (core, kernel, variant, condition) have nothing wrong on record. Least is known of core {} in {} {} \
             under {}: fewer than {bound} wrong per busy hour, which is the largest bound. --by cell lists all.",
            clear.count(),
            tally.cells.len(),
            key.core,
            printable(&key.kernel),
            printable(&key.variant),
            printable(&key.condition),
        );
        let _ = writeln!(out, "\n{}", folded(&text));
    }
    out
}
