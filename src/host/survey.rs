//! What a host is, as one document: the `survey` command's part that speaks of the machine.
//!
//! Serial numbers, the installation's id and inventory numbers stay out of it; keys made from them stand in.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::host::caches::{Cache, distinct};
use crate::host::core_types::CoreType;
use crate::host::counters::{Counter, Counters};
use crate::host::cpuinfo::CpuModel;
use crate::host::cpulist::{Core, Cpu, CpuSet};
use crate::host::identity::usable;
use crate::host::keys::{CpuKey, HostKey};
use crate::host::lacks::lacks;
use crate::host::machine::Host;
use crate::host::root::Reading;
use crate::host::sensors::SensorEntry;
use crate::host::unreadable::Unreadable;

/// The document. What is null was not told; `unreadable` says why.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct HostSurvey {
    /// Online cpus, ascending.
    pub cpus: Vec<SurveyedCpu>,
    /// Cpus that are present and switched off.
    pub offline: CpuSet,
    /// What the list of cpus rests on.
    pub online_from: String,
    /// Whether a core has two or more threads online.
    pub smt_active: Option<bool>,
    /// Kinds of core, where there are several.
    pub core_types: Vec<CoreType>,
    /// Each cache once.
    pub caches: Vec<Cache>,
    /// Sensors that are there, read once.
    pub sensors: Vec<SensorEntry>,
    /// Error counters, summed by kind.
    pub counters: Vec<SurveyedCounter>,
    /// What could not be read.
    pub unreadable: Vec<Unreadable>,
    /// Which host it is.
    pub identity: SurveyedIdentity,
    /// Whether a cpu number may name no physical core; null where nothing tells.
    pub virtualised: Option<bool>,
    /// What that rests on.
    pub virtualised_because: String,
    /// Which cpus this process may use.
    pub allowed: SurveyedAllowed,
}

/// One online cpu.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SurveyedCpu {
    /// Its number.
    pub cpu: Cpu,
    /// The physical core behind it, numbered over the whole host.
    pub core: Core,
    /// Its socket, in the hardware's numbers.
    pub socket: Option<u32>,
    /// Its die within the socket.
    pub die: Option<u32>,
    /// Its memory node.
    pub node: Option<u32>,
    /// Online cpus of the same core, this one among them.
    pub siblings: CpuSet,
    /// The kernel's core number, unique within a die only.
    pub core_id: Option<u32>,
    /// Whether other work is kept off it.
    pub isolated: Option<bool>,
    /// Whether this process may run on it.
    pub allowed: bool,
    /// Microcode revision.
    pub microcode: Option<String>,
    /// Stable name of what stands behind it.
    pub key: Option<CpuKey>,
}

/// Which host it is.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SurveyedIdentity {
    /// The best key, with its source; null where nothing identifies the host.
    pub host_key: Option<HostKey>,
    /// All keys that can be made, the best first.
    pub host_keys: Vec<HostKey>,
    /// The host's name.
    pub hostname: Option<String>,
    /// Who built the machine.
    pub system_vendor: Option<String>,
    /// What it is called.
    pub product_name: Option<String>,
    /// Version of its firmware.
    pub firmware: Option<String>,
    /// Release of the kernel.
    pub kernel: Option<String>,
    /// Architecture that this program was built for.
    pub architecture: String,
    /// Processor models with their cpus.
    pub processors: Vec<SurveyedProcessor>,
}

/// A processor model.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SurveyedProcessor {
    /// What it says that it is.
    #[serde(flatten)]
    pub model: CpuModel,
    /// Online cpus of this model.
    pub cpus: CpuSet,
}

/// Error counters of one kind.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SurveyedCounter {
    /// `MCE`, `MCP`, `THR`, `DFR`, `TRM`, or memory errors and their place.
    pub counter: String,
    /// Sum since boot over those that could be read; null where none could.
    pub total: Option<u64>,
    /// For interrupts: cpus whose count is not zero.
    pub nonzero: CpuSet,
}

/// Which cpus this process may use.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SurveyedAllowed {
    /// The affinity mask, which decides.
    pub mask: CpuSet,
    /// The control group's cpuset, for information; null where it was not told.
    pub cpuset: Option<CpuSet>,
    /// Where that was read.
    pub cpuset_file: Option<String>,
}

impl HostSurvey {
    /// Describes `host`; sensors and counters are read now.
    pub fn of(host: &Host) -> HostSurvey {
        let counters = Counters::read(&host.root);
        let text = |reading: &Reading<String>| reading.value().cloned();
        let cpus = host.topology.cpus.values().map(|place| SurveyedCpu {
            cpu: place.cpu,
            core: place.core,
            socket: place.socket.get(),
            die: place.die.get(),
            node: place.node.get(),
            siblings: place.siblings.clone(),
            core_id: place.core_id.get(),
            isolated: place.isolated,
            allowed: host.allowed.contains(place.cpu),
            microcode: host.cpu_identities.get(&place.cpu).and_then(|identity| text(&identity.microcode)),
            key: host.cpu_keys.get(&place.cpu).cloned(),
        });
        HostSurvey {
            cpus: cpus.collect(),
            offline: host.topology.offline.clone(),
            online_from: host.topology.online_from.to_owned(),
            smt_active: host.topology.smt_active.get(),
            core_types: host.core_types.clone(),
            caches: distinct(&host.caches),
            sensors: host.sensors.list(),
            counters: summed(&counters),
            unreadable: lacks(host, &counters),
            identity: SurveyedIdentity {
                host_key: host.host_key().cloned(),
                host_keys: host.host_keys.clone(),
                hostname: text(&host.identity.hostname),
                system_vendor: usable(&host.identity.system_vendor).ok(),
                product_name: usable(&host.identity.product_name).ok(),
                firmware: text(&host.identity.firmware),
                kernel: text(&host.identity.kernel),
                architecture: std::env::consts::ARCH.to_owned(),
                processors: processors(host),
            },
            virtualised: host.virtualised.answer,
            virtualised_because: host.virtualised.because.clone(),
            allowed: SurveyedAllowed {
                mask: host.allowed.mask.clone(),
                cpuset: host.allowed.cpuset.value().cloned(),
                cpuset_file: host.allowed.cpuset_file.clone(),
            },
        }
    }
}

fn processors(host: &Host) -> Vec<SurveyedProcessor> {
    let mut models: BTreeMap<CpuModel, CpuSet> = BTreeMap::new();
    for (&cpu, identity) in &host.cpu_identities {
        if let Some(model) = identity.model.value() {
            models.entry(model.clone()).or_default().insert(cpu);
        }
    }
    models.into_iter().map(|(model, cpus)| SurveyedProcessor { model, cpus }).collect()
}

fn summed(counters: &Counters) -> Vec<SurveyedCounter> {
    let mut sums: BTreeMap<String, SurveyedCounter> = BTreeMap::new();
    for (counter, reading) in &counters.values {
        let (name, cpu) = match counter {
            Counter::Interrupt { row, cpu } => (row.name().to_owned(), Some(*cpu)),
            other => (other.to_string(), None),
        };
        let empty = || SurveyedCounter { counter: name.clone(), total: None, nonzero: CpuSet::new() };
        let sum = sums.entry(name.clone()).or_insert_with(empty);
        if let Some(count) = reading.get() {
            sum.total = Some(sum.total.unwrap_or(0).saturating_add(count));
            if let (Some(cpu), 1..) = (cpu, count) {
                sum.nonzero.insert(cpu);
            }
        }
    }
    sums.into_values().collect()
}
