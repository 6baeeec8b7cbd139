//! Whether this is a virtual machine, in which a cpu number names no physical core.

use crate::host::cpuinfo::CpuInfo;
use crate::host::identity::HostIdentity;
use crate::host::root::{Reading, Root};
use crate::host::text::clean;

/// Words in the names that hypervisors give their machines; generic ones, in lower case.
const WORDS: [&str; 6] = ["virtual", "kvm", "qemu", "xen", "hvm", "bochs"];

/// The answer and what it rests on.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Virtualised {
    /// `None` where nothing tells.
    pub answer: Option<bool>,
    /// What it rests on, in words.
    pub because: String,
}

impl Virtualised {
    /// Judges by the cpu's hypervisor flag, the kernel's own word, the device tree, and the machine's name, in that
    /// order.
    pub fn judge(root: &Root, cpuinfo: &Reading<CpuInfo>, identity: &HostIdentity) -> Virtualised {
        let yes = |because: String| Virtualised { answer: Some(true), because };
        let flags = cpuinfo.value().into_iter().flatten().filter_map(|(_, block)| block.hypervisor);
        let flag = flags.reduce(|any, flag| any | flag);
        if flag == Some(true) {
            return yes("the cpu's hypervisor flag is set".to_owned());
        }
        if let Reading::Value(kind) = root.text("sys/hypervisor/type") {
            return yes(format!("/sys/hypervisor/type says {:?}", clean(&kind, 40)));
        }
        for place in ["hypervisor/compatible", "compatible"] {
            let text = root.text(&format!("sys/firmware/devicetree/base/{place}")).ok().unwrap_or_default();
            if place == "hypervisor/compatible" && !text.is_empty() || text.contains("dummy-virt") {
                return yes(format!("the device tree's {place} says {:?}", clean(&text, 40)));
            }
        }
        let names = [("vendor", &identity.system_vendor), ("product", &identity.product_name)];
        for (what, reading) in names {
            let Some(name) = reading.value() else { continue };
            let low = name.to_lowercase();
            if WORDS.iter().any(|word| low.contains(word)) {
                return yes(format!("the machine's {what} is {name:?}"));
            }
        }
        match (flag, names.iter().any(|(_, reading)| reading.value().is_some())) {
            (Some(_), _) => {
                Virtualised { answer: Some(false), because: "the cpu's hypervisor flag is not set".to_owned() }
            }
            (None, true) => Virtualised {
                answer: Some(false),
                because: "no sign of a hypervisor in the machine's name or the device tree".to_owned(),
            },
            (None, false) => Virtualised { answer: None, because: "this host shows no sign either way".to_owned() },
        }
    }
}
