//! Hold a thread on one cpu, and read where it really is.
//!
//! The kernel moves threads silently when a cpuset shrinks or a cpu goes offline, so a request to be pinned proves
//! nothing: [`place`] is read before and after every slice.

use std::io;
use std::time::Duration;

use serde::{Deserialize, Serialize};

use crate::host::{Cpu, CpuSet, affinity};

/// Where a thread is and where it may be.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Place {
    /// The cpu that the calling thread ran on.
    pub cpu: Cpu,
    /// The cpus that it may run on, ascending.
    pub mask: Vec<Cpu>,
}

impl Place {
    /// Whether the thread is on `cpu` and can be nowhere else.
    pub fn is_only(&self, cpu: Cpu) -> bool {
        self.cpu == cpu && self.mask == [cpu]
    }
}

/// Holds the calling thread, and what it starts from now on, on one cpu.
pub fn pin(cpu: Cpu) -> io::Result<()> {
    let only = CpuSet::from_iter([cpu]);
    let got = affinity::bind(&only)?;
    // the kernel silently drops what the cpuset forbids
    if got == only { Ok(()) } else { Err(io::Error::other(format!("the system gave cpus {got} instead"))) }
}

/// Has the calling thread take its memory from this node.
pub fn take_memory_from(node: u32) -> io::Result<()> {
    // more nodes than any machine has: a number beyond is not the system's
    if node > 4095 { Err(io::Error::other("no such node")) } else { affinity::take_memory_from(node) }
}

/// Has the system wake the calling thread within a microsecond of the time that it asks for, instead of fifty.
pub fn wake_exactly() {
    // without it pauses last a little longer, which the beat's own account corrects
    let _ = nix::sys::prctl::set_timerslack(1000);
}

/// Where the calling thread is.
pub fn place() -> io::Result<Place> {
    Ok(Place { cpu: affinity::current_cpu()?, mask: affinity::mask()?.iter().collect() })
}

/// Processor time that the calling thread has used.
pub fn thread_time() -> Duration {
    match nix::time::clock_gettime(nix::time::ClockId::CLOCK_THREAD_CPUTIME_ID) {
        Ok(t) => Duration::from(t),
        // the clock exists on every kernel since 2.6.12; without it exposure counts as nothing rather than too much
        Err(_) => Duration::ZERO,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_pinned_thread_is_where_it_was_put() {
        std::thread::spawn(|| {
            for cpu in affinity::mask().unwrap().iter() {
                pin(cpu).unwrap();
                assert!(place().unwrap().is_only(cpu));
            }
        })
        .join()
        .unwrap();
    }

    #[test]
    fn a_cpu_that_is_not_there_is_refused() {
        assert!(pin(Cpu(60_000)).is_err());
        assert!(pin(Cpu(u32::MAX)).is_err());
    }
}
