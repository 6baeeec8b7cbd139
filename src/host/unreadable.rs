//! What could not be read on this host, why, and what to do about it.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::root::{Reading, Why};

/// One thing that this host did not tell.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Unreadable {
    /// The thing, with the place where it was looked for.
    pub what: String,
    /// Why it could not be read.
    pub why: String,
    /// One sentence: what to do, or what it means for the results.
    pub remedy: String,
}

/// A thing that is looked for, and what to say where it lacks.
#[derive(Clone, Copy, Debug)]
pub struct Wanted {
    /// Its name, e.g. `socket identity`.
    pub name: &'static str,
    /// Where it stands, e.g. `/sys/devices/system/cpu/cpu*/topology/ppin`.
    pub place: &'static str,
    /// What to do where it is not offered.
    pub if_absent: &'static str,
    /// Whether it comes from hardware that a hypervisor usually hides from its guests.
    pub hidden_from_guests: bool,
}

impl Wanted {
    /// The entry for `reading`, or nothing where it has a value.
    pub fn explain<T>(&self, reading: &Reading<T>, virtualised: Option<bool>) -> Option<Unreadable> {
        Some(self.entry(self.what(""), reading_state(reading)?, virtualised))
    }

    /// One entry for each reason, naming the cpus that it holds for.
    pub fn explain_each<'a, T: 'a>(
        &self,
        readings: impl IntoIterator<Item = (Cpu, &'a Reading<T>)>,
        virtualised: Option<bool>,
    ) -> Vec<Unreadable> {
        let mut states: BTreeMap<State, CpuSet> = BTreeMap::new();
        let mut all = 0;
        for (cpu, reading) in readings {
            all += 1;
            if let Some(state) = reading_state(reading) {
                states.entry(state).or_default().insert(cpu);
            }
        }
        let explain = |(state, cpus): (State, CpuSet)| {
            let on = if cpus.len() == all { String::new() } else { format!(" of cpu {cpus}") };
            self.entry(self.what(&on), state, virtualised)
        };
        states.into_iter().map(explain).collect()
    }

    fn what(&self, on: &str) -> String {
        format!("{}{on} ({})", self.name, self.place)
    }

    fn entry(&self, what: String, state: State, virtualised: Option<bool>) -> Unreadable {
        let (why, remedy) = match state {
            State::Absent if virtualised == Some(true) && self.hidden_from_guests => (
                "not offered inside this virtual machine".to_owned(),
                "read it on the physical host underneath; it counts as unknown here, not as zero".to_owned(),
            ),
            State::Absent => ("not offered by this kernel or machine".to_owned(), self.if_absent.to_owned()),
            State::Unreadable(Why::Denied) => {
                (Why::Denied.to_string(), format!("run as root, or let this user read {}", self.place))
            }
            State::Unreadable(why @ Why::Failed(_)) => (
                why.to_string(),
                "look for the driver's complaint in the kernel log; it counts as unknown here".to_owned(),
            ),
            State::Unreadable(why) => (
                why.to_string(),
                "it was left out and counts as unknown; look at the file, and at the firmware or driver behind it"
                    .to_owned(),
            ),
        };
        Unreadable { what, why, remedy }
    }
}

#[derive(PartialEq, Eq, PartialOrd, Ord)]
enum State {
    Absent,
    Unreadable(Why),
}

fn reading_state<T>(reading: &Reading<T>) -> Option<State> {
    match reading {
        Reading::Value(_) => None,
        Reading::Absent => Some(State::Absent),
        Reading::Unreadable(why) => Some(State::Unreadable(why.clone())),
    }
}
