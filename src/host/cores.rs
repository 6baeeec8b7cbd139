//! Which cpus are threads of one physical core.
//!
//! The kernel's sibling lists are believed where they agree: a list names the cpu itself, and each cpu that it names
//! has the same list. Otherwise equal (socket, die, cluster, core id) means the same core, and a cpu without either
//! is taken to be a core of its own.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::host::cpulist::{Core, Cpu, CpuSet};
use crate::host::root::Reading;

/// Where a core sits, in the hardware's own numbers: they stay when cpu numbers shift between boots.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct CoreAddress {
    /// The kernel's `physical_package_id`; 0 where it is not offered.
    pub socket: u32,
    /// `die_id`; 0 where it is not offered.
    pub die: u32,
    /// `cluster_id`, only where two cores could not be told apart without it.
    pub cluster: Option<u32>,
    /// `core_id`, which is unique within a die (or cluster) only.
    pub core_id: u32,
}

impl std::fmt::Display for CoreAddress {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "socket {} die {}", self.socket, self.die)?;
        if let Some(cluster) = self.cluster {
            write!(f, " cluster {cluster}")?;
        }
        write!(f, " core {}", self.core_id)
    }
}

/// A physical core and the cpus behind it that are online.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct PhysicalCore {
    /// Its number on this host.
    pub core: Core,
    /// Its threads.
    pub cpus: CpuSet,
    /// Its place; `None` where the kernel tells none, or the same for two cores.
    pub address: Option<CoreAddress>,
}

/// What one cpu's `topology` folder says.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Told {
    /// Threads of the same core, itself among them.
    pub siblings: Reading<CpuSet>,
    /// `physical_package_id`.
    pub socket: Reading<u32>,
    /// `die_id`.
    pub die: Reading<u32>,
    /// `cluster_id`.
    pub cluster: Reading<u32>,
    /// `core_id`.
    pub core_id: Reading<u32>,
}

impl Told {
    fn address(&self) -> Option<CoreAddress> {
        let or_zero = |reading: &Reading<u32>| match reading {
            Reading::Value(number) => Some(*number),
            Reading::Absent => Some(0),
            Reading::Unreadable(_) => None,
        };
        let core_id = self.core_id.get()?;
        let cluster = self.cluster.get();
        Some(CoreAddress { socket: or_zero(&self.socket)?, die: or_zero(&self.die)?, cluster, core_id })
    }
}

/// The cores of the cpus in `told`, numbered from 0, and the cpus whose sibling lists contradict others.
pub fn group(told: &BTreeMap<Cpu, Told>) -> (Vec<PhysicalCore>, CpuSet) {
    let online: CpuSet = told.keys().copied().collect();
    let lists: BTreeMap<Cpu, CpuSet> =
        told.iter().filter_map(|(&cpu, told)| Some((cpu, told.siblings.value()?.intersection(&online)))).collect();
    // a list is looked at once, by its first cpu: all that it names must have the same
    let agreed = |cpu: Cpu| {
        let list = lists.get(&cpu)?;
        let agree = list.contains(cpu) && list.iter().all(|other| lists.get(&other) == Some(list));
        agree.then_some(list)
    };
    let mut groups: Vec<CpuSet> = Vec::new();
    let mut by_address: BTreeMap<CoreAddress, CpuSet> = BTreeMap::new();
    let mut doubtful = CpuSet::new();
    let mut placed = CpuSet::new();
    for (&cpu, told) in told {
        if placed.contains(cpu) {
            continue;
        }
        if let Some(list) = agreed(cpu) {
            list.iter().for_each(|cpu| {
                placed.insert(cpu);
            });
            groups.push(list.clone());
            continue;
        }
        if lists.contains_key(&cpu) {
            doubtful.insert(cpu);
        }
        match told.address() {
            Some(address) => {
                by_address.entry(address).or_default().insert(cpu);
            }
            None => groups.push(CpuSet::from_iter([cpu])),
        }
    }
    groups.extend(by_address.into_values());
    (number(groups, told), doubtful)
}

/// Numbers the groups by place, those without one last, by their lowest cpu.
fn number(groups: Vec<CpuSet>, told: &BTreeMap<Cpu, Told>) -> Vec<PhysicalCore> {
    let full: Vec<Option<CoreAddress>> = groups
        .iter()
        .map(|cpus| {
            let mut addresses = cpus.iter().filter_map(|cpu| told.get(&cpu)).map(Told::address);
            let first = addresses.next().flatten();
            // threads of one core that claim different places have none
            if addresses.all(|other| other == first) { first } else { None }
        })
        .collect();
    let short = |address: CoreAddress| CoreAddress { cluster: None, ..address };
    let mut seen: BTreeMap<CoreAddress, u32> = BTreeMap::new();
    for address in full.iter().flatten() {
        *seen.entry(short(*address)).or_default() += 1;
        if address.cluster.is_some() {
            *seen.entry(*address).or_default() += 1;
        }
    }
    let unique = |address: &CoreAddress| seen.get(address) == Some(&1);
    let told_apart = |address: CoreAddress| [short(address), address].into_iter().find(unique);
    let mut cores: Vec<PhysicalCore> = groups
        .into_iter()
        .zip(full)
        .map(|(cpus, address)| PhysicalCore { core: Core(0), cpus, address: address.and_then(told_apart) })
        .collect();
    cores.sort_by_key(|core| (core.address.is_none(), core.address, core.cpus.first()));
    for (index, core) in cores.iter_mut().enumerate() {
        core.core = Core(index as u32);
    }
    cores
}
