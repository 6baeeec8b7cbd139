//! Stable names of a host, and of what stands behind each cpu.
//!
//! A key is the first 128 bits of the SHA-256 of the best identity that could be read, as 32 hexadecimal digits, with
//! the source that it rests on. The identity itself stays out: machine-id(5) asks for that, and serial numbers need
//! not travel with every ledger. As root more can be read than as another user, so the same host may get another
//! best key: [`compare`] looks through all keys of the host before it says that two differ.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

use crate::host::cores::CoreAddress;
use crate::host::cpulist::Cpu;
use crate::host::identity::{CpuIdentity, HostIdentity, usable};
use crate::host::root::Reading;
use crate::host::topology::Topology;

/// What a host key rests on, the best first.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum HostSource {
    /// The firmware's universally unique id.
    ProductUuid,
    /// Serial number, with the builder's name and the product's.
    ProductSerial,
    /// Serial number of the main board, with the same.
    BoardSerial,
    /// Serial number in the device tree.
    TreeSerial,
    /// The installation's id: clones of one disk image share it.
    MachineId,
    /// The host's name: changes freely, so it only keeps hosts of one network apart.
    Hostname,
}

impl HostSource {
    /// Its name, as in JSON; part of every key, so it never changes.
    pub fn name(self) -> &'static str {
        match self {
            HostSource::ProductUuid => "product_uuid",
            HostSource::ProductSerial => "product_serial",
            HostSource::BoardSerial => "board_serial",
            HostSource::TreeSerial => "tree_serial",
            HostSource::MachineId => "machine_id",
            HostSource::Hostname => "hostname",
        }
    }
}

/// A host's name that stays.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct HostKey {
    /// 32 hexadecimal digits.
    pub key: String,
    /// What it rests on.
    pub source: HostSource,
}

/// What a cpu key rests on, the best first.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum CpuSource {
    /// The processor's own inventory number and the place inside it: follows the part into another host.
    Ppin,
    /// The host key and the hardware's own numbers for the place.
    HostAndPlace,
    /// The host key and the cpu number, which may shift between boots.
    HostAndNumber,
    /// The same as the two above inside a virtual machine: names no physical core.
    Virtual,
}

/// A name of what stands behind one cpu.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct CpuKey {
    /// The processor in the socket: 32 hexadecimal digits, the same for all its cpus.
    pub part: String,
    /// The thread: 32 hexadecimal digits, different for every cpu.
    pub key: String,
    /// What both rest on.
    pub source: CpuSource,
}

/// Whether a recorded host is this one.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SameHost {
    /// The identity that the record rests on is the same here.
    Yes,
    /// That identity can be read here and is another.
    No,
    /// That identity cannot be read here.
    Unknown,
}

/// Every key that can be made for this host, the best first; empty where nothing identifies it.
pub fn host_keys(identity: &HostIdentity) -> Vec<HostKey> {
    let maker = || {
        let part = |reading: &Reading<String>| reading.value().cloned().unwrap_or_default();
        format!("{}\0{}", part(&identity.system_vendor), part(&identity.product_name))
    };
    let sources = [
        (HostSource::ProductUuid, &identity.product_uuid, String::new()),
        (HostSource::ProductSerial, &identity.product_serial, maker()),
        (HostSource::BoardSerial, &identity.board_serial, maker()),
        (HostSource::TreeSerial, &identity.tree_serial, maker()),
        (HostSource::MachineId, &identity.machine_id, String::new()),
        (HostSource::Hostname, &identity.hostname, String::new()),
    ];
    let key = |(source, reading, maker): (HostSource, &Reading<String>, String)| {
        let value = usable(reading).ok()?.to_lowercase();
        Some(HostKey { key: digest(&["host 1", source.name(), &maker, &value]), source })
    };
    sources.into_iter().filter_map(key).collect()
}

/// Whether the host of a record is the one with these keys.
pub fn compare(recorded: &HostKey, here: &[HostKey]) -> SameHost {
    match here.iter().find(|key| key.source == recorded.source) {
        Some(key) if key.key == recorded.key => SameHost::Yes,
        Some(_) => SameHost::No,
        None => SameHost::Unknown,
    }
}

/// The keys of the online cpus. `host` is the best key of the host, `virtualised` as far as that is known.
pub fn cpu_keys(
    topology: &Topology,
    identities: &BTreeMap<Cpu, CpuIdentity>,
    host: Option<&HostKey>,
    virtualised: Option<bool>,
) -> BTreeMap<Cpu, CpuKey> {
    let host = host.map_or("", |host| host.key.as_str());
    let key = |cpu: Cpu| {
        let identity = identities.get(&cpu);
        let core = topology.core_of(cpu);
        let address = core.and_then(|core| core.address);
        // among the threads that are online: taking a sibling offline may rename the other
        let nth = core.map_or(0, |core| core.cpus.iter().take_while(|&other| other < cpu).count());
        let nth = format!(" thread {nth}");
        let apic = identity.and_then(|identity| identity.apic_id).map(|apic| format!(" apic {apic}"));
        let ppin = identity.and_then(|identity| identity.ppin.get());
        let model = identity.and_then(|identity| identity.model.value()).map(ToString::to_string).unwrap_or_default();
        let socket = address.map_or("?".to_owned(), |a| a.socket.to_string());
        let part = match ppin {
            Some(ppin) => digest(&["part 1", &format!("{ppin:#x}")]),
            None => digest(&["part 1", host, &socket, &model]),
        };
        let (place, source) = match (ppin, address) {
            // without the socket: a part may move to another one, and apic ids change with the socket
            (Some(_), Some(a)) => (CoreAddress { socket: 0, ..a }.to_string() + &nth, CpuSource::Ppin),
            (None, Some(a)) => (a.to_string() + &apic.unwrap_or(nth), CpuSource::HostAndPlace),
            (_, None) => (format!("{host} cpu {cpu}"), CpuSource::HostAndNumber),
        };
        let source = if virtualised == Some(true) { CpuSource::Virtual } else { source };
        CpuKey { key: digest(&["cpu 1", &part, &place]), part, source }
    };
    topology.cpus.keys().map(|&cpu| (cpu, key(cpu))).collect()
}

/// The first 128 bits of SHA-256 over the parts, each closed by a NUL.
fn digest(parts: &[&str]) -> String {
    let mut sha = Sha256::new();
    for part in parts {
        sha.update(part.as_bytes());
        sha.update([0]);
    }
    sha.finalize().iter().take(16).map(|byte| format!("{byte:02x}")).collect()
}
