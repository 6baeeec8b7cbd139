//! Data caches of each cpu: level 1 data, level 2, level 3.
//!
//! Files: kernel documentation `Documentation/ABI/testing/sysfs-devices-system-cpu` (`cpu*/cache/index*/`), from
//! memory: `size` is printed in KiB with a `K`, `type` is `Data`, `Instruction` or `Unified`.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::root::{Reading, Root, Why};

/// One cache and the cpus that share it.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
pub struct Cache {
    /// 1, 2 or 3.
    pub level: u8,
    /// Size in KiB, never 0.
    pub kib: u32,
    /// Cpus that share it.
    pub cpus: CpuSet,
}

/// The caches that data of one cpu pass through.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Caches {
    /// Level 1, data.
    pub l1d: Reading<Cache>,
    /// Level 2.
    pub l2: Reading<Cache>,
    /// Level 3.
    pub l3: Reading<Cache>,
}

impl Caches {
    /// Reads the caches of `cpu`.
    pub fn read(root: &Root, cpu: Cpu) -> Caches {
        let folder = format!("sys/devices/system/cpu/cpu{cpu}/cache");
        let missing = || match root.numbered(&folder, "index") {
            Reading::Unreadable(why) => Reading::Unreadable(why),
            _ => Reading::Absent,
        };
        let mut caches = Caches { l1d: missing(), l2: missing(), l3: missing() };
        for index in root.numbered(&folder, "index").ok().unwrap_or_default() {
            let index = format!("{folder}/index{index}");
            if !matches!(root.text(&format!("{index}/type")).ok().as_deref(), Some("Data" | "Unified")) {
                continue;
            }
            let level = root.number(&format!("{index}/level")).get();
            let slot = match level {
                Some(1) => &mut caches.l1d,
                Some(2) => &mut caches.l2,
                Some(3) => &mut caches.l3,
                _ => continue,
            };
            let level = level.unwrap_or(0) as u8;
            // a sharing list that cannot be read leaves a cache of this cpu alone, which is what is certain
            let cpus = root.cpus(&format!("{index}/shared_cpu_list")).ok().filter(|set| set.contains(cpu));
            let cpus = cpus.unwrap_or_else(|| CpuSet::from_iter([cpu]));
            *slot = root.text(&format!("{index}/size")).and_then(|size| match kib(&size) {
                Some(kib) => Reading::Value(Cache { level, kib, cpus }),
                None => Reading::Unreadable(Why::nonsense(&size)),
            });
        }
        caches
    }

    /// Those that are known, level 1 first.
    pub fn known(&self) -> impl Iterator<Item = &Cache> {
        [&self.l1d, &self.l2, &self.l3].into_iter().filter_map(Reading::value)
    }
}

/// Each cache once, by level and first cpu.
pub fn distinct(caches: &BTreeMap<Cpu, Caches>) -> Vec<Cache> {
    let mut list: Vec<&Cache> = caches.values().flat_map(Caches::known).collect();
    list.sort_by_key(|cache| (cache.level, cache.cpus.first(), &cache.cpus, cache.kib));
    list.dedup();
    list.into_iter().cloned().collect()
}

/// A size as the kernel prints it, in KiB; the largest accepted is 64 GiB.
fn kib(text: &str) -> Option<u32> {
    let (digits, scale) = match text.as_bytes().last()? {
        b'K' => (&text[..text.len() - 1], 1),
        b'M' => (&text[..text.len() - 1], 1024),
        _ => return None,
    };
    let number: u32 = digits.bytes().all(|b| b.is_ascii_digit()).then(|| digits.parse().ok())??;
    number.checked_mul(scale).filter(|&kib| kib > 0 && kib <= 64 << 20)
}
