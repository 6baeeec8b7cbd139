//! Everything known of this host, read once at the start.

use std::collections::BTreeMap;

use crate::host::allowed::{Allowed, AllowedError};
use crate::host::caches::Caches;
use crate::host::core_types::{CoreType, core_types};
use crate::host::cpuinfo::{self, CpuInfo};
use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::identity::{CpuIdentity, HostIdentity, cpu_identities};
use crate::host::keys::{CpuKey, HostKey, cpu_keys, host_keys};
use crate::host::root::{Reading, Root};
use crate::host::sensors::Sensors;
use crate::host::topology::Topology;
use crate::host::virtualised::Virtualised;

/// A host as it was when it was read.
#[derive(Clone, Debug)]
pub struct Host {
    /// Where it was read.
    pub root: Root,
    /// `/proc/cpuinfo`.
    pub cpuinfo: Reading<CpuInfo>,
    /// Cpus, cores, sockets, nodes.
    pub topology: Topology,
    /// Caches by online cpu.
    pub caches: BTreeMap<Cpu, Caches>,
    /// Kinds of core, where there are several.
    pub core_types: Vec<CoreType>,
    /// Which host it is.
    pub identity: HostIdentity,
    /// Which processor each online cpu is.
    pub cpu_identities: BTreeMap<Cpu, CpuIdentity>,
    /// Keys of the host, the best first; empty where nothing identifies it.
    pub host_keys: Vec<HostKey>,
    /// Keys by online cpu.
    pub cpu_keys: BTreeMap<Cpu, CpuKey>,
    /// Whether it is a virtual machine.
    pub virtualised: Virtualised,
    /// What can be measured.
    pub sensors: Sensors,
    /// Which cpus this process may use.
    pub allowed: Allowed,
}

impl Host {
    /// Reads this host for the calling thread.
    pub fn read(root: &Root) -> Result<Host, AllowedError> {
        Ok(Host::from_parts(root, Allowed::of_this_process(root)?))
    }

    /// Reads a host as if the calling thread's affinity mask were `mask`.
    pub fn read_with_mask(root: &Root, mask: CpuSet) -> Host {
        Host::from_parts(root, Allowed::with_mask(root, mask))
    }

    fn from_parts(root: &Root, allowed: Allowed) -> Host {
        let cpuinfo = cpuinfo::read(root);
        let topology = Topology::read(root, &cpuinfo, &allowed.mask);
        let online = topology.online();
        let identity = HostIdentity::read(root);
        let cpu_identities = cpu_identities(root, &cpuinfo, &online);
        let virtualised = Virtualised::judge(root, &cpuinfo, &identity);
        let host_keys = host_keys(&identity);
        Host {
            root: root.clone(),
            caches: online.iter().map(|cpu| (cpu, Caches::read(root, cpu))).collect(),
            core_types: core_types(root, &cpuinfo, &online),
            cpu_keys: cpu_keys(&topology, &cpu_identities, host_keys.first(), virtualised.answer),
            sensors: Sensors::discover(root, &topology),
            cpuinfo,
            topology,
            identity,
            cpu_identities,
            host_keys,
            virtualised,
            allowed,
        }
    }

    /// The best key of the host.
    pub fn host_key(&self) -> Option<&HostKey> {
        self.host_keys.first()
    }
}
