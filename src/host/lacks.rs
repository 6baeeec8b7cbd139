//! The list of what this host did not tell: one entry for each thing and reason, with a remedy.

use crate::host::counters::{Counters, Row};
use crate::host::identity::usable;
use crate::host::machine::Host;
use crate::host::root::{Reading, Root};
use crate::host::unreadable::{Unreadable, Wanted};

const fn wanted(name: &'static str, place: &'static str, if_absent: &'static str) -> Wanted {
    Wanted { name, place, if_absent, hidden_from_guests: false }
}

const fn hardware(name: &'static str, place: &'static str, if_absent: &'static str) -> Wanted {
    Wanted { name, place, if_absent, hidden_from_guests: true }
}

const ONLINE: Wanted = wanted(
    "list of online cpus",
    "/sys/devices/system/cpu/online",
    "mount sysfs on /sys; until then the cpus come from a weaker source, and their cores and sockets are not known",
);
const CPUINFO: Wanted = wanted(
    "processor model and flags",
    "/proc/cpuinfo",
    "mount proc on /proc; until then no model, and no sign of a virtual machine, can be recorded",
);
const SOCKET: Wanted = wanted(
    "socket",
    "/sys/devices/system/cpu/cpu*/topology/physical_package_id",
    "results still name the cpu, but cannot name the part to replace; use a kernel that tells the topology",
);
const DIE: Wanted = wanted(
    "die",
    "/sys/devices/system/cpu/cpu*/topology/die_id",
    "one die a socket is assumed; a kernel from 5.2 on tells it",
);
const CORE_ID: Wanted = wanted(
    "core id",
    "/sys/devices/system/cpu/cpu*/topology/core_id",
    "cores are told apart by cpu number, which may shift between boots; use a kernel that tells the topology",
);
const SIBLINGS: Wanted = wanted(
    "threads of one core",
    "/sys/devices/system/cpu/cpu*/topology/{core_cpus_list,thread_siblings_list}",
    "cpus with equal core ids count as one core, others as cores of their own",
);
const NODE: Wanted = wanted(
    "memory node",
    "/sys/devices/system/node/node*/cpulist",
    "memory counts as one node; a kernel built with NUMA tells them apart",
);
const ISOLATED: Wanted = wanted(
    "isolated cpus",
    "/sys/devices/system/cpu/isolated",
    "no cpu is taken to be isolated; look for isolcpus= in /proc/cmdline",
);
const L1D: Wanted =
    wanted("level 1 data cache", "/sys/devices/system/cpu/cpu*/cache/index*/", "footprints are chosen by default size");
const L2: Wanted =
    wanted("level 2 cache", "/sys/devices/system/cpu/cpu*/cache/index*/", "footprints are chosen by default size");
const L3: Wanted = wanted(
    "level 3 cache",
    "/sys/devices/system/cpu/cpu*/cache/index*/",
    "some processors have none; footprints are chosen by default size",
);
const TEMPERATURE: Wanted = hardware(
    "temperature",
    "/sys/class/hwmon/hwmon*/temp*_input",
    "load the monitoring driver of this processor, for example with modprobe coretemp or modprobe k10temp",
);
const FREQUENCY: Wanted = hardware(
    "present frequency",
    "/sys/devices/system/cpu/cpu*/cpufreq/scaling_cur_freq",
    "load a cpufreq driver, or allow the operating system to govern frequency in the firmware's settings",
);
const CORE_THROTTLES: Wanted = hardware(
    "throttling of the core",
    "/sys/devices/system/cpu/cpu*/thermal_throttle/core_throttle_count",
    "only some vendors' processors count it; watch temperature and frequency instead",
);
const PACKAGE_THROTTLES: Wanted = hardware(
    "throttling of the package",
    "/sys/devices/system/cpu/cpu*/thermal_throttle/package_throttle_count",
    "only some vendors' processors count it; watch temperature and frequency instead",
);
const ENERGY: Wanted = hardware(
    "energy",
    "/sys/class/powercap/intel-rapl:*/energy_uj",
    "load the driver with modprobe intel_rapl_msr; it serves several vendors' processors",
);
const MICROCODE: Wanted = wanted(
    "microcode revision",
    "/sys/devices/system/cpu/cpu*/microcode/version",
    "some architectures have none; record the firmware's version instead",
);
const PPIN: Wanted = hardware(
    "inventory number of the processor",
    "/sys/devices/system/cpu/cpu*/topology/ppin",
    "not every processor has one; enable it in the firmware's settings where it can be, or note the serial number by hand",
);
const PRODUCT_UUID: Wanted = wanted(
    "id of the machine",
    "/sys/class/dmi/id/product_uuid",
    "the host key rests on a weaker identity; have the firmware's identity filled in",
);
const PRODUCT_SERIAL: Wanted = wanted(
    "serial number of the machine",
    "/sys/class/dmi/id/product_serial",
    "have it filled in with the vendor's own tool",
);
const BOARD_SERIAL: Wanted = wanted(
    "serial number of the main board",
    "/sys/class/dmi/id/board_serial",
    "have it filled in with the vendor's own tool",
);
const MACHINE_ID: Wanted = wanted(
    "id of the installation",
    "/etc/machine-id",
    "create it with systemd-machine-id-setup, once for every host and never in a disk image",
);
const MACHINE_CHECKS: Wanted = hardware(
    "machine check counts",
    "/proc/interrupts, row MCE",
    "this architecture or kernel does not count them there; look into the service processor's event log",
);
const THRESHOLDS: Wanted = hardware(
    "counts of corrected-error thresholds",
    "/proc/interrupts, row THR",
    "this kernel does not count them there; look into the service processor's event log",
);
const MEMORY_ERRORS: Wanted = hardware(
    "memory error counts",
    "/sys/devices/system/edac/mc/mc*/",
    "load the error detection driver of this memory controller (modules *_edac); memory without error correction has none",
);
const LOG: Wanted = wanted(
    "machine check log",
    "/var/lib/rasdaemon/ras-mc_event.db",
    "have a daemon of the operating system keep what the kernel reports of hardware errors; until then only the counts above are known",
);
const CPUSET: Wanted = wanted(
    "cpuset of this control group",
    "/sys/fs/cgroup/**/cpuset.cpus.effective",
    "the affinity mask decides; why a cpu is withheld cannot be said",
);
const KERNEL: Wanted =
    wanted("kernel release", "/proc/sys/kernel/osrelease", "mount proc on /proc; until then it is not recorded");

/// What `host` did not tell, and of `counters` what is missing.
pub fn lacks(host: &Host, counters: &Counters) -> Vec<Unreadable> {
    let vm = host.virtualised.answer;
    let mut list = Vec::new();
    let places = || host.topology.cpus.values();
    list.extend(ONLINE.explain(&host.topology.online_list, vm));
    list.extend(CPUINFO.explain(&host.cpuinfo, vm));
    list.extend(SIBLINGS.explain_each(places().map(|p| (p.cpu, &p.siblings_told)), vm));
    list.extend(doubtful(host));
    for (wanted, field) in [
        (SOCKET, (|p| &p.socket) as fn(&crate::host::topology::Place) -> &Reading<u32>),
        (DIE, |p| &p.die),
        (CORE_ID, |p| &p.core_id),
        (NODE, |p| &p.node),
    ] {
        list.extend(wanted.explain_each(places().map(|p| (p.cpu, field(p))), vm));
    }
    list.extend(ISOLATED.explain(&host.topology.isolated, vm));
    list.extend(L1D.explain_each(host.caches.iter().map(|(&cpu, caches)| (cpu, &caches.l1d)), vm));
    list.extend(L2.explain_each(host.caches.iter().map(|(&cpu, caches)| (cpu, &caches.l2)), vm));
    list.extend(L3.explain_each(host.caches.iter().map(|(&cpu, caches)| (cpu, &caches.l3)), vm));
    sensors(host, &mut list);
    let processors = || host.cpu_identities.iter();
    list.extend(MICROCODE.explain_each(processors().map(|(&cpu, identity)| (cpu, &identity.microcode)), vm));
    list.extend(PPIN.explain_each(processors().map(|(&cpu, identity)| (cpu, &identity.ppin)), vm));
    identity(host, &mut list);
    let row = |row| match &counters.rows {
        Reading::Value(rows) if !rows.contains(&row) => Reading::Absent,
        rows => rows.clone(),
    };
    list.extend(MACHINE_CHECKS.explain(&row(Row::MachineCheck), vm));
    list.extend(THRESHOLDS.explain(&row(Row::Threshold), vm));
    list.extend(MEMORY_ERRORS.explain(&some(counters.controllers.clone()), vm));
    for (counter, reading) in counters.values.iter().filter(|(_, reading)| matches!(reading, Reading::Unreadable(_))) {
        let one = wanted("one error counter", "/proc/interrupts or /sys/devices/system/edac/mc/", "");
        let entry = one.explain(reading, vm);
        list.extend(entry.map(|entry| Unreadable { what: counter.to_string(), ..entry }));
    }
    list.extend(LOG.explain(&log(&host.root), vm));
    list.extend(CPUSET.explain(&host.allowed.cpuset, vm));
    list
}

/// A list that is there and empty offers as little as one that is absent.
fn some<T>(reading: Reading<Vec<T>>) -> Reading<Vec<T>> {
    reading.and_then(|list| if list.is_empty() { Reading::Absent } else { Reading::Value(list) })
}

fn log(root: &Root) -> Reading<()> {
    if root.exists("var/lib/rasdaemon/ras-mc_event.db") { Reading::Value(()) } else { Reading::Absent }
}

fn doubtful(host: &Host) -> Option<Unreadable> {
    let cpus = &host.topology.doubtful;
    (!cpus.is_empty()).then(|| Unreadable {
        what: format!("{} of cpu {cpus} ({})", SIBLINGS.name, SIBLINGS.place),
        why: "the lists of these cpus contradict each other".to_owned(),
        remedy: "cpus with equal core ids count as one core, others as cores of their own; check the firmware"
            .to_owned(),
    })
}

fn sensors(host: &Host, list: &mut Vec<Unreadable>) {
    let vm = host.virtualised.answer;
    let sensors = &host.sensors;
    let temperatures = some(sensors.temperatures.clone());
    list.extend(TEMPERATURE.explain(&temperatures, vm));
    for temperature in temperatures.value().into_iter().flatten() {
        let entry = TEMPERATURE.explain(&sensors.temperature(temperature), vm);
        list.extend(entry.map(|entry| Unreadable { what: format!("temperature {}", temperature.name), ..entry }));
    }
    list.extend(FREQUENCY.explain_each(sensors.frequencies().iter().map(|(&cpu, r)| (cpu, r)), vm));
    list.extend(CORE_THROTTLES.explain_each(sensors.core_throttles().iter().map(|(&cpu, r)| (cpu, r)), vm));
    list.extend(PACKAGE_THROTTLES.explain_each(sensors.package_throttles().iter().map(|(&cpu, r)| (cpu, r)), vm));
    let energies = some(sensors.energies.clone());
    list.extend(ENERGY.explain(&energies, vm));
    for energy in energies.value().into_iter().flatten() {
        let entry = ENERGY.explain(&sensors.energy(energy), vm);
        list.extend(entry.map(|entry| Unreadable { what: format!("energy of {}", energy.name), ..entry }));
    }
}

fn identity(host: &Host, list: &mut Vec<Unreadable>) {
    let vm = host.virtualised.answer;
    let identity = &host.identity;
    for (wanted, reading) in [
        (PRODUCT_UUID, &identity.product_uuid),
        (PRODUCT_SERIAL, &identity.product_serial),
        (BOARD_SERIAL, &identity.board_serial),
        (MACHINE_ID, &identity.machine_id),
    ] {
        if let (Reading::Value(text), Reading::Absent) = (reading, usable(reading)) {
            list.push(Unreadable {
                what: format!("{} ({})", wanted.name, wanted.place),
                why: format!("holds {text:?}, which stands in for an identity that was never filled in"),
                remedy: wanted.if_absent.to_owned(),
            });
        } else {
            list.extend(wanted.explain(reading, vm));
        }
    }
    list.extend(KERNEL.explain(&identity.kernel, vm));
}
