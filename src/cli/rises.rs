//! Error and throttling counters that rose while a slice was under way. Counters of the whole machine are said beside
//! every slice of that time, counters of one cpu beside its own slices.

use std::collections::{BTreeMap, VecDeque};
use std::time::{Duration, Instant};

use crate::event::Slice;
use crate::host::{Counter, Counters, Cpu, Root, Sensors};
use crate::run::driver::unix_ms;

/// Counters are read no more often than this.
const READ_EVERY: Duration = Duration::from_millis(100);
/// Rises are kept for slices that end late.
const KEPT_MS: u64 = 60_000;

struct Rise {
    from_ms: u64,
    to_ms: u64,
    cpu: Option<Cpu>,
    text: String,
}

/// See the file's head.
pub struct Rises {
    root: Root,
    sensors: Sensors,
    last: Counters,
    read_at: Instant,
    read_ms: u64,
    seen: VecDeque<Rise>,
    throttles: BTreeMap<Cpu, (Option<u64>, Option<u64>)>,
}

impl Rises {
    /// Counts from now on.
    pub fn new(root: &Root, sensors: &Sensors) -> Rises {
        Rises {
            root: root.clone(),
            sensors: sensors.clone(),
            last: Counters::read(root),
            read_at: Instant::now(),
            read_ms: unix_ms(),
            seen: VecDeque::new(),
            throttles: BTreeMap::new(),
        }
    }

    /// What rose while `slice`, which has just ended, was under way; one line a counter.
    pub fn during(&mut self, slice: &Slice) -> Vec<String> {
        let end_ms = slice.wall_ms.saturating_add(slice.span_ns / 1_000_000);
        if self.read_at.elapsed() >= READ_EVERY && !self.last.values.is_empty() {
            self.read();
        }
        let partner = slice.partner.map(|p| p.cpu);
        let mine = |cpu: Option<Cpu>| cpu.is_none() || cpu == Some(slice.cpu) || cpu == partner;
        let meanwhile = |r: &&Rise| r.to_ms >= slice.wall_ms && r.from_ms <= end_ms && mine(r.cpu);
        let mut lines: Vec<String> = self.seen.iter().filter(meanwhile).map(|r| r.text.clone()).collect();
        lines.extend(self.throttled(slice.cpu));
        lines
    }

    fn read(&mut self) {
        let (now, now_ms) = (Counters::read(&self.root), unix_ms());
        for change in self.last.until(&now).into_iter().filter(crate::host::Change::is_error) {
            let cpu = match change.counter {
                Counter::Interrupt { cpu, .. } => Some(cpu),
                _ => None,
            };
            self.seen.push_back(Rise { from_ms: self.read_ms, to_ms: now_ms, cpu, text: change.to_string() });
        }
        while self.seen.front().is_some_and(|r| r.to_ms + KEPT_MS < now_ms) {
            self.seen.pop_front();
        }
        (self.last, self.read_at, self.read_ms) = (now, Instant::now(), now_ms);
    }

    /// How often the core or its package was slowed down for heat since this cpu's slice before.
    fn throttled(&mut self, cpu: Cpu) -> Vec<String> {
        let readings = self.sensors.read(cpu);
        let now = (readings.core_throttles, readings.package_throttles);
        let before = self.throttles.insert(cpu, now).unwrap_or(now);
        let rose = |before: Option<u64>, after: Option<u64>, what: &str| {
            let by = after?.checked_sub(before?).filter(|by| *by > 0)?;
            Some(format!("{what} slowed down for heat {by} times"))
        };
        [rose(before.0, now.0, "core"), rose(before.1, now.1, "package")].into_iter().flatten().collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::event::{FoldCheck, Job, Purpose, Surroundings};
    use crate::host::{Host, Root};

    fn slice(cpu: u32, wall_ms: u64, ms: u64) -> Slice {
        Slice {
            job_id: 1,
            slice: 1,
            job: Job::Window,
            purpose: Purpose::Plan,
            cpu: Cpu(cpu),
            core: cpu,
            kernel: "integer.multiply".into(),
            variant: "portable".into(),
            condition: "all steady 100% 9KiB".into(),
            wall_ms,
            span_ns: ms * 1_000_000,
            busy_ns: 0,
            cases: 1,
            runs: 1,
            operations: 1,
            unit: "multiply".into(),
            mismatches: 0,
            mismatch_ms: None,
            fold: FoldCheck::Right,
            checked_on: None,
            void: None,
            surroundings: Surroundings::default(),
            partner: None,
            next_seed: None,
            steps: None,
            counters: Vec::new(),
        }
    }

    #[test]
    fn a_corrected_error_stands_beside_the_slices_of_its_time_and_cpu() {
        let folder = tempfile::tempdir().unwrap();
        let put = |path: &str, text: &str| {
            let path = folder.path().join(path);
            std::fs::create_dir_all(path.parent().unwrap()).unwrap();
            std::fs::write(path, text).unwrap();
        };
        let interrupts = |mce1: u32| {
            format!("           CPU0       CPU1\n MCE:          0          {mce1}   Machine check exceptions\n")
        };
        put("sys/devices/system/cpu/online", "0-1\n");
        put("proc/interrupts", &interrupts(0));
        put("sys/devices/system/edac/mc/mc0/ce_count", "5\n");
        put("sys/devices/system/cpu/cpu0/thermal_throttle/core_throttle_count", "7\n");
        let root = Root::new(folder.path());
        let host = Host::read(&root).unwrap();
        let mut rises = Rises::new(&root, &host.sensors);
        let now = unix_ms();
        assert_eq!(rises.during(&slice(0, now, 1)), Vec::<String>::new());
        std::thread::sleep(READ_EVERY + Duration::from_millis(10));
        put("proc/interrupts", &interrupts(2));
        put("sys/devices/system/edac/mc/mc0/ce_count", "8\n");
        put("sys/devices/system/cpu/cpu0/thermal_throttle/core_throttle_count", "9\n");
        assert_eq!(
            rises.during(&slice(0, now, 200)),
            ["corrected memory errors at mc0: 3 more", "core slowed down for heat 2 times"]
        );
        assert_eq!(
            rises.during(&slice(1, now, 200)),
            ["MCE interrupts on cpu 1: 2 more", "corrected memory errors at mc0: 3 more"]
        );
        // a slice that had ended before says nothing of it
        assert_eq!(rises.during(&slice(1, now - 5000, 200)), Vec::<String>::new());
    }
}
