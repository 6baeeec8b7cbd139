//! From findings, mismatches and losses to one word per core. The rules are data: one row a rule; the rates that they
//! are built to keep are in `design`.

use std::fmt;

use serde::{Deserialize, Serialize};

use crate::event::{Confirmation, How};
use crate::exit_code::Exit;

/// The word for a core or a host, worst last.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Verdict {
    /// Nothing wrong was seen; worth exactly the bound beside it.
    Clear,
    /// Not enough was run to say anything.
    Untested,
    /// Something was seen that has to be settled.
    Watch,
    /// Take it out of production.
    Withdraw,
}

impl fmt::Display for Verdict {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(match self {
            Verdict::Clear => "clear",
            Verdict::Untested => "untested",
            Verdict::Watch => "watch",
            Verdict::Withdraw => "withdraw",
        })
    }
}

impl Verdict {
    /// What the shell is told.
    pub fn exit(self) -> Exit {
        match self {
            Verdict::Clear => Exit::Clear,
            Verdict::Untested => Exit::CannotDo,
            Verdict::Watch => Exit::Watch,
            Verdict::Withdraw => Exit::Withdraw,
        }
    }
}

/// What is known about one cpu.
#[derive(Clone, Debug, PartialEq)]
pub struct Known {
    /// Runs that count.
    pub runs: u64,
    /// Planned slices with mismatches in this job.
    pub slices_wrong: u64,
    /// Planned slices with mismatches in earlier jobs of the same host and part.
    pub slices_wrong_before: u64,
    /// Slices with mismatches, in this job and earlier ones, that one-off upsets do not explain: `design` says
    /// how many.
    pub occasions_needed: u64,
    /// Kernels whose earlier mismatches on this cpu have not been followed by enough silence yet.
    pub unsettled: u64,
    /// Memory errors were counted while mismatches came or were confirmed.
    pub memory_errors: bool,
    /// Slices of kernels for two cpus with mismatches, in which nobody else was found to be the one.
    pub together_wrong: u64,
    /// Confirmations of this job.
    pub confirmations: Vec<Confirmation>,
    /// Confirmed findings of earlier jobs of the same host and part.
    pub confirmed_before: u64,
    /// Lost workers.
    pub lost: Vec<How>,
}

impl Default for Known {
    fn default() -> Known {
        Known {
            runs: 0,
            slices_wrong: 0,
            slices_wrong_before: 0,
            occasions_needed: 2,
            unsettled: 0,
            memory_errors: false,
            together_wrong: 0,
            confirmations: Vec::new(),
            confirmed_before: 0,
            lost: Vec::new(),
        }
    }
}

/// One rule: when it holds, the verdict is at least this.
pub struct Rule {
    /// In words, for the README and for reports.
    pub when: &'static str,
    /// The verdict.
    pub then: Verdict,
    /// What to do about it.
    pub next: &'static str,
    holds: fn(&Known) -> bool,
}

/// Whether a loss speaks of the core: somebody else's signal does not.
pub fn speaks_of_core(how: &How) -> bool {
    match how {
        How::Signal(n) => ![libc_signal::KILL, libc_signal::TERM, libc_signal::INT, libc_signal::HUP].contains(n),
        How::Hung | How::Exit(_) | How::Babbled(_) => true,
        How::Stopped | How::Starved | How::NotStarted(_) | How::NotPinned(_) | How::Abandoned => false,
    }
}

/// POSIX signal numbers that others send to end a process.
mod libc_signal {
    pub const HUP: i32 = 1;
    pub const INT: i32 = 2;
    pub const KILL: i32 = 9;
    pub const TERM: i32 = 15;
}

/// The rules, strictest first; the README shows the same table and a test holds them equal.
pub static RULES: &[Rule] = &[
    Rule {
        when: "a mismatch was confirmed: wrong again on this core, never on controls, expected words recomputed \
               elsewhere, no memory error counted meanwhile",
        then: Verdict::Withdraw,
        next: "take the core out of production and keep the ledger",
        holds: |k| k.confirmations.contains(&Confirmation::Repeated) && !k.memory_errors,
    },
    Rule {
        when: "mismatches in more slices of this core, in all its windows, than one-off upsets explain (two, after very \
               long tests three or more), and no control, recomputation or memory error speaks against it",
        then: Verdict::Withdraw,
        next: "take the core out of production and keep the ledger",
        holds: |k| {
            let against = [Confirmation::Shared, Confirmation::Refuted];
            k.slices_wrong > 0
                && k.slices_wrong + k.slices_wrong_before >= k.occasions_needed.max(2)
                && k.confirmations.iter().any(|c| *c == Confirmation::Once || *c == Confirmation::Repeated)
                && !k.confirmations.iter().any(|c| against.contains(c))
                && !k.memory_errors
        },
    },
    Rule {
        when: "a confirmed finding from an earlier job of the same host and part is on record",
        then: Verdict::Withdraw,
        next: "the core was convicted before; a clear window does not undo that",
        holds: |k| k.confirmed_before > 0,
    },
    Rule {
        when: "every mismatch was refuted: the reference gives other words than the golden table",
        then: Verdict::Untested,
        next: "reinstall the program; if it recurs, the machine damages the program or its tables",
        holds: |k| !k.confirmations.is_empty() && k.confirmations.iter().all(|c| *c == Confirmation::Refuted),
    },
    Rule {
        when: "any other mismatch",
        then: Verdict::Watch,
        next: "run more windows on this core; what would settle it stands beside it",
        holds: |k| k.slices_wrong > 0 || k.together_wrong > 0 || !k.confirmations.is_empty(),
    },
    Rule {
        when: "an earlier mismatch on this core has not been followed by enough silence in that kernel yet",
        then: Verdict::Watch,
        next: "run more windows on this core; what would settle it stands beside it",
        holds: |k| k.unsettled > 0,
    },
    Rule {
        when: "a worker crashed, hung or babbled on this core",
        then: Verdict::Watch,
        next: "look at the machine-check log and at memory; run again and see whether it recurs on this core",
        holds: |k| k.lost.iter().any(speaks_of_core),
    },
    Rule {
        when: "no run that counts",
        then: Verdict::Untested,
        next: "see the remarks: the core was not available, or every slice was void",
        holds: |k| k.runs == 0,
    },
    Rule {
        when: "nothing of the above",
        then: Verdict::Clear,
        next: "the bound is all that this shows",
        holds: |_| true,
    },
];

/// The rule that decides for one cpu.
pub fn decide(known: &Known) -> &'static Rule {
    RULES.iter().find(|r| (r.holds)(known)).unwrap_or(&RULES[RULES.len() - 1])
}

/// The verdict of a host: its worst cpu's.
pub fn worst(verdicts: impl IntoIterator<Item = Verdict>) -> Verdict {
    verdicts.into_iter().max().unwrap_or(Verdict::Untested)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn known(change: impl FnOnce(&mut Known)) -> Verdict {
        let mut k = Known { runs: 1000, ..Known::default() };
        change(&mut k);
        decide(&k).then
    }

    #[test]
    fn a_single_unrepeated_mismatch_is_watched_and_a_recurring_one_withdrawn() {
        assert_eq!(known(|_| ()), Verdict::Clear);
        assert_eq!(known(|k| k.runs = 0), Verdict::Untested);
        let once = |k: &mut Known| {
            k.slices_wrong = 1;
            k.confirmations = vec![Confirmation::Once];
        };
        assert_eq!(known(once), Verdict::Watch);
        assert_eq!(
            known(|k| {
                once(k);
                k.slices_wrong_before = 1;
            }),
            Verdict::Withdraw
        );
        assert_eq!(known(|k| k.slices_wrong_before = 1), Verdict::Clear);
        assert_eq!(
            known(|k| {
                k.slices_wrong_before = 1;
                k.unsettled = 1;
            }),
            Verdict::Watch
        );
        assert_eq!(known(|k| k.confirmed_before = 1), Verdict::Withdraw);
    }

    #[test]
    fn memory_errors_and_long_records_ask_for_more() {
        let twice = |k: &mut Known| {
            k.slices_wrong = 2;
            k.confirmations = vec![Confirmation::Once];
        };
        assert_eq!(known(twice), Verdict::Withdraw);
        let longer = |k: &mut Known| {
            twice(k);
            k.occasions_needed = 3;
        };
        assert_eq!(known(longer), Verdict::Watch);
        for confirmation in [Confirmation::Once, Confirmation::Repeated] {
            let memory = |k: &mut Known| {
                twice(k);
                k.confirmations = vec![confirmation];
                k.memory_errors = true;
            };
            assert_eq!(known(memory), Verdict::Watch, "{confirmation:?}");
        }
    }

    #[test]
    fn controls_that_fail_and_refuted_tables_accuse_nobody() {
        use Confirmation::{Incomplete, Once, Refuted, Shared};
        let table = [
            (vec![Shared], Verdict::Watch),
            (vec![Incomplete], Verdict::Watch),
            (vec![Refuted], Verdict::Untested),
            (vec![Once, Refuted], Verdict::Watch),
            (vec![Once, Shared], Verdict::Watch),
        ];
        for (confirmations, verdict) in table {
            let text = format!("{confirmations:?}");
            assert_eq!(
                known(|k| {
                    k.slices_wrong = 5;
                    k.confirmations = confirmations;
                }),
                verdict,
                "{text}"
            );
        }
    }

    #[test]
    fn somebody_elses_signal_is_not_held_against_a_core() {
        for signal in [1, 2, 9, 15] {
            assert_eq!(known(|k| k.lost = vec![How::Signal(signal)]), Verdict::Clear);
        }
        for how in [How::Signal(11), How::Signal(4), How::Hung, How::Exit(101)] {
            assert_eq!(known(|k| k.lost = vec![how]), Verdict::Watch);
        }
        for how in [How::Stopped, How::Starved, How::Abandoned] {
            assert_eq!(known(|k| k.lost = vec![how]), Verdict::Clear);
        }
    }
}
