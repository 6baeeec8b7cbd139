//! The thin layer over the scheduler's calls: hold a thread on one cpu, and read where it really is.
//!
//! The kernel moves threads silently when a cpuset shrinks or a cpu goes offline, so a request to be pinned proves
//! nothing: [`place`] is read before and after every slice, by the `getcpu` system call itself (the C library's
//! wrapper may answer 0 under user-mode emulation).

use std::io;
use std::time::Duration;

use serde::{Deserialize, Serialize};

use crate::host::Cpu;

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

/// Longest mask asked for, in bytes: 65,536 cpus.
const LONGEST_MASK: usize = 8192;

/// Holds the calling thread, and what it starts from now on, on one cpu.
pub fn pin(cpu: Cpu) -> io::Result<()> {
    let index = cpu.0 as usize;
    if index >= LONGEST_MASK * 8 {
        return Err(io::Error::new(io::ErrorKind::InvalidInput, format!("cpu {cpu} is beyond any mask")));
    }
    set_mask(&[cpu])
}

/// Lets the calling thread run on any of `cpus`.
pub fn set_mask(cpus: &[Cpu]) -> io::Result<()> {
    let bits = libc::c_ulong::BITS as usize;
    let longest = cpus.iter().map(|c| c.0 as usize).max().unwrap_or(0);
    let mut mask = vec![0 as libc::c_ulong; longest / bits + 1];
    for cpu in cpus {
        mask[cpu.0 as usize / bits] |= 1 << (cpu.0 as usize % bits);
    }
    // SAFETY: the pointer and the length in bytes describe `mask`, which outlives the call; the call only reads it
    let result = unsafe { libc::sched_setaffinity(0, size_of_val(mask.as_slice()), mask.as_ptr().cast()) };
    if result == 0 { Ok(()) } else { Err(io::Error::last_os_error()) }
}

/// The cpus that the calling thread may run on.
pub fn mask() -> io::Result<Vec<Cpu>> {
    let bits = libc::c_ulong::BITS;
    let mut length = 128;
    loop {
        let mut mask = vec![0 as libc::c_ulong; length / size_of::<libc::c_ulong>()];
        // SAFETY: the kernel writes at most `length` bytes, which is the size of `mask`
        let got = unsafe { libc::syscall(libc::SYS_sched_getaffinity, 0, length, mask.as_mut_ptr()) };
        if got >= 0 {
            let set = |i: u32| mask[(i / bits) as usize] >> (i % bits) & 1 == 1;
            return Ok((0..mask.len() as u32 * bits).filter(|&i| set(i)).map(Cpu).collect());
        }
        let why = io::Error::last_os_error();
        if why.raw_os_error() != Some(libc::EINVAL) || length >= LONGEST_MASK {
            return Err(why);
        }
        length *= 2;
    }
}

/// Where the calling thread is, by system calls.
pub fn place() -> io::Result<Place> {
    let mut cpu: libc::c_uint = 0;
    let nowhere = std::ptr::null_mut::<libc::c_void>();
    // SAFETY: the kernel writes one unsigned int to a valid place; null is allowed for what is not wanted
    let result = unsafe { libc::syscall(libc::SYS_getcpu, &raw mut cpu, nowhere, nowhere) };
    if result != 0 {
        return Err(io::Error::last_os_error());
    }
    Ok(Place { cpu: Cpu(cpu), mask: mask()? })
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
            for cpu in mask().unwrap() {
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
