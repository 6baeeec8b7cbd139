//! Which host this is, and which processor stands behind each cpu.
//!
//! Files: kernel documentation `Documentation/ABI/testing/sysfs-firmware-dmi-tables` and
//! `sysfs-devices-system-cpu` (`topology/ppin`, `microcode/version`), manual page machine-id(5); from memory.

use std::collections::BTreeMap;

use crate::host::cpuinfo::{CpuInfo, CpuModel};
use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::placeholder::is_placeholder;
use crate::host::root::{Reading, Root, Why};
use crate::host::text::clean;

/// What the firmware and the installation say of the host. Values are raw: they may be placeholders.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct HostIdentity {
    /// Universally unique id of the machine; readable by root.
    pub product_uuid: Reading<String>,
    /// Serial number of the machine; readable by root.
    pub product_serial: Reading<String>,
    /// Serial number of its main board; readable by root.
    pub board_serial: Reading<String>,
    /// Serial number in the device tree, where firmware describes the machine by one.
    pub tree_serial: Reading<String>,
    /// Id of the operating system's installation: clones of a disk image share it. To be kept from outsiders.
    pub machine_id: Reading<String>,
    /// The host's name in the network.
    pub hostname: Reading<String>,
    /// Who built the machine.
    pub system_vendor: Reading<String>,
    /// What it is called.
    pub product_name: Reading<String>,
    /// Version of the firmware.
    pub firmware: Reading<String>,
    /// Release of the kernel.
    pub kernel: Reading<String>,
}

/// Which processor a cpu is.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct CpuIdentity {
    /// Vendor, family, model, stepping, name.
    pub model: Reading<CpuModel>,
    /// Microcode revision; in a virtual machine the hypervisor's word.
    pub microcode: Reading<String>,
    /// The thread's hardware address (x86).
    pub apic_id: Option<u32>,
    /// Protected processor inventory number: one a socket, the best name of a part.
    pub ppin: Reading<u64>,
}

impl HostIdentity {
    /// Reads it.
    pub fn read(root: &Root) -> HostIdentity {
        let text = |path: &str| root.text(path).map(|text| clean(&text, 200));
        let dmi = |name: &str| text(&format!("sys/class/dmi/id/{name}"));
        let tree = |name: &str| text(&format!("sys/firmware/devicetree/base/{name}"));
        let kernel = |name: &str| text(&format!("proc/sys/kernel/{name}"));
        HostIdentity {
            product_uuid: dmi("product_uuid"),
            product_serial: dmi("product_serial"),
            board_serial: dmi("board_serial"),
            tree_serial: tree("serial-number"),
            machine_id: text("etc/machine-id"),
            hostname: kernel("hostname"),
            system_vendor: dmi("sys_vendor"),
            product_name: dmi("product_name").or_else_absent(|| tree("model")),
            firmware: dmi("bios_version"),
            kernel: kernel("osrelease"),
        }
    }
}

/// The processors of `online` cpus.
pub fn cpu_identities(root: &Root, cpuinfo: &Reading<CpuInfo>, online: &CpuSet) -> BTreeMap<Cpu, CpuIdentity> {
    let read = |cpu: Cpu| {
        let block = match cpuinfo {
            Reading::Value(info) => info.get(&cpu).map_or(Reading::Absent, |block| Reading::Value(block.clone())),
            Reading::Absent => Reading::Absent,
            Reading::Unreadable(why) => Reading::Unreadable(why.clone()),
        };
        let printed = block.clone().and_then(|block| block.microcode.map_or(Reading::Absent, Reading::Value));
        let own = root.text(&format!("sys/devices/system/cpu/cpu{cpu}/microcode/version"));
        let microcode = match own.map(|text| clean(&text, 40)) {
            Reading::Value(text) => Reading::Value(text),
            // what cannot be read here may still be printed there
            other => {
                if printed.value().is_some() {
                    printed
                } else {
                    other.or_else_absent(|| printed)
                }
            }
        };
        CpuIdentity {
            apic_id: block.value().and_then(|block| block.apic_id),
            model: block.map(|block| block.model),
            microcode,
            ppin: root.text(&format!("sys/devices/system/cpu/cpu{cpu}/topology/ppin")).and_then(|text| ppin(&text)),
        }
    };
    online.iter().map(|cpu| (cpu, read(cpu))).collect()
}

/// Hexadecimal with `0x`; 0 and all ones say that the processor keeps its number to itself.
fn ppin(text: &str) -> Reading<u64> {
    let digits = text.strip_prefix("0x").unwrap_or(text);
    let plain = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_hexdigit());
    match plain.then(|| u64::from_str_radix(digits, 16)) {
        Some(Ok(0 | u64::MAX)) => Reading::Absent,
        Some(Ok(number)) => Reading::Value(number),
        _ => Reading::Unreadable(Why::nonsense(text)),
    }
}

/// A reading as far as it identifies something: a placeholder counts as absent.
pub fn usable(reading: &Reading<String>) -> Reading<String> {
    match reading {
        Reading::Value(text) if is_placeholder(text) => Reading::Absent,
        reading => reading.clone(),
    }
}
