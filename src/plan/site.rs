//! What a plan has to know of the host: which cpus share a core, and how much memory of each kind a cpu has.

use kernels::Size;

use crate::condition::{Arrangement, Level, Setting};
use crate::host::{Cpu, Host};

/// A cache as one cpu sees it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Share {
    /// Size of the whole cache in KiB.
    pub kib: u32,
    /// Tested cpus that share it, this one among them.
    pub cpus: u32,
}

/// A tested cpu.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Seat {
    /// Logical cpu.
    pub cpu: Cpu,
    /// Physical core.
    pub core: u32,
    /// First-level data, second-level and third-level cache, as far as they are known.
    pub caches: [Option<Share>; 3],
}

/// The tested cpus, ascending.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Site {
    /// The seats.
    pub seats: Vec<Seat>,
}

impl Site {
    /// Of a host, for the cpus that are tested.
    pub fn of(host: &Host, tested: &[(Cpu, u32)]) -> Site {
        let share = |cpu: Cpu, pick: fn(&crate::host::caches::Caches) -> Option<&crate::host::caches::Cache>| {
            let cache = pick(host.caches.get(&cpu)?)?;
            let cpus = tested.iter().filter(|(c, _)| cache.cpus.contains(*c)).count() as u32;
            Some(Share { kib: cache.kib, cpus: cpus.max(1) })
        };
        let seats = tested
            .iter()
            .map(|&(cpu, core)| Seat {
                cpu,
                core,
                caches: [share(cpu, |c| c.l1d.value()), share(cpu, |c| c.l2.value()), share(cpu, |c| c.l3.value())],
            })
            .collect();
        Site { seats }
    }

    /// Cores with their cpus.
    pub fn cores(&self) -> Vec<(u32, Vec<usize>)> {
        let mut cores: Vec<(u32, Vec<usize>)> = Vec::new();
        for (index, seat) in self.seats.iter().enumerate() {
            match cores.iter_mut().find(|(core, _)| *core == seat.core) {
                Some((_, cpus)) => cpus.push(index),
                None => cores.push((seat.core, vec![index])),
            }
        }
        cores
    }

    /// Where a footprint lies when `cpu` works under `setting`: a cache that others use as well counts by its share. None
    /// where no cache is known.
    pub fn level(&self, size: Size, cpu: Cpu, setting: Setting) -> Option<Level> {
        let seat = self.seats.iter().find(|s| s.cpu == cpu)?;
        if seat.caches.iter().all(Option::is_none) {
            return None;
        }
        let siblings = self.seats.iter().filter(|s| s.core == seat.core).count() as u32;
        let levels = [Level::L1, Level::L2, Level::L3];
        let fits = |share: &Share| {
            let users = match setting.arrangement {
                Arrangement::Solo => 1,
                Arrangement::Siblings => share.cpus.min(siblings),
                Arrangement::Neighbours => share.cpus.div_ceil(siblings),
                Arrangement::All => share.cpus,
            };
            size.0 <= share.kib / users.max(1)
        };
        let smallest = levels.iter().zip(&seat.caches).find(|(_, share)| share.as_ref().is_some_and(fits));
        Some(smallest.map_or(Level::Dram, |(level, _)| *level))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::condition::{Before, Pace};

    #[test]
    fn a_footprint_lies_where_its_share_of_a_cache_holds_it() {
        let caches =
            [Some(Share { kib: 32, cpus: 2 }), Some(Share { kib: 512, cpus: 2 }), Some(Share { kib: 16_384, cpus: 8 })];
        let seats = (0..8).map(|n| Seat { cpu: Cpu(n), core: n / 2, caches }).collect();
        let site = Site { seats };
        let level = |kib, arrangement| {
            let setting = Setting { arrangement, pace: Pace::FULL, before: Before::Anything };
            site.level(Size(kib), Cpu(3), setting).unwrap()
        };
        assert_eq!(level(16, Arrangement::All), Level::L1);
        assert_eq!(level(21, Arrangement::All), Level::L2);
        assert_eq!(level(21, Arrangement::Neighbours), Level::L1);
        assert_eq!(level(384, Arrangement::Siblings), Level::L3);
        assert_eq!(level(3072, Arrangement::All), Level::Dram);
        assert_eq!(level(3072, Arrangement::Solo), Level::L3);
        assert_eq!(Site::default().level(Size(1), Cpu(0), Setting::PLAIN), None);
    }
}
