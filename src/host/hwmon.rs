//! Temperatures of the processors, from the hardware monitoring folders.
//!
//! Files: kernel documentation `Documentation/hwmon/sysfs-interface.rst` (`name`, `temp*_input` in m°C,
//! `temp*_label`), `coretemp.rst` (labels `Core N` and `Package id N`), `k10temp.rst` (`Tctl`, `Tdie`, `TccdN`); from
//! memory. Only monitors of processors are listed; those of disks, boards and supplies are left out.

use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::root::{Reading, Root, Why};
use crate::host::text::clean;
use crate::host::topology::Topology;

/// What a temperature is the temperature of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, serde::Serialize, serde::Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Scope {
    /// One physical core.
    Core,
    /// A whole processor, or the control value that stands for it.
    Package,
    /// A part of a processor that no cpu can be given to for certain.
    Part,
}

/// One temperature of a processor.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Temperature {
    /// Driver and label, e.g. `coretemp Core 5`.
    pub name: String,
    /// What it is the temperature of.
    pub scope: Scope,
    /// Online cpus that it speaks of; empty where that cannot be told.
    pub cpus: CpuSet,
    /// File, relative to the root.
    pub(super) path: String,
    /// Among those of the same scope and cpus the lowest is preferred.
    rank: u8,
}

const FOLDER: &str = "sys/class/hwmon";
/// Drivers whose temperatures are those of processors; `cpu*thermal*` is matched besides.
const DRIVERS: [&str; 3] = ["coretemp", "k10temp", "k8temp"];

/// Finds the processors' temperatures; absent where there is no hardware monitoring at all.
pub fn discover(root: &Root, topology: &Topology) -> Reading<Vec<Temperature>> {
    root.numbered(FOLDER, "hwmon").map(|numbers| {
        let chips = numbers.into_iter().flat_map(|number| chip(root, topology, &format!("{FOLDER}/hwmon{number}")));
        chips.collect()
    })
}

/// The temperature that stands for `cpu`: its core's, else its package's.
pub fn best(list: &[Temperature], cpu: Cpu) -> Option<&Temperature> {
    let usable = |t: &&Temperature| t.scope != Scope::Part && t.cpus.contains(cpu);
    list.iter().filter(usable).min_by_key(|t| (t.scope, t.rank))
}

/// One reading in °C. Values outside -100 … 250 °C are no temperature.
pub fn read(root: &Root, temperature: &Temperature) -> Reading<f64> {
    root.number(&temperature.path).and_then(|millidegrees| match millidegrees {
        -100_000..=250_000 => Reading::Value(millidegrees as f64 / 1000.0),
        _ => Reading::Unreadable(Why::nonsense(&millidegrees.to_string())),
    })
}

fn chip(root: &Root, topology: &Topology, folder: &str) -> Vec<Temperature> {
    let name = root.text(&format!("{folder}/name")).ok().map(|name| clean(&name, 40)).unwrap_or_default();
    let watches_processor = DRIVERS.contains(&name.as_str()) || name.starts_with("cpu") && name.contains("thermal");
    if !watches_processor {
        return Vec::new();
    }
    let inputs: Vec<(String, String)> = root
        .names(folder)
        .ok()
        .into_iter()
        .flatten()
        .filter(|file| file.starts_with("temp") && file.ends_with("_input"))
        .map(|file| {
            let label = root.text(&format!("{folder}/{}_label", file.trim_end_matches("_input")));
            (format!("{folder}/{file}"), label.ok().map(|label| clean(&label, 40)).unwrap_or_default())
        })
        .collect();
    let package = inputs.iter().find_map(|(_, label)| label.strip_prefix("Package id ")?.parse().ok());
    let members = members(root, topology, folder, package);
    let temperature = |(path, label): (String, String)| {
        let core_id: Option<u32> = label.strip_prefix("Core ").and_then(|number| number.parse().ok());
        let of_core = |&cpu: &Cpu| topology.cpus.get(&cpu).is_some_and(|place| place.core_id.get() == core_id);
        let (scope, cpus, rank) = match (core_id, label.as_str()) {
            (Some(_), _) => (Scope::Core, members.iter().filter(of_core).collect(), 0),
            // Tdie is the temperature, Tctl the same with an offset on some models, made for fan control
            (None, "Tdie") => (Scope::Package, members.clone(), 0),
            (None, "Tctl" | "") => (Scope::Package, members.clone(), 1),
            (None, label) if label.starts_with("Package id ") => (Scope::Package, members.clone(), 0),
            (None, _) => (Scope::Part, CpuSet::new(), 0),
        };
        Temperature { name: format!("{name} {label}").trim().to_owned(), scope, cpus, path, rank }
    };
    inputs.into_iter().map(temperature).collect()
}

/// The online cpus of the processor that a monitor watches; empty where that cannot be told.
fn members(root: &Root, topology: &Topology, folder: &str, package: Option<usize>) -> CpuSet {
    let chosen = |test: &dyn Fn(&crate::host::topology::Place) -> bool| -> CpuSet {
        topology.cpus.values().filter(|place| test(place)).map(|place| place.cpu).collect()
    };
    if let Some(package) = package {
        // the label counts dies over all sockets, in their order; with one die a socket that is the socket
        let mut dies: Vec<(Option<u32>, Option<u32>)> =
            topology.cpus.values().map(|place| (place.socket.get(), place.die.get())).collect();
        dies.sort_unstable();
        dies.dedup();
        let several = dies.windows(2).any(|pair| pair[0].0 == pair[1].0);
        if !several {
            return chosen(&|place| place.socket.get().map(|socket| socket as usize) == Some(package));
        }
        let Some(&die) = dies.get(package) else { return CpuSet::new() };
        return chosen(&|place| (place.socket.get(), place.die.get()) == die);
    }
    if topology.sockets().len() <= 1 {
        return topology.online();
    }
    let node = root.number(&format!("{folder}/device/numa_node")).get().and_then(|node| u32::try_from(node).ok());
    let Some(node) = node else { return CpuSet::new() };
    // a node lies within one socket, a socket may hold several nodes
    let socket = topology.cpus.values().find(|place| place.node.get() == Some(node)).and_then(|p| p.socket.get());
    chosen(&|place| socket.is_some() && place.socket.get() == socket)
}
