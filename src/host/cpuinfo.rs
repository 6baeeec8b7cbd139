//! `/proc/cpuinfo`, as x86 and aarch64 kernels print it: one block of `key : value` lines a cpu, each opened by
//! `processor`. Formats: `arch/x86/kernel/cpu/proc.c` and `arch/arm64/kernel/cpuinfo.c`, from memory.

use std::collections::BTreeMap;
use std::fmt;

use serde::{Deserialize, Serialize};

use crate::host::cpulist::{CPU_LIMIT, Cpu};
use crate::host::root::{Reading, Root, Why};
use crate::host::text::clean;

/// What a processor says that it is. Absent fields are those that the architecture's kernel does not print.
#[derive(Clone, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
pub struct CpuModel {
    /// `vendor_id` (x86), or `CPU implementer` (aarch64).
    pub vendor: Option<String>,
    /// `cpu family` (x86), or `CPU architecture` (aarch64).
    pub family: Option<String>,
    /// `model` number (x86), or `CPU part` (aarch64).
    pub model: Option<String>,
    /// `stepping` (x86), or variant and revision as in `r3p1` (aarch64).
    pub stepping: Option<String>,
    /// `model name`.
    pub name: Option<String>,
}

impl fmt::Display for CpuModel {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let part = |field: &Option<String>| field.clone().unwrap_or_else(|| "?".to_owned());
        let (vendor, family) = (part(&self.vendor), part(&self.family));
        write!(f, "{vendor} family {family} model {} stepping {}", part(&self.model), part(&self.stepping))?;
        self.name.as_ref().map_or(Ok(()), |name| write!(f, " ({name})"))
    }
}

/// One block of `/proc/cpuinfo`.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct CpuBlock {
    /// What the processor says that it is.
    pub model: CpuModel,
    /// Revision of its microcode, as printed; in a virtual machine the hypervisor's word.
    pub microcode: Option<String>,
    /// The local APIC id: the thread's hardware address (x86).
    pub apic_id: Option<u32>,
    /// Whether the flags name a hypervisor; `None` where there is no `flags` line (aarch64 has `Features`).
    pub hypervisor: Option<bool>,
}

/// The blocks by cpu number; offline cpus have none.
pub type CpuInfo = BTreeMap<Cpu, CpuBlock>;

/// Reads and parses it; unreadable where no block can be found in it.
pub fn read(root: &Root) -> Reading<CpuInfo> {
    root.long_text("proc/cpuinfo").and_then(|text| {
        let info = parse(&text);
        if info.is_empty() { Reading::Unreadable(Why::nonsense(&text)) } else { Reading::Value(info) }
    })
}

/// Parses the text; lines that make no sense are passed over.
pub fn parse(text: &str) -> CpuInfo {
    let mut info = CpuInfo::new();
    let mut current = None;
    let mut arm = (None, None);
    for line in text.lines() {
        let Some((key, value)) = line.split_once(':') else { continue };
        let value = value.trim();
        if key.trim() == "processor" {
            arm = (None, None);
            current = value.parse().ok().filter(|&cpu| cpu < CPU_LIMIT).map(Cpu);
            if let Some(cpu) = current {
                info.insert(cpu, CpuBlock::default());
            }
            continue;
        }
        let Some(block) = current.and_then(|cpu| info.get_mut(&cpu)) else { continue };
        let text = || Some(clean(value, 120)).filter(|value| !value.is_empty());
        match key.trim() {
            "vendor_id" | "CPU implementer" => block.model.vendor = text(),
            "cpu family" | "CPU architecture" => block.model.family = text(),
            "model" | "CPU part" => block.model.model = text(),
            "stepping" => block.model.stepping = text(),
            "model name" => block.model.name = text(),
            "microcode" => block.microcode = text(),
            "apicid" => block.apic_id = value.parse().ok(),
            "flags" => block.hypervisor = Some(value.split_ascii_whitespace().any(|flag| flag == "hypervisor")),
            "CPU variant" => arm.0 = text(),
            "CPU revision" => arm.1 = text(),
            _ => {}
        }
        if let (Some(variant), Some(revision)) = &arm {
            let variant = variant.strip_prefix("0x").unwrap_or(variant);
            block.model.stepping = Some(format!("r{variant}p{revision}"));
        }
    }
    info
}
