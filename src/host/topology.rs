//! Which cpus there are, and where each sits: physical core, socket, die, NUMA node.
//!
//! Files: kernel documentation `Documentation/ABI/stable/sysfs-devices-system-cpu`,
//! `Documentation/admin-guide/cputopology.rst`, `Documentation/ABI/stable/sysfs-devices-node`, from memory.

use std::collections::BTreeMap;

use crate::host::cores::{PhysicalCore, Told, group};
use crate::host::cpuinfo::CpuInfo;
use crate::host::cpulist::{CPU_LIMIT, Core, Cpu, CpuSet};
use crate::host::root::{Reading, Root, Why};

/// Where one online cpu sits.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Place {
    /// The cpu.
    pub cpu: Cpu,
    /// The physical core behind it.
    pub core: Core,
    /// The online cpus of that core, this one among them, as in the kernel's own lists.
    pub siblings: CpuSet,
    /// `physical_package_id`.
    pub socket: Reading<u32>,
    /// `die_id`.
    pub die: Reading<u32>,
    /// `core_id`: the kernel's number, unique within a die only.
    pub core_id: Reading<u32>,
    /// Whether the kernel's list of siblings could be read.
    pub siblings_told: Reading<()>,
    /// NUMA node.
    pub node: Reading<u32>,
    /// Whether the kernel's scheduler keeps other work off it; `None` where that cannot be read.
    pub isolated: Option<bool>,
}

/// The cpus and cores of a host.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Topology {
    /// Online cpus.
    pub cpus: BTreeMap<Cpu, Place>,
    /// Physical cores with at least one online cpu, by number.
    pub cores: Vec<PhysicalCore>,
    /// Cpus that are present and not online; the kernel tells no place of theirs.
    pub offline: CpuSet,
    /// Cpus that the boot parameters keep free of other work.
    pub isolated: Reading<CpuSet>,
    /// Cpus without the periodic tick while one task runs.
    pub nohz_full: Reading<CpuSet>,
    /// Whether any core has two or more threads online.
    pub smt_active: Reading<bool>,
    /// The kernel's list of online cpus.
    pub online_list: Reading<CpuSet>,
    /// What [`Topology::cpus`] rests on, in words: that list, or what took its place.
    pub online_from: &'static str,
    /// Cpus whose sibling lists contradict others: their cores are known less well.
    pub doubtful: CpuSet,
}

const CPUS: &str = "sys/devices/system/cpu";

impl Topology {
    /// Reads it. `fallback` is believed only where neither sysfs nor `/proc/cpuinfo` tells which cpus are online: the
    /// affinity mask of this process.
    pub fn read(root: &Root, cpuinfo: &Reading<CpuInfo>, fallback: &CpuSet) -> Topology {
        let folders: CpuSet = root
            .numbered(CPUS, "cpu")
            .ok()
            .into_iter()
            .flatten()
            .filter(|&number| number < CPU_LIMIT)
            .map(Cpu)
            .collect();
        let online_list = root.cpus(&format!("{CPUS}/online"));
        let (online, online_from) = online(root, &online_list, &folders, cpuinfo, fallback);
        let present = root.cpus(&format!("{CPUS}/present")).ok().unwrap_or(folders);
        let isolated = root.cpus(&format!("{CPUS}/isolated"));
        // some kernels print "(null)" for an empty list here (from memory)
        let nohz_full = match root.cpus(&format!("{CPUS}/nohz_full")) {
            Reading::Unreadable(Why::Nonsense(text)) if text == "(null)" => Reading::Value(CpuSet::new()),
            reading => reading,
        };
        let smt_active = root.number(&format!("{CPUS}/smt/active")).and_then(|active| match active {
            0 | 1 => Reading::Value(active == 1),
            _ => Reading::Unreadable(Why::nonsense(&active.to_string())),
        });
        let told = online.iter().map(|cpu| (cpu, told(root, cpu))).collect();
        let (cores, doubtful) = group(&told);
        let nodes = Nodes::read(root);
        let mut cpus = BTreeMap::new();
        for core in &cores {
            for cpu in core.cpus.iter() {
                let Some(told) = told.get(&cpu).cloned() else { continue };
                let place = Place {
                    cpu,
                    core: core.core,
                    siblings: core.cpus.clone(),
                    socket: told.socket,
                    die: told.die,
                    core_id: told.core_id,
                    siblings_told: told.siblings.map(|_| ()),
                    node: nodes.of(cpu),
                    isolated: isolated.value().map(|set| set.contains(cpu)),
                };
                cpus.insert(cpu, place);
            }
        }
        let offline = present.difference(&online);
        Topology { cpus, cores, offline, isolated, nohz_full, smt_active, online_list, online_from, doubtful }
    }

    /// The online cpus.
    pub fn online(&self) -> CpuSet {
        self.cpus.keys().copied().collect()
    }

    /// Whether `cpu` is online.
    pub fn is_online(&self, cpu: Cpu) -> bool {
        self.cpus.contains_key(&cpu)
    }

    /// The physical core behind an online cpu.
    pub fn core_of(&self, cpu: Cpu) -> Option<&PhysicalCore> {
        self.cores.get(self.cpus.get(&cpu)?.core.0 as usize)
    }

    /// The socket numbers that are known, ascending.
    pub fn sockets(&self) -> Vec<u32> {
        let mut sockets: Vec<u32> = self.cpus.values().filter_map(|place| place.socket.get()).collect();
        sockets.sort_unstable();
        sockets.dedup();
        sockets
    }
}

/// The online cpus and what that rests on: the first of four sources that names any.
fn online(
    root: &Root,
    online_list: &Reading<CpuSet>,
    folders: &CpuSet,
    cpuinfo: &Reading<CpuInfo>,
    fallback: &CpuSet,
) -> (CpuSet, &'static str) {
    // a cpu that cannot be taken offline has no such file
    let on = |cpu: &Cpu| root.number(&format!("{CPUS}/cpu{cpu}/online")).get() != Some(0);
    let sources: [(&dyn Fn() -> CpuSet, &str); 4] = [
        (&|| online_list.value().cloned().unwrap_or_default(), "/sys/devices/system/cpu/online"),
        (&|| folders.iter().filter(on).collect(), "folders of /sys/devices/system/cpu"),
        (&|| cpuinfo.value().into_iter().flatten().map(|(&cpu, _)| cpu).collect(), "/proc/cpuinfo"),
        (&|| fallback.clone(), "affinity mask of this process"),
    ];
    for (source, name) in sources {
        let cpus = source();
        if !cpus.is_empty() {
            return (cpus, name);
        }
    }
    (CpuSet::new(), "nothing")
}

fn told(root: &Root, cpu: Cpu) -> Told {
    let file = |name: &str| format!("{CPUS}/cpu{cpu}/topology/{name}");
    let id = |name: &str| root.number(&file(name)).and_then(id);
    Told {
        // the older name since 2.6, the newer since 5.3 (from memory)
        siblings: root.cpus(&file("core_cpus_list")).or_else_absent(|| root.cpus(&file("thread_siblings_list"))),
        socket: id("physical_package_id"),
        die: id("die_id"),
        // 65535 and -1 both say that the architecture has no clusters
        cluster: id("cluster_id").and_then(|n| if n == 65_535 { Reading::Absent } else { Reading::Value(n) }),
        core_id: id("core_id"),
    }
}

/// Ids are 32-bit; -1 is the kernel's word for "not known".
fn id(number: i64) -> Reading<u32> {
    match u32::try_from(number) {
        Ok(id) => Reading::Value(id),
        Err(_) if number == -1 => Reading::Absent,
        Err(_) => Reading::Unreadable(Why::nonsense(&number.to_string())),
    }
}

/// NUMA nodes: which cpus each has.
struct Nodes {
    node_of: BTreeMap<Cpu, u32>,
    /// What is said of a cpu that no node names.
    otherwise: Reading<u32>,
}

impl Nodes {
    fn read(root: &Root) -> Nodes {
        const NODES: &str = "sys/devices/system/node";
        let mut node_of = BTreeMap::new();
        let mut otherwise = Reading::Absent;
        match root.numbered(NODES, "node") {
            Reading::Value(numbers) => {
                for number in numbers {
                    match root.cpus(&format!("{NODES}/node{number}/cpulist")) {
                        Reading::Value(cpus) => cpus.into_iter().for_each(|cpu| {
                            node_of.entry(cpu).or_insert(number);
                        }),
                        Reading::Unreadable(why) => otherwise = Reading::Unreadable(why),
                        Reading::Absent => {}
                    }
                }
            }
            Reading::Unreadable(why) => otherwise = Reading::Unreadable(why),
            Reading::Absent => {}
        }
        Nodes { node_of, otherwise }
    }

    fn of(&self, cpu: Cpu) -> Reading<u32> {
        self.node_of.get(&cpu).map_or_else(|| self.otherwise.clone(), |&node| Reading::Value(node))
    }
}
