//! What can be measured while a core works: temperature, frequency, throttling, energy.
//!
//! [`Sensors::discover`] looks once for what there is; [`Sensors::read`] then opens a handful of small files for one
//! cpu, cheap enough for once a slice. Files: kernel documentation `admin-guide/pm/cpufreq.rst`
//! (`scaling_cur_freq`, kHz), `ABI/testing/sysfs-devices-system-cpu` (`thermal_throttle/*`), `power/powercap`
//! (`energy_uj`, µJ, wraps at `max_energy_range_uj`); from memory.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::host::cpulist::{Cpu, CpuSet};
use crate::host::hwmon::{self, Scope, Temperature};
use crate::host::root::{Reading, Root, Why};
use crate::host::topology::Topology;

/// Values of one moment for one cpu. What is `None` is not offered or could not be read; it is not zero.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct CpuReadings {
    /// Temperature in °C.
    pub celsius: Option<f64>,
    /// Whether that is the core's own or its package's.
    pub celsius_of: Option<Scope>,
    /// Present frequency in kHz.
    pub frequency_khz: Option<u64>,
    /// How often the core was slowed down for heat since boot.
    pub core_throttles: Option<u64>,
    /// How often its package was.
    pub package_throttles: Option<u64>,
    /// Energy that its package has used in µJ; wraps, see [`energy_used`].
    pub package_uj: Option<u64>,
}

/// An energy counter of one processor.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Energy {
    /// The kernel's name for it, e.g. `package-0`.
    pub name: String,
    /// Online cpus that it speaks of; empty where that cannot be told.
    pub cpus: CpuSet,
    /// Highest value in µJ before it begins again at 0.
    pub wraps_at: Reading<u64>,
    path: String,
}

/// Energy in µJ between two values of one counter that wraps at most once between them; `None` when the second is
/// lower and the wrapping point is not known, or either lies beyond it.
pub fn energy_used(before: u64, after: u64, wraps_at: Option<u64>) -> Option<u64> {
    if after >= before {
        return Some(after - before);
    }
    wraps_at.filter(|&top| before <= top)?.checked_sub(before)?.checked_add(after)?.checked_add(1)
}

/// One sensor for a listing, read once.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SensorEntry {
    /// `temperature`, `frequency`, `core throttling`, `package throttling` or `energy`.
    pub kind: String,
    /// Its name on this host.
    pub name: String,
    /// Online cpus that it speaks of; empty where that cannot be told.
    pub cpus: CpuSet,
    /// `°C`, `kHz`, `events` or `µJ`.
    pub unit: String,
    /// The value; null where it cannot be read.
    pub value: Option<f64>,
    /// Why there is no value.
    pub why: Option<String>,
}

/// The sensors of a host.
#[derive(Clone, Debug)]
pub struct Sensors {
    root: Root,
    /// Temperatures of processors.
    pub temperatures: Reading<Vec<Temperature>>,
    /// Energy counters of processors.
    pub energies: Reading<Vec<Energy>>,
    cpus: BTreeMap<Cpu, Sources>,
}

/// Which files tell of one cpu; `None` for those that are not there.
#[derive(Clone, Debug, Default)]
struct Sources {
    temperature: Option<Temperature>,
    frequency: Option<String>,
    core_throttles: Option<String>,
    package_throttles: Option<String>,
    energy: Option<String>,
}

impl Sensors {
    /// Looks for what there is.
    pub fn discover(root: &Root, topology: &Topology) -> Sensors {
        let temperatures = hwmon::discover(root, topology);
        let energies = energies(root, topology);
        let sources = |&cpu: &Cpu| {
            let file = |name: &str| {
                let path = format!("sys/devices/system/cpu/cpu{cpu}/{name}");
                root.exists(&path).then_some(path)
            };
            let energy = energies.value().into_iter().flatten().find(|energy| energy.cpus.contains(cpu));
            let sources = Sources {
                temperature: temperatures.value().and_then(|list| hwmon::best(list, cpu)).cloned(),
                frequency: file("cpufreq/scaling_cur_freq"),
                core_throttles: file("thermal_throttle/core_throttle_count"),
                package_throttles: file("thermal_throttle/package_throttle_count"),
                energy: energy.map(|energy| energy.path.clone()),
            };
            (cpu, sources)
        };
        let cpus = topology.cpus.keys().map(sources).collect();
        Sensors { root: root.clone(), temperatures, energies, cpus }
    }

    /// Values of this moment for `cpu`: at most five small files are read.
    pub fn read(&self, cpu: Cpu) -> CpuReadings {
        let Some(sources) = self.cpus.get(&cpu) else { return CpuReadings::default() };
        let count = |path: &Option<String>| path.as_ref().and_then(|path| self.root.count(path).ok());
        let celsius = sources.temperature.as_ref().and_then(|t| Some((hwmon::read(&self.root, t).ok()?, t.scope)));
        CpuReadings {
            celsius: celsius.map(|(degrees, _)| degrees),
            celsius_of: celsius.map(|(_, scope)| scope),
            frequency_khz: sources.frequency.as_ref().and_then(|path| frequency(&self.root, path).ok()),
            core_throttles: count(&sources.core_throttles),
            package_throttles: count(&sources.package_throttles),
            package_uj: count(&sources.energy),
        }
    }

    /// The present frequency of each cpu in kHz, with what stands in its way.
    pub fn frequencies(&self) -> BTreeMap<Cpu, Reading<u64>> {
        self.each(|sources| sources.frequency.as_ref(), frequency)
    }

    /// The throttle counter of each core.
    pub fn core_throttles(&self) -> BTreeMap<Cpu, Reading<u64>> {
        self.each(|sources| sources.core_throttles.as_ref(), Root::count)
    }

    /// The throttle counter of each package, by cpu.
    pub fn package_throttles(&self) -> BTreeMap<Cpu, Reading<u64>> {
        self.each(|sources| sources.package_throttles.as_ref(), Root::count)
    }

    /// One reading of a temperature in °C.
    pub fn temperature(&self, temperature: &Temperature) -> Reading<f64> {
        hwmon::read(&self.root, temperature)
    }

    /// One reading of an energy counter in µJ.
    pub fn energy(&self, energy: &Energy) -> Reading<u64> {
        self.root.count(&energy.path)
    }

    /// Every sensor that is there, read once.
    pub fn list(&self) -> Vec<SensorEntry> {
        let mut list: Vec<SensorEntry> = Vec::new();
        for t in self.temperatures.value().into_iter().flatten() {
            list.push(entry("temperature", t.name.clone(), t.cpus.clone(), "°C", self.temperature(t)));
        }
        let counters = [
            ("frequency", "scaling_cur_freq", "kHz", self.frequencies()),
            ("core throttling", "core_throttle_count", "events", self.core_throttles()),
            ("package throttling", "package_throttle_count", "events", self.package_throttles()),
        ];
        for (kind, name, unit, readings) in counters {
            for (cpu, reading) in readings.into_iter().filter(|(_, reading)| *reading != Reading::Absent) {
                let cpus = CpuSet::from_iter([cpu]);
                list.push(entry(kind, name.to_owned(), cpus, unit, reading.map(|n| n as f64)));
            }
        }
        for e in self.energies.value().into_iter().flatten() {
            list.push(entry("energy", e.name.clone(), e.cpus.clone(), "µJ", self.energy(e).map(|n| n as f64)));
        }
        list
    }

    fn each(
        &self,
        path: impl Fn(&Sources) -> Option<&String>,
        read: impl Fn(&Root, &str) -> Reading<u64>,
    ) -> BTreeMap<Cpu, Reading<u64>> {
        let reading = |sources| path(sources).map_or(Reading::Absent, |path| read(&self.root, path));
        self.cpus.iter().map(|(&cpu, sources)| (cpu, reading(sources))).collect()
    }
}

fn entry(kind: &str, name: String, cpus: CpuSet, unit: &str, reading: Reading<f64>) -> SensorEntry {
    let why = match &reading {
        Reading::Value(_) => None,
        Reading::Absent => Some("not offered".to_owned()),
        Reading::Unreadable(why) => Some(why.to_string()),
    };
    SensorEntry { kind: kind.to_owned(), name, cpus, unit: unit.to_owned(), value: reading.ok(), why }
}

/// kHz; more than 100 GHz is no frequency.
fn frequency(root: &Root, path: &str) -> Reading<u64> {
    root.count(path).and_then(|khz| match khz {
        0..=100_000_000 => Reading::Value(khz),
        _ => Reading::Unreadable(Why::nonsense(&khz.to_string())),
    })
}

/// The zones `package-N` and `package-N-die-M`; their sub-zones (cores, memory) are left out.
fn energies(root: &Root, topology: &Topology) -> Reading<Vec<Energy>> {
    const FOLDER: &str = "sys/class/powercap";
    root.numbered(FOLDER, "intel-rapl:").map(|numbers| {
        let zone = |number: u32| {
            let folder = format!("{FOLDER}/intel-rapl:{number}");
            let name = root.text(&format!("{folder}/name")).ok()?;
            let (socket, die) = match name.strip_prefix("package-")?.split_once("-die-") {
                Some((socket, die)) => (socket.parse().ok()?, Some(die.parse().ok()?)),
                None => (name.strip_prefix("package-")?.parse().ok()?, None),
            };
            let here = |p: &&crate::host::topology::Place| {
                p.socket.get() == Some(socket) && (die.is_none() || p.die.get() == die)
            };
            let cpus = topology.cpus.values().filter(here).map(|place| place.cpu).collect();
            let wraps_at = root.count(&format!("{folder}/max_energy_range_uj"));
            Some(Energy { name, cpus, wraps_at, path: format!("{folder}/energy_uj") })
        };
        numbers.into_iter().filter_map(zone).collect()
    })
}
