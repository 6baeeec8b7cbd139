//! Sums over everything that has one thing in common: a core, a kernel, a family, a setting, a day.
//!
//! Such a sum says how much was done and what was seen there. Its rate is an average over all that was put together,
//! and no rate of any one cell. What two cpus did together is kept apart in every sum.

use std::collections::BTreeMap;

use crate::condition::Condition;
use crate::event::Slice;
use crate::host::Cpu;
use crate::ledger::cells::Cell;

/// Milliseconds in a day.
pub const DAY_MS: u64 = 86_400_000;

/// By what a ledger can be shown.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Dimension {
    /// Logical cpu.
    Cpu,
    /// Physical core.
    Core,
    /// Kernel, all its variants together.
    Kernel,
    /// The part of a kernel's id before the dot.
    Family,
    /// Condition without the footprint, which goes with the kernel.
    Condition,
    /// Day by UTC on which the slice began.
    Day,
    /// Core, kernel, variant and whole condition: the unit that statistics speak of.
    Cell,
}

impl Dimension {
    /// Every one with its word.
    pub const ALL: [(Dimension, &'static str); 7] = [
        (Dimension::Cpu, "cpu"),
        (Dimension::Core, "core"),
        (Dimension::Kernel, "kernel"),
        (Dimension::Family, "family"),
        (Dimension::Condition, "condition"),
        (Dimension::Day, "day"),
        (Dimension::Cell, "cell"),
    ];

    /// Its word.
    pub fn word(self) -> &'static str {
        Dimension::ALL.iter().find(|(d, _)| *d == self).map_or("", |(_, word)| word)
    }
}

/// What the slices of a sum have in common.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Label {
    /// A core's number, or a day's since 1970-01-01.
    Number(u64),
    /// A name.
    Name(String),
}

/// Work of one cpu, and work of two together.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Pooled {
    /// By one cpu.
    pub alone: Cell,
    /// By two: a wrong output there is not told apart between them.
    pub together: Cell,
}

/// The sums that were asked for. Cpus and cells are the tally's.
#[derive(Clone, Debug, Default)]
pub struct Groups {
    only: Option<Cpu>,
    sums: BTreeMap<Dimension, BTreeMap<Label, Pooled>>,
}

/// The setting of a slice in words: its condition without the footprint; words that are no condition stay as they are.
pub fn setting(condition: &str) -> String {
    condition.parse::<Condition>().map_or_else(|_| condition.to_owned(), |c| c.setting.to_string())
}

/// The family of a kernel.
pub fn family(kernel: &str) -> &str {
    kernel.split_once('.').map_or(kernel, |(family, _)| family)
}

impl Groups {
    /// Of these dimensions; of two cpus that worked together only `only`'s core is counted, if given.
    pub fn new(wanted: &[Dimension], only: Option<Cpu>) -> Groups {
        Groups { only, sums: wanted.iter().map(|d| (*d, BTreeMap::new())).collect() }
    }

    /// The sums by `dimension`.
    pub fn by(&self, dimension: Dimension) -> impl Iterator<Item = (&Label, &Pooled)> {
        self.sums.get(&dimension).into_iter().flatten()
    }

    /// Takes a slice that counts.
    pub(super) fn add(&mut self, slice: &Slice) {
        let name = |text: &str| vec![Label::Name(text.to_owned())];
        for (dimension, sums) in &mut self.sums {
            let labels = match dimension {
                Dimension::Cpu | Dimension::Cell => continue,
                Dimension::Core => {
                    let both = [Some((slice.cpu, slice.core)), slice.partner.map(|p| (p.cpu, p.core))];
                    let wanted = both.into_iter().flatten().filter(|(cpu, _)| self.only.is_none_or(|c| c == *cpu));
                    let mut cores: Vec<Label> = wanted.map(|(_, core)| Label::Number(u64::from(core))).collect();
                    // two threads of one core
                    cores.dedup();
                    cores
                }
                Dimension::Kernel => name(&slice.kernel),
                Dimension::Family => name(family(&slice.kernel)),
                Dimension::Condition => vec![Label::Name(setting(&slice.condition))],
                Dimension::Day => vec![Label::Number(slice.wall_ms / DAY_MS)],
            };
            for label in labels {
                let sum = sums.entry(label).or_default();
                if slice.partner.is_some() { &mut sum.together } else { &mut sum.alone }.add(slice);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn conditions_lose_their_footprint_and_nothing_else() {
        for (condition, expected) in [
            ("all steady 100% l1 21KiB", "all steady 100%"),
            ("solo burst 10us/100us heated 10s in-pair l2 384KiB", "solo burst 10us/100us heated 10s"),
            ("solo", "solo"),
        ] {
            assert_eq!(setting(condition), expected);
        }
        assert_eq!((family("fma.chain64"), family("odd")), ("fma", "odd"));
    }
}
