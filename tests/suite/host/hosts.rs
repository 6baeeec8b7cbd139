//! Made-up hosts, after the formats of these kernel documents, from memory: `Documentation/admin-guide/cputopology.rst`
//! and `ABI/stable/sysfs-devices-system-cpu` (topology, cache), `ABI/stable/sysfs-devices-node`,
//! `hwmon/{sysfs-interface,coretemp,k10temp}.rst`, `power/powercap/powercap.rst`, `admin-guide/RAS/main.rst` (edac),
//! `ABI/testing/sysfs-firmware-dmi-tables`; `/proc/cpuinfo` and `/proc/interrupts` as the x86 and arm64 kernels print
//! them.

use std::fmt::Write;

use super::tree::Tree;

const CPUS: &str = "sys/devices/system/cpu";

/// Lists and the `topology` folder of one cpu. `siblings` are the threads of its core.
fn topology(tree: &Tree, cpu: u32, socket: i64, die: i64, core_id: i64, siblings: &str) {
    let folder = format!("{CPUS}/cpu{cpu}/topology");
    tree.line(&format!("{folder}/physical_package_id"), socket)
        .line(&format!("{folder}/die_id"), die)
        .line(&format!("{folder}/core_id"), core_id)
        .line(&format!("{folder}/core_cpus_list"), siblings)
        .line(&format!("{folder}/thread_siblings_list"), siblings);
}

fn lists(tree: &Tree, online: &str, offline: &str, present: &str) {
    tree.line(&format!("{CPUS}/online"), online)
        .line(&format!("{CPUS}/offline"), offline)
        .line(&format!("{CPUS}/present"), present)
        .line(&format!("{CPUS}/possible"), present)
        .line(&format!("{CPUS}/isolated"), "")
        .line(&format!("{CPUS}/nohz_full"), "(null)")
        // not cpus, though their names begin like those
        .folder(&format!("{CPUS}/cpufreq"))
        .folder(&format!("{CPUS}/cpuidle"));
}

fn cache(tree: &Tree, cpu: u32, index: u32, level: u32, kind: &str, size: &str, shared: &str) {
    let folder = format!("{CPUS}/cpu{cpu}/cache/index{index}");
    tree.line(&format!("{folder}/level"), level)
        .line(&format!("{folder}/type"), kind)
        .line(&format!("{folder}/size"), size)
        .line(&format!("{folder}/shared_cpu_list"), shared);
}

fn x86_block(cpu: u32, socket: i64, core_id: i64, apic: u32, flags: &str) -> String {
    format!(
        "processor\t: {cpu}\nvendor_id\t: GenuineIntel\ncpu family\t: 6\nmodel\t\t: 106\n\
         model name\t: Made-Up(R) CPU @ 2.00GHz\nstepping\t: 6\nmicrocode\t: 0xd0003a5\ncpu MHz\t\t: 2000.000\n\
         cache size\t: 24576 KB\nphysical id\t: {socket}\ncore id\t\t: {core_id}\napicid\t\t: {apic}\n\
         flags\t\t: fpu vme de pse tsc msr {flags}\npower management:\n\n"
    )
}

/// `/proc/interrupts`: header of online cpus, device rows, architecture rows, and two that count for no cpu.
pub fn interrupts(cpus: &[u32], rows: &[(&str, &[u64])]) -> String {
    let mut text = String::from("           ");
    cpus.iter().for_each(|cpu| write!(text, "CPU{cpu:<8}").expect("text"));
    text.push_str("\n  24:");
    cpus.iter().for_each(|_| text.push_str("         17"));
    text.push_str(" PCI-MSIX-0000:00:02.0   1-edge      virtio1-req.0\n");
    for (name, counts) in rows {
        write!(text, "{name:>4}:").expect("text");
        counts.iter().for_each(|count| write!(text, " {count:>10}").expect("text"));
        text.push_str("   Some interrupts\n");
    }
    text + "ERR:          0\nMIS:          0\n"
}

/// Two sockets of four cores of two threads: cpus 0-3 and 8-11 in socket 0, 4-7 and 12-15 in socket 1. Core ids have
/// gaps and repeat over the sockets.
pub fn server() -> Tree {
    let tree = Tree::new();
    lists(&tree, "0-15", "", "0-15");
    tree.line(&format!("{CPUS}/smt/active"), 1).line(&format!("{CPUS}/isolated"), "3,11");
    let core_ids = [0, 1, 8, 9];
    let mut cpuinfo = String::new();
    for cpu in 0..16u32 {
        let (socket, place, thread) = (i64::from(cpu / 4 % 2), cpu % 4, cpu / 8);
        let core_id = core_ids[place as usize];
        let siblings = format!("{},{}", cpu % 8, cpu % 8 + 8);
        let package = if socket == 0 { "0-3,8-11" } else { "4-7,12-15" };
        topology(&tree, cpu, socket, 0, core_id, &siblings);
        tree.line(
            &format!("{CPUS}/cpu{cpu}/topology/ppin"),
            format_args!("0x{:x}", 0x1f2e_3d4c_0000_u64 + socket as u64),
        );
        cache(&tree, cpu, 0, 1, "Data", "48K", &siblings);
        cache(&tree, cpu, 1, 1, "Instruction", "32K", &siblings);
        cache(&tree, cpu, 2, 2, "Unified", "1280K", &siblings);
        cache(&tree, cpu, 3, 3, "Unified", "24576K", package);
        tree.line(&format!("{CPUS}/cpu{cpu}/cpufreq/scaling_cur_freq"), 2_000_000 + u64::from(cpu))
            .line(&format!("{CPUS}/cpu{cpu}/cpufreq/cpuinfo_max_freq"), 3_400_000)
            .line(&format!("{CPUS}/cpu{cpu}/thermal_throttle/core_throttle_count"), if cpu % 8 == 5 { 7 } else { 0 })
            .line(&format!("{CPUS}/cpu{cpu}/thermal_throttle/package_throttle_count"), socket * 9)
            .line(&format!("{CPUS}/cpu{cpu}/microcode/version"), "0xd0003a5");
        if cpu > 0 {
            tree.line(&format!("{CPUS}/cpu{cpu}/online"), 1);
        }
        let apic = (socket as u32) << 6 | (core_id as u32) << 1 | thread;
        cpuinfo += &x86_block(cpu, socket, core_id, apic, "mce ht avx2");
    }
    tree.file("proc/cpuinfo", cpuinfo);
    for (node, cpus) in [(0, "0-3,8-11"), (1, "4-7,12-15")] {
        tree.line(&format!("sys/devices/system/node/node{node}/cpulist"), cpus);
        let hwmon = format!("sys/class/hwmon/hwmon{}", node + 1);
        tree.line(&format!("{hwmon}/name"), "coretemp");
        tree.line(&format!("{hwmon}/temp1_label"), format_args!("Package id {node}"));
        tree.line(&format!("{hwmon}/temp1_input"), 60_000 + node * 1000);
        for (place, core_id) in core_ids.into_iter().enumerate() {
            tree.line(&format!("{hwmon}/temp{}_label", core_id + 2), format_args!("Core {core_id}"));
            tree.line(&format!("{hwmon}/temp{}_input", core_id + 2), 40_000 + node * 10_000 + place as u32 * 500);
        }
        let zone = format!("sys/class/powercap/intel-rapl:{node}");
        tree.line(&format!("{zone}/name"), format_args!("package-{node}"))
            .line(&format!("{zone}/energy_uj"), 123_456_789 + node)
            .line(&format!("{zone}/max_energy_range_uj"), 262_143_328_850u64);
        tree.line(&format!("sys/class/powercap/intel-rapl:{node}:0/name"), "dram");
        let controller = format!("sys/devices/system/edac/mc/mc{node}");
        tree.line(&format!("{controller}/ce_count"), node * 3)
            .line(&format!("{controller}/ue_count"), 0)
            .line(&format!("{controller}/dimm0/dimm_ce_count"), node * 3)
            .line(&format!("{controller}/dimm0/dimm_ue_count"), 0);
    }
    tree.line("sys/class/hwmon/hwmon0/name", "nvme").line("sys/class/hwmon/hwmon0/temp1_input", 31_850);
    let zero = [0u64; 16];
    let mut polls = [4u64; 16];
    polls[15] = 5;
    let cpus: Vec<u32> = (0..16).collect();
    let rows: [(&str, &[u64]); 5] = [("NMI", &zero), ("TRM", &zero), ("THR", &zero), ("MCE", &zero), ("MCP", &polls)];
    tree.file("proc/interrupts", interrupts(&cpus, &rows));
    dmi(&tree, "4C4C4544-0042-3510-8052-B4C04F4D3332", "7D2K9R3", "CN7475141B00ZX");
    tree.line("etc/machine-id", "7f0c1f5b2c864f7e9d3a5b0c8e1d2f34")
        .line("proc/sys/kernel/hostname", "rack7-node3")
        .line("proc/sys/kernel/osrelease", "6.1.0-18-amd64")
        .line("proc/self/cgroup", "0::/system.slice/some.service")
        .line("sys/fs/cgroup/cpuset.cpus.effective", "0-15")
        .file("var/lib/rasdaemon/ras-mc_event.db", b"SQLite format 3\0");
    tree
}

pub fn dmi(tree: &Tree, uuid: &str, serial: &str, board: &str) {
    tree.line("sys/class/dmi/id/product_uuid", uuid)
        .line("sys/class/dmi/id/product_serial", serial)
        .line("sys/class/dmi/id/board_serial", board)
        .line("sys/class/dmi/id/sys_vendor", "Maker of Servers")
        .line("sys/class/dmi/id/product_name", "Server 2000")
        .line("sys/class/dmi/id/bios_version", "2.4.8");
}

/// One socket: two cores of two threads (0-3), four of one (4-7), told by the counters' cpu lists.
pub fn hybrid() -> Tree {
    let tree = Tree::new();
    lists(&tree, "0-7", "", "0-7");
    let mut cpuinfo = String::new();
    for cpu in 0..8u32 {
        let big = cpu < 4;
        let core_id = if big { i64::from(cpu / 2 * 4) } else { i64::from(cpu + 4) };
        let siblings = if big { format!("{}-{}", cpu & !1, cpu | 1) } else { cpu.to_string() };
        topology(&tree, cpu, 0, 0, core_id, &siblings);
        cache(&tree, cpu, 0, 1, "Data", if big { "48K" } else { "32K" }, &siblings);
        cache(&tree, cpu, 2, 2, "Unified", if big { "1280K" } else { "2048K" }, if big { &siblings } else { "4-7" });
        cache(&tree, cpu, 3, 3, "Unified", "12288K", "0-7");
        // favoured cores of one kind differ a little
        let top = [5_000_000, 5_000_000, 4_900_000, 4_900_000][cpu as usize % 4];
        tree.line(&format!("{CPUS}/cpu{cpu}/cpufreq/cpuinfo_max_freq"), if big { top } else { 3_800_000 });
        cpuinfo += &x86_block(cpu, 0, core_id, cpu * 2, "avx2");
        if core_id % 2 == 0 || !big {
            let hwmon = "sys/class/hwmon/hwmon4";
            tree.line(&format!("{hwmon}/temp{}_label", core_id + 2), format_args!("Core {core_id}"));
            tree.line(&format!("{hwmon}/temp{}_input", core_id + 2), 50_000 + core_id * 100);
        }
    }
    tree.file("proc/cpuinfo", cpuinfo)
        .line("sys/class/hwmon/hwmon4/name", "coretemp")
        .line("sys/class/hwmon/hwmon4/temp1_label", "Package id 0")
        .line("sys/class/hwmon/hwmon4/temp1_input", 61_000)
        .line("sys/devices/cpu_core/cpus", "0-3")
        .line("sys/devices/cpu_atom/cpus", "4-7")
        .line("sys/devices/system/node/node0/cpulist", "0-7");
    dmi(&tree, "03000200-0400-0500-0006-000700080009", "To Be Filled By O.E.M.", "Default string");
    tree.line("etc/machine-id", "0b5b1d2e3f405162738495a6b7c8d9e0");
    tree
}

/// aarch64 without threads: two clusters of four cores of two kinds, core ids that repeat over the clusters, no die
/// ids, a device tree in the place of DMI, no machine check rows.
pub fn arm() -> Tree {
    let tree = Tree::new();
    lists(&tree, "0-7", "", "0-7");
    let mut cpuinfo = String::new();
    for cpu in 0..8u32 {
        topology(&tree, cpu, 0, 0, i64::from(cpu % 4), &cpu.to_string());
        tree.remove(&format!("{CPUS}/cpu{cpu}/topology/die_id"));
        tree.line(&format!("{CPUS}/cpu{cpu}/topology/cluster_id"), cpu / 4);
        tree.line(&format!("{CPUS}/cpu{cpu}/cpu_capacity"), if cpu < 4 { 446 } else { 1024 });
        tree.line(&format!("{CPUS}/cpu{cpu}/cpufreq/scaling_cur_freq"), 1_500_000);
        let part = if cpu < 4 { "0xd03" } else { "0xd08" };
        cpuinfo += &format!(
            "processor\t: {cpu}\nBogoMIPS\t: 125.00\nFeatures\t: fp asimd evtstrm aes pmull sha1 sha2 crc32\n\
             CPU implementer\t: 0x41\nCPU architecture: 8\nCPU variant\t: 0x1\nCPU part\t: {part}\nCPU revision\t: 2\n\n"
        );
    }
    let cpus: Vec<u32> = (0..8).collect();
    tree.file("proc/cpuinfo", cpuinfo)
        .file("sys/firmware/devicetree/base/serial-number", b"c1a5e0f00d77\0")
        .file("sys/firmware/devicetree/base/model", b"Maker Board Rev 2\0")
        .file("sys/firmware/devicetree/base/compatible", b"maker,board\0maker,soc\0")
        .line("sys/class/hwmon/hwmon0/name", "cpu_thermal")
        .line("sys/class/hwmon/hwmon0/temp1_input", 47_222)
        .file("proc/interrupts", interrupts(&cpus, &[("IPI0", &[9; 8])]));
    tree
}

/// The server seen from a container that got cpus 2 and 3 of it: no DMI, no powercap, its own control group as root.
pub fn container() -> Tree {
    let tree = server();
    tree.remove("sys/class/dmi")
        .remove("sys/class/powercap")
        .remove("var")
        .line("proc/self/cgroup", "0::/")
        .line("sys/fs/cgroup/cpuset.cpus.effective", "2-3");
    tree
}

/// Cpus 0, 2, 3 and 6 online of eight present, three cores of two threads and one of one; node 1 has no cpu, node 2 has.
pub fn holes() -> Tree {
    let tree = Tree::new();
    lists(&tree, "0,2-3,6", "1,4-5,7,8-63", "0-7");
    for (cpu, core_id, siblings) in [(0, 0, "0"), (2, 1, "2-3"), (3, 1, "2-3"), (6, 12, "6")] {
        topology(&tree, cpu, 3, 0, core_id, siblings);
    }
    for cpu in [1, 4, 5, 7] {
        tree.line(&format!("{CPUS}/cpu{cpu}/online"), 0);
    }
    tree.line("sys/devices/system/node/node1/cpulist", "")
        .line("sys/devices/system/node/node2/cpulist", "0,2-3,6")
        .file("proc/interrupts", interrupts(&[0, 2, 3, 6], &[("MCE", &[0, 1, 2, 3]), ("MCP", &[9, 9, 9, 9])]));
    tree
}

/// One cpu in a virtual machine.
pub fn single() -> Tree {
    let tree = Tree::new();
    lists(&tree, "0", "", "0");
    topology(&tree, 0, 0, 0, 0, "0");
    tree.file("proc/cpuinfo", x86_block(0, 0, 0, 0, "hypervisor"))
        .file("proc/interrupts", interrupts(&[0], &[("MCE", &[0]), ("MCP", &[3])]));
    tree
}

/// Nothing at all.
pub fn nothing() -> Tree {
    Tree::new()
}
