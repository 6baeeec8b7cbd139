//! Cores of different kinds in one host, where the host shows it.
//!
//! Four signs, the surest first: the performance counters' cpu lists (`/sys/devices/cpu_core/cpus` and
//! `cpu_atom/cpus`, kernel documentation `perf-intel-hybrid`, from memory), different models in `/proc/cpuinfo`,
//! `cpu_capacity` (kernel documentation `ABI/testing/sysfs-devices-system-cpu`), and the highest frequency. Capacity
//! and frequency also differ a little between favoured cores of one kind, so values within a tenth count as one kind.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::host::cpuinfo::{CpuBlock, CpuInfo, CpuModel};
use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::root::{Reading, Root};

/// Cpus of one kind.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct CoreType {
    /// What tells it from the others, e.g. `core`, `atom`, `capacity 1024`.
    pub name: String,
    /// The sign that it rests on.
    pub sign: String,
    /// Its online cpus.
    pub cpus: CpuSet,
}

/// The kinds of core among the cpus `online`: two or more of them, or none where nothing shows a difference.
pub fn core_types(root: &Root, cpuinfo: &Reading<CpuInfo>, online: &CpuSet) -> Vec<CoreType> {
    let by_counters = || {
        let lists = ["core", "atom", "lowpower"].into_iter().filter_map(|name| {
            let cpus = root.cpus(&format!("sys/devices/cpu_{name}/cpus")).ok()?.intersection(online);
            Some((name.to_owned(), cpus))
        });
        kinds("counter units of different kinds", lists.collect())
    };
    let by_model = || {
        let mut models: BTreeMap<&CpuModel, CpuSet> = BTreeMap::new();
        let told = |(cpu, block): &(&Cpu, &CpuBlock)| online.contains(**cpu) && block.model != CpuModel::default();
        for (&cpu, block) in cpuinfo.value().into_iter().flatten().filter(told) {
            models.entry(&block.model).or_default().insert(cpu);
        }
        kinds("models in /proc/cpuinfo", models.into_iter().map(|(model, cpus)| (model.to_string(), cpus)).collect())
    };
    let by_number = |file: &str, sign: &str, name: &dyn Fn(u64) -> String| {
        let values = online.iter().filter_map(|cpu| {
            let value = root.count(&format!("sys/devices/system/cpu/cpu{cpu}/{file}")).get()?;
            (value > 0).then_some((value, cpu))
        });
        kinds(sign, clusters(values.collect()).into_iter().map(|(top, cpus)| (name(top), cpus)).collect())
    };
    let capacity = || by_number("cpu_capacity", "cpu_capacity", &|top| format!("capacity {top}"));
    let frequency =
        || by_number("cpufreq/cpuinfo_max_freq", "highest frequency", &|top| format!("up to {} MHz", top / 1000));
    by_counters().or_else(by_model).or_else(capacity).or_else(frequency).unwrap_or_default()
}

fn kinds(sign: &str, groups: Vec<(String, CpuSet)>) -> Option<Vec<CoreType>> {
    let kinds: Vec<CoreType> = groups
        .into_iter()
        .filter(|(_, cpus)| !cpus.is_empty())
        .map(|(name, cpus)| CoreType { name, sign: sign.to_owned(), cpus })
        .collect();
    (kinds.len() > 1).then_some(kinds)
}

/// Joins values whose neighbours, in falling order, lie within a tenth; each group with its highest value.
fn clusters(mut values: Vec<(u64, Cpu)>) -> Vec<(u64, CpuSet)> {
    values.sort_unstable_by(|a, b| b.cmp(a));
    let mut groups: Vec<(u64, CpuSet)> = Vec::new();
    let mut last = 0;
    for (value, cpu) in values {
        match groups.last_mut() {
            // last >= value, so nothing here can overflow or go below zero
            Some((_, cpus)) if last - value <= last / 10 => {
                cpus.insert(cpu);
            }
            _ => groups.push((value, CpuSet::from_iter([cpu]))),
        }
        last = value;
    }
    groups
}
