//! Under what a core works: who else is busy, how hard it works, how it came to the slice, alone or in a pair, with how much
//! memory. In a record it is one line of words, e.g. `all steady 100% l1 21KiB` or `solo burst 10us/100us l2 384KiB`;
//! what is not said there is as it was before that word existed.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Serialize};

/// Who else is busy.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Arrangement {
    /// Nobody.
    Solo,
    /// The other threads of the same core, and no other core.
    Siblings,
    /// Other cores, and no other thread of the same core.
    Neighbours,
    /// Every tested cpu.
    #[default]
    All,
}

impl Arrangement {
    /// Every arrangement with its word.
    pub const ALL: [(Arrangement, &'static str); 4] = [
        (Arrangement::Solo, "solo"),
        (Arrangement::Siblings, "siblings"),
        (Arrangement::Neighbours, "neighbours"),
        (Arrangement::All, "all"),
    ];
}

impl fmt::Display for Arrangement {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(Arrangement::ALL.iter().find(|(a, _)| a == self).map_or("", |(_, word)| word))
    }
}

/// How hard.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Pace {
    /// Inside kernels for this part of the time.
    Steady {
        /// From 1 to 100.
        percent: u8,
    },
    /// On and off by turns; at least one run each time.
    Burst {
        /// Microseconds.
        on_us: u32,
        /// Microseconds.
        off_us: u32,
    },
    /// On for the first half of every period. Periods begin at the same distance from the multiples of their length on the
    /// system's monotonic clock, hence on all cpus at once; dithered, each beginning is put off by a random part of the other half.
    Step {
        /// Microseconds.
        period_us: u32,
        /// Not aligned with the other cpus.
        dithered: bool,
    },
}

impl Pace {
    /// Without a pause.
    pub const FULL: Pace = Pace::Steady { percent: 100 };

    /// The part of the time that is spent inside kernels, from 0 to 1.
    pub fn duty(self) -> f64 {
        match self {
            Pace::Steady { percent } => f64::from(percent) / 100.0,
            Pace::Burst { on_us, off_us } => f64::from(on_us) / (f64::from(on_us) + f64::from(off_us)),
            Pace::Step { .. } => 0.5,
        }
    }
}

impl Default for Pace {
    fn default() -> Pace {
        Pace::FULL
    }
}

struct Micros(u32);

impl fmt::Display for Micros {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.0 >= 1000 && self.0.is_multiple_of(1000) {
            write!(f, "{}ms", self.0 / 1000)
        } else {
            write!(f, "{}us", self.0)
        }
    }
}

fn micros(text: &str) -> Option<u32> {
    match (text.strip_suffix("ms"), text.strip_suffix("us")) {
        (Some(ms), _) => ms.parse::<u32>().ok()?.checked_mul(1000),
        (_, Some(us)) => us.parse().ok(),
        _ => None,
    }
}

impl fmt::Display for Pace {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match *self {
            Pace::Steady { percent } => write!(f, "steady {percent}%"),
            Pace::Burst { on_us, off_us } => write!(f, "burst {}/{}", Micros(on_us), Micros(off_us)),
            Pace::Step { period_us, dithered } => {
                write!(f, "step {} {}", Micros(period_us), if dithered { "dithered" } else { "aligned" })
            }
        }
    }
}

/// What came right before.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Before {
    /// Whatever the plan had before.
    #[default]
    Anything,
    /// The hottest work there is, for this many seconds.
    Heated(u16),
    /// Nothing, for this many milliseconds.
    Rested(u16),
}

/// The smallest memory that holds the footprint on this host.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Level {
    /// First-level data cache.
    L1,
    /// Second-level cache.
    L2,
    /// This cpu's share of the third-level cache.
    L3,
    /// Main memory.
    Dram,
}

impl Level {
    const ALL: [(Level, &'static str); 4] =
        [(Level::L1, "l1"), (Level::L2, "l2"), (Level::L3, "l3"), (Level::Dram, "dram")];
}

impl fmt::Display for Level {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(Level::ALL.iter().find(|(l, _)| l == self).map_or("", |(_, word)| word))
    }
}

/// A condition but for its footprint: what a plan varies.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct Setting {
    /// Who else is busy.
    pub arrangement: Arrangement,
    /// How hard.
    pub pace: Pace,
    /// What came before.
    pub before: Before,
}

impl Setting {
    /// Every cpu at full pace: the condition of a sweep.
    pub const PLAIN: Setting = Setting { arrangement: Arrangement::All, pace: Pace::FULL, before: Before::Anything };
}

impl fmt::Display for Setting {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} {}", self.arrangement, self.pace)?;
        match self.before {
            Before::Anything => Ok(()),
            Before::Heated(s) => write!(f, " heated {s}s"),
            Before::Rested(ms) => write!(f, " rested {ms}ms"),
        }
    }
}

/// The whole condition of a slice.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Condition {
    /// What a plan varies.
    pub setting: Setting,
    /// A kernel for two cpus; the record names the second.
    pub paired: bool,
    /// Where the footprint lies, if that is known.
    pub level: Option<Level>,
    /// Footprint in KiB.
    pub kib: u32,
}

impl fmt::Display for Condition {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.setting)?;
        if self.paired {
            f.write_str(" in-pair")?;
        }
        if let Some(level) = self.level {
            write!(f, " {level}")?;
        }
        write!(f, " {}KiB", self.kib)
    }
}

/// The words are no condition.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("not the words of a condition")]
pub struct NoCondition;

impl FromStr for Condition {
    type Err = NoCondition;

    fn from_str(text: &str) -> Result<Condition, NoCondition> {
        parse(text).ok_or(NoCondition)
    }
}

fn parse(text: &str) -> Option<Condition> {
    let mut words = text.split(' ');
    let word = words.next()?;
    let arrangement = Arrangement::ALL.iter().find(|(_, w)| *w == word)?.0;
    let pace = match words.next()? {
        "steady" => {
            Pace::Steady { percent: words.next()?.strip_suffix('%')?.parse().ok().filter(|p| (1..=100).contains(p))? }
        }
        "burst" => {
            let (on, off) = words.next()?.split_once('/')?;
            Pace::Burst { on_us: micros(on)?, off_us: micros(off)? }
        }
        "step" => Pace::Step {
            period_us: micros(words.next()?)?,
            dithered: match words.next()? {
                "dithered" => true,
                "aligned" => false,
                _ => return None,
            },
        },
        _ => return None,
    };
    let mut condition = Condition {
        setting: Setting { arrangement, pace, before: Before::Anything },
        paired: false,
        level: None,
        kib: 0,
    };
    loop {
        match words.next()? {
            "heated" => condition.setting.before = Before::Heated(words.next()?.strip_suffix('s')?.parse().ok()?),
            "rested" => condition.setting.before = Before::Rested(words.next()?.strip_suffix("ms")?.parse().ok()?),
            "in-pair" => condition.paired = true,
            word => {
                if let Some((level, _)) = Level::ALL.iter().find(|(_, w)| *w == word) {
                    condition.level = Some(*level);
                } else {
                    condition.kib = word.strip_suffix("KiB")?.parse().ok()?;
                    return words.next().is_none().then_some(condition);
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_condition_comes_back_from_its_words() {
        let paces = [
            Pace::FULL,
            Pace::Steady { percent: 5 },
            Pace::Burst { on_us: 10, off_us: 100_000 },
            Pace::Burst { on_us: 1500, off_us: 2000 },
            Pace::Step { period_us: 2000, dithered: false },
            Pace::Step { period_us: 500, dithered: true },
        ];
        let befores = [Before::Anything, Before::Heated(10), Before::Rested(1000)];
        for (arrangement, _) in Arrangement::ALL {
            for pace in paces {
                for before in befores {
                    for (paired, level) in [(false, None), (true, Some(Level::L3)), (false, Some(Level::L1))] {
                        let setting = Setting { arrangement, pace, before };
                        let condition = Condition { setting, paired, level, kib: 384 };
                        assert_eq!(condition.to_string().parse(), Ok(condition), "{condition}");
                    }
                }
            }
        }
    }

    #[test]
    fn words_of_older_ledgers_are_understood_and_others_refused() {
        let old: Condition = "all steady 100% 21KiB".parse().unwrap();
        assert_eq!((old.setting, old.paired, old.level, old.kib), (Setting::PLAIN, false, None, 21));
        for bad in [
            "",
            "all",
            "all steady 100%",
            "at start",
            "all steady 0% 9KiB",
            "all steady 100% 9KiB x",
            "some steady 100% 9KiB",
        ] {
            assert_eq!(bad.parse::<Condition>(), Err(NoCondition), "{bad}");
        }
    }
}
