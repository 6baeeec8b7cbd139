//! Which cpus this process may use, and which of them a user's `--cpus` leaves.
//!
//! The affinity mask of the system call decides; the control group's cpuset is read for information, to say why a
//! cpu is out of reach. Files: kernel documentation `admin-guide/cgroup-v2.rst` (`cpuset.cpus.effective`),
//! `admin-guide/cgroup-v1/cpusets.rst` (`cpuset.effective_cpus`), `/proc/self/cgroup` in cgroups(7); from memory.

use crate::host::cpulist::{Cpu, CpuChoice, CpuSet};
use crate::host::root::{Reading, Root, Why};
use crate::host::text::clean;
use crate::host::topology::Topology;

/// Which cpus this process may use.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Allowed {
    /// The affinity mask of the calling thread.
    pub mask: CpuSet,
    /// The effective cpuset of the control group that the process is in.
    pub cpuset: Reading<CpuSet>,
    /// The file that the cpuset was read from.
    pub cpuset_file: Option<String>,
}

/// Why the wanted cpus cannot be had.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum AllowedError {
    /// The system call failed.
    #[error("cannot read the affinity mask of this process: {0}: allow the system call sched_getaffinity")]
    Mask(String),
    /// Cpus that this host does not have.
    #[error("cpu {cpus} does not exist on this host: choose among {online}")]
    NotPresent {
        /// The cpus.
        cpus: CpuSet,
        /// Those that are online.
        online: CpuSet,
    },
    /// Cpus that are switched off.
    #[error("cpu {cpus} is offline: bring it online with chcpu --enable {cpus}, or leave it out of --cpus")]
    Offline {
        /// The cpus.
        cpus: CpuSet,
    },
    /// Cpus that the control group withholds.
    #[error(
        "cpu {cpus} is outside the cpuset {cpuset} of this control group ({file}): \
         ask the scheduler for the whole host, or leave it out of --cpus"
    )]
    OutsideCpuset {
        /// The cpus.
        cpus: CpuSet,
        /// The control group's cpus.
        cpuset: CpuSet,
        /// Where that was read.
        file: String,
    },
    /// Cpus that the affinity mask withholds.
    #[error(
        "cpu {cpus} is outside the affinity mask {mask} of this process: \
         start it with taskset --cpu-list {wanted}, or leave it out of --cpus"
    )]
    OutsideMask {
        /// The cpus.
        cpus: CpuSet,
        /// The mask.
        mask: CpuSet,
        /// All that were asked for.
        wanted: CpuSet,
    },
    /// No cpu that is online is in the mask.
    #[error("no online cpu is in the affinity mask {mask} of this process: start it with a wider one")]
    Nothing {
        /// The mask.
        mask: CpuSet,
    },
}

impl Allowed {
    /// Reads the mask of the calling thread, and the cpuset under `root`.
    pub fn of_this_process(root: &Root) -> Result<Allowed, AllowedError> {
        let mask = crate::host::affinity::mask().map_err(|error| AllowedError::Mask(error.to_string()))?;
        Ok(Allowed::with_mask(root, mask))
    }

    /// As if the calling thread's mask were `mask`.
    pub fn with_mask(root: &Root, mask: CpuSet) -> Allowed {
        let (cpuset, cpuset_file) = cpuset(root);
        Allowed { mask, cpuset, cpuset_file }
    }

    /// The cpus to use, ascending: all that are online and allowed, or exactly those that were named. A named cpu
    /// that cannot be had is an error and is never dropped in silence.
    pub fn choose(&self, choice: &CpuChoice, topology: &Topology) -> Result<CpuSet, AllowedError> {
        let online = topology.online();
        let wanted = match choice {
            CpuChoice::All => {
                let cpus = self.mask.intersection(&online);
                return if cpus.is_empty() { Err(AllowedError::Nothing { mask: self.mask.clone() }) } else { Ok(cpus) };
            }
            CpuChoice::Only(wanted) => wanted,
        };
        let missing = wanted.difference(&online);
        let unknown = missing.difference(&topology.offline);
        if !unknown.is_empty() {
            return Err(AllowedError::NotPresent { cpus: unknown, online });
        }
        if !missing.is_empty() {
            return Err(AllowedError::Offline { cpus: missing });
        }
        let outside = wanted.difference(&self.mask);
        if outside.is_empty() {
            return Ok(wanted.clone());
        }
        match (&self.cpuset, &self.cpuset_file) {
            (Reading::Value(cpuset), Some(file)) if !outside.is_subset(cpuset) => Err(AllowedError::OutsideCpuset {
                cpus: outside.difference(cpuset),
                cpuset: cpuset.clone(),
                file: file.clone(),
            }),
            _ => Err(AllowedError::OutsideMask { cpus: outside, mask: self.mask.clone(), wanted: wanted.clone() }),
        }
    }

    /// Whether `cpu` is in the mask.
    pub fn contains(&self, cpu: Cpu) -> bool {
        self.mask.contains(cpu)
    }
}

/// The effective cpuset and its file. A group without the file has the cpus of the nearest group above that has it.
fn cpuset(root: &Root) -> (Reading<CpuSet>, Option<String>) {
    let lines = match root.long_text("proc/self/cgroup") {
        Reading::Value(text) => text,
        Reading::Absent => return (Reading::Absent, None),
        Reading::Unreadable(why) => return (Reading::Unreadable(why), None),
    };
    let (mut first, mut second) = (None, None);
    for line in lines.lines() {
        let mut fields = line.splitn(3, ':');
        let (Some(number), Some(controllers), Some(path)) = (fields.next(), fields.next(), fields.next()) else {
            continue;
        };
        if number == "0" && controllers.is_empty() {
            second = Some(path);
        } else if controllers.split(',').any(|name| name == "cpuset") {
            first = Some(path);
        }
    }
    // where the first version holds the cpuset controller, the second has none
    let places: [(Option<&str>, &str, &[&str]); 3] = [
        (first, "sys/fs/cgroup/cpuset", &["cpuset.effective_cpus", "cpuset.cpus"]),
        (second, "sys/fs/cgroup", &["cpuset.cpus.effective"]),
        (second, "sys/fs/cgroup/unified", &["cpuset.cpus.effective"]),
    ];
    for (path, mount, files) in places {
        let Some(mut path) = path else { continue };
        if !path.starts_with('/') {
            return (Reading::Unreadable(Why::nonsense(path)), None);
        }
        if path.split('/').any(|part| part == "..") {
            return (
                Reading::Unreadable(Why::Failed(format!("{} lies outside this namespace", clean(path, 80)))),
                None,
            );
        }
        loop {
            path = path.trim_end_matches('/');
            for file in files {
                let file = format!("{mount}{path}/{file}");
                match root.cpus(&file) {
                    Reading::Absent => {}
                    reading => return (reading, Some(format!("/{file}"))),
                }
            }
            match path.rfind('/') {
                Some(end) => path = &path[..end],
                None => break,
            }
        }
    }
    (Reading::Absent, None)
}
