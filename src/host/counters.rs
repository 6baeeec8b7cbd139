//! Counters of machine checks and memory errors, and the difference of two snapshots.
//!
//! Files: `/proc/interrupts` (`arch/x86/kernel/irq.c`: a header line naming the *online* cpus, then rows such as
//! `MCE:` with one column for each of them), kernel documentation `Documentation/admin-guide/RAS/main.rst`
//! (`/sys/devices/system/edac/mc/mc*/`); from memory.

use std::collections::BTreeMap;
use std::fmt;

use serde::{Deserialize, Serialize};

use crate::host::cpulist::{CPU_LIMIT, Cpu};
use crate::host::root::{Reading, Root, Why};

/// A row of `/proc/interrupts` that tells of the hardware's health.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Row {
    /// `MCE`: machine check exceptions.
    MachineCheck,
    /// `MCP`: polls for corrected machine checks. They come by the clock: a rise is no error.
    Poll,
    /// `THR`: a count of corrected errors passed its threshold.
    Threshold,
    /// `DFR`: deferred errors: data were found bad before anything used them.
    Deferred,
    /// `TRM`: thermal events.
    Thermal,
}

impl Row {
    const ALL: [Row; 5] = [Row::MachineCheck, Row::Poll, Row::Threshold, Row::Deferred, Row::Thermal];

    /// Its name in the file.
    pub fn name(self) -> &'static str {
        match self {
            Row::MachineCheck => "MCE",
            Row::Poll => "MCP",
            Row::Threshold => "THR",
            Row::Deferred => "DFR",
            Row::Thermal => "TRM",
        }
    }
}

/// Which counter.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Counter {
    /// Interrupts of one kind on one cpu.
    Interrupt {
        /// The kind.
        row: Row,
        /// The cpu that took them.
        cpu: Cpu,
    },
    /// Memory errors that were corrected, at a controller (`mc0`) or a module (`mc0/dimm3`).
    Corrected {
        /// The place.
        place: String,
    },
    /// Memory errors that were not.
    Uncorrected {
        /// The place.
        place: String,
    },
}

impl Counter {
    /// Whether a rise means that hardware erred. Polls come by the clock, and heat is no error.
    pub fn is_error(&self) -> bool {
        !matches!(self, Counter::Interrupt { row: Row::Poll | Row::Thermal, .. })
    }
}

impl fmt::Display for Counter {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Counter::Interrupt { row, cpu } => write!(f, "{} interrupts on cpu {cpu}", row.name()),
            Counter::Corrected { place } => write!(f, "corrected memory errors at {place}"),
            Counter::Uncorrected { place } => write!(f, "uncorrected memory errors at {place}"),
        }
    }
}

/// All counters at one moment.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Counters {
    /// Whether `/proc/interrupts` could be read, and which of the rows it has.
    pub rows: Reading<Vec<Row>>,
    /// The memory controllers that the kernel watches, e.g. `mc0`.
    pub controllers: Reading<Vec<String>>,
    /// Every counter that is there.
    pub values: BTreeMap<Counter, Reading<u64>>,
}

impl Counters {
    /// Reads them all.
    pub fn read(root: &Root) -> Counters {
        let mut values = BTreeMap::new();
        let rows = root.long_text("proc/interrupts").and_then(|text| match interrupts(&text) {
            Some(table) => {
                let mut rows: Vec<Row> = table.keys().map(|&(row, _)| row).collect();
                rows.dedup();
                let counters = table.into_iter().map(|((row, cpu), count)| (Counter::Interrupt { row, cpu }, count));
                values.extend(counters);
                Reading::Value(rows)
            }
            None => Reading::Unreadable(Why::nonsense(&text)),
        });
        const FOLDER: &str = "sys/devices/system/edac/mc";
        let controllers = root.numbered(FOLDER, "mc").map(|numbers| {
            for number in &numbers {
                let controller = format!("mc{number}");
                read_errors(root, FOLDER, &controller, "", &mut values);
                for dimm in root.numbered(&format!("{FOLDER}/{controller}"), "dimm").ok().unwrap_or_default() {
                    read_errors(root, FOLDER, &format!("{controller}/dimm{dimm}"), "dimm_", &mut values);
                }
            }
            numbers.into_iter().map(|number| format!("mc{number}")).collect()
        });
        Counters { rows, controllers, values }
    }

    /// What changed from `self` to `later`; counters that stayed the same are left out.
    pub fn until(&self, later: &Counters) -> Vec<Change> {
        let mut changes = Vec::new();
        let all: std::collections::BTreeSet<&Counter> = self.values.keys().chain(later.values.keys()).collect();
        for counter in all {
            let before = self.values.get(counter).and_then(Reading::get);
            let after = later.values.get(counter).and_then(Reading::get);
            let how = match (before, after) {
                (Some(before), Some(after)) if after > before => How::Rose { by: after - before },
                (Some(before), Some(after)) if after < before => How::WentBack { before, after },
                (Some(before), None) => How::Vanished { before },
                (None, Some(after)) => How::Appeared { after },
                _ => continue,
            };
            changes.push(Change { counter: counter.clone(), how });
        }
        changes
    }
}

/// How a counter changed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum How {
    /// It counted on.
    Rose {
        /// By how much.
        by: u64,
    },
    /// It is lower than before: it was reset or wrapped, and what happened between is not known.
    WentBack {
        /// First value.
        before: u64,
        /// Second value.
        after: u64,
    },
    /// It can be read no more: a cpu went offline, a driver was unloaded.
    Vanished {
        /// The last known value.
        before: u64,
    },
    /// It can be read now and could not before.
    Appeared {
        /// Its value.
        after: u64,
    },
}

/// A counter that changed between two snapshots.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Change {
    /// Which.
    pub counter: Counter,
    /// How.
    pub how: How,
}

impl Change {
    /// Whether hardware erred between the snapshots, as far as this counter tells.
    pub fn is_error(&self) -> bool {
        self.counter.is_error() && matches!(self.how, How::Rose { .. })
    }
}

impl fmt::Display for Change {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let counter = &self.counter;
        match self.how {
            How::Rose { by } => write!(f, "{counter}: {by} more"),
            How::WentBack { before, after } => {
                write!(f, "{counter}: went back from {before} to {after}, so what happened between is not known")
            }
            How::Vanished { before } => write!(f, "{counter}: was {before}, can be read no more"),
            How::Appeared { after } => write!(f, "{counter}: is {after}, could not be read before"),
        }
    }
}

/// The rows of interest by cpu; `None` where the text has no header line.
fn interrupts(text: &str) -> Option<BTreeMap<(Row, Cpu), Reading<u64>>> {
    let mut lines = text.lines();
    let column = |word: &str| word.strip_prefix("CPU")?.parse().ok().filter(|&cpu| cpu < CPU_LIMIT).map(Cpu);
    let header: Option<Vec<Cpu>> = lines.next()?.split_ascii_whitespace().map(column).collect();
    let header = header.filter(|cpus| !cpus.is_empty())?;
    let mut table = BTreeMap::new();
    for line in lines {
        let Some((name, rest)) = line.split_once(':') else { continue };
        let Some(row) = Row::ALL.into_iter().find(|row| row.name() == name.trim()) else { continue };
        let mut words = rest.split_ascii_whitespace();
        for &cpu in &header {
            // a row that ends early leaves the last cpus without a count
            let Some(word) = words.next() else { break };
            let count = word.parse().map_or_else(|_| Reading::Unreadable(Why::nonsense(word)), Reading::Value);
            table.insert((row, cpu), count);
        }
    }
    Some(table)
}

fn read_errors(root: &Root, folder: &str, place: &str, prefix: &str, values: &mut BTreeMap<Counter, Reading<u64>>) {
    let count = |kind: &str| root.count(&format!("{folder}/{place}/{prefix}{kind}_count"));
    let place = || place.to_owned();
    for (counter, reading) in
        [(Counter::Corrected { place: place() }, count("ce")), (Counter::Uncorrected { place: place() }, count("ue"))]
    {
        if reading != Reading::Absent {
            values.insert(counter, reading);
        }
    }
}
