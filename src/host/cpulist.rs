//! Cpu numbers, and lists of them as the kernel writes them (`0-3,8,10-11`).
//!
//! Syntax: kernel documentation `Documentation/core-api/printk-formats.rst` (`%*pbl`) and
//! `admin-guide/kernel-parameters.rst` ("cpu lists"), from memory. The form with a stride (`0-31:1/2`) is only ever
//! read by the kernel, never written, so it is refused here.

use std::collections::BTreeSet;
use std::fmt;

use serde::{Deserialize, Serialize};

use crate::host::text::clean;

/// One more than the highest cpu number that is accepted anywhere; kernels are built for at most 8,192 on x86.
pub const CPU_LIMIT: u32 = 65_536;

/// A logical cpu number of Linux.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Cpu(pub u32);

impl fmt::Display for Cpu {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.fmt(f)
    }
}

/// A physical core: numbered from 0 over the whole host, in the order of socket, die and the kernel's core id.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Core(pub u32);

impl fmt::Display for Core {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.fmt(f)
    }
}

/// What is wrong with a list of cpus.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum CpuListError {
    /// A part is neither a number nor a range.
    #[error("{part:?} in the cpu list is neither a number nor a range: write it like 0-3,8,10-11")]
    NotANumber {
        /// The part between two commas.
        part: String,
    },
    /// A range runs downwards.
    #[error("range {part:?} in the cpu list runs backwards: put the lower number first")]
    Backwards {
        /// The part between two commas.
        part: String,
    },
    /// A number at or above [`CPU_LIMIT`].
    #[error("{part:?} in the cpu list goes past {}, the highest cpu number accepted: check the number", CPU_LIMIT - 1)]
    TooHigh {
        /// The part between two commas.
        part: String,
    },
    /// Nothing named where something has to be.
    #[error("the cpu list is empty: name at least one cpu, as in 0-3,8, or write all")]
    Empty,
}

/// A set of cpus in ascending order; JSON has it as an array of numbers.
#[derive(Clone, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(transparent)]
pub struct CpuSet(BTreeSet<Cpu>);

/// What a user asked for with `--cpus`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum CpuChoice {
    /// Every cpu that this process may use.
    All,
    /// These, and no others.
    Only(CpuSet),
}

impl std::str::FromStr for CpuChoice {
    type Err = CpuListError;

    /// `all`, or a list that is not empty.
    fn from_str(text: &str) -> Result<CpuChoice, CpuListError> {
        if text.trim() == "all" {
            return Ok(CpuChoice::All);
        }
        let set = CpuSet::parse_kernel(text)?;
        if set.is_empty() { Err(CpuListError::Empty) } else { Ok(CpuChoice::Only(set)) }
    }
}

impl CpuSet {
    /// The empty set.
    pub fn new() -> CpuSet {
        CpuSet::default()
    }

    /// Reads a list as the kernel writes it; white space alone is the empty set.
    ///
    /// Ranges are merged before anything is expanded, so the work is bounded by the text's length and [`CPU_LIMIT`].
    pub fn parse_kernel(text: &str) -> Result<CpuSet, CpuListError> {
        let text = text.trim();
        if text.is_empty() {
            return Ok(CpuSet::new());
        }
        let mut ranges = text.split(',').map(parse_part).collect::<Result<Vec<_>, _>>()?;
        ranges.sort_unstable();
        let mut set = BTreeSet::new();
        let mut next = 0;
        for (low, high) in ranges {
            set.extend((low.max(next)..=high).map(Cpu));
            next = next.max(high + 1);
        }
        Ok(CpuSet(set))
    }

    /// Whether `cpu` is in it.
    pub fn contains(&self, cpu: Cpu) -> bool {
        self.0.contains(&cpu)
    }

    /// Puts `cpu` in; whether it is new.
    pub fn insert(&mut self, cpu: Cpu) -> bool {
        self.0.insert(cpu)
    }

    /// Takes `cpu` out; whether it was there.
    pub fn remove(&mut self, cpu: Cpu) -> bool {
        self.0.remove(&cpu)
    }

    /// How many there are.
    pub fn len(&self) -> usize {
        self.0.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    /// The lowest.
    pub fn first(&self) -> Option<Cpu> {
        self.0.first().copied()
    }

    /// The highest.
    pub fn last(&self) -> Option<Cpu> {
        self.0.last().copied()
    }

    /// Ascending.
    pub fn iter(&self) -> impl DoubleEndedIterator<Item = Cpu> + '_ {
        self.0.iter().copied()
    }

    /// Those in both.
    pub fn intersection(&self, other: &CpuSet) -> CpuSet {
        CpuSet(self.0.intersection(&other.0).copied().collect())
    }

    /// Those in this one only.
    pub fn difference(&self, other: &CpuSet) -> CpuSet {
        CpuSet(self.0.difference(&other.0).copied().collect())
    }

    /// Whether each of them is in `other`.
    pub fn is_subset(&self, other: &CpuSet) -> bool {
        self.0.is_subset(&other.0)
    }
}

fn parse_part(part: &str) -> Result<(u32, u32), CpuListError> {
    let part = part.trim();
    let owned = || clean(part, 40);
    let number = |digits: &str| {
        if digits.is_empty() || !digits.bytes().all(|b| b.is_ascii_digit()) {
            return Err(CpuListError::NotANumber { part: owned() });
        }
        // digits that overflow are too high all the more
        let value = digits.parse().unwrap_or(u32::MAX);
        if value < CPU_LIMIT { Ok(value) } else { Err(CpuListError::TooHigh { part: owned() }) }
    };
    let (low, high) = match part.split_once('-') {
        Some((low, high)) => (number(low)?, number(high)?),
        None => (number(part)?, number(part)?),
    };
    if low <= high { Ok((low, high)) } else { Err(CpuListError::Backwards { part: owned() }) }
}

impl FromIterator<Cpu> for CpuSet {
    fn from_iter<I: IntoIterator<Item = Cpu>>(cpus: I) -> CpuSet {
        CpuSet(cpus.into_iter().collect())
    }
}

impl IntoIterator for CpuSet {
    type Item = Cpu;
    type IntoIter = std::collections::btree_set::IntoIter<Cpu>;

    fn into_iter(self) -> Self::IntoIter {
        self.0.into_iter()
    }
}

/// As the kernel writes it.
impl fmt::Display for CpuSet {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut ranges: Vec<(u32, u32)> = Vec::new();
        for Cpu(cpu) in self.iter() {
            match ranges.last_mut() {
                Some((_, high)) if *high + 1 == cpu => *high = cpu,
                _ => ranges.push((cpu, cpu)),
            }
        }
        let parts: Vec<String> = ranges
            .into_iter()
            .map(|(low, high)| if low == high { low.to_string() } else { format!("{low}-{high}") })
            .collect();
        f.pad(&parts.join(","))
    }
}
