//! The system calls that say and decide where a thread runs and where its memory comes from. Everything `unsafe` of the host's side is here.
//!
//! The wrappers of the C library end at 1,024 cpus, and `sched_getcpu` may answer 0 under user-mode emulation, so the
//! calls are made directly, with a mask that grows until the kernel accepts it.

use std::io;

use crate::host::cpulist::{CPU_LIMIT, Cpu, CpuSet};

type Word = libc::c_ulong;
const BITS: usize = Word::BITS as usize;
/// What the C library's fixed mask has room for: where the growing one starts.
const START_WORDS: usize = 1024 / BITS;
const MOST_WORDS: usize = CPU_LIMIT as usize / BITS;

/// The cpus on which the calling thread may run, as the kernel has it now.
pub fn mask() -> io::Result<CpuSet> {
    let mut words = START_WORDS;
    loop {
        let mut bits: Vec<Word> = vec![0; words];
        // SAFETY: the kernel writes at most the given number of bytes, which is the length of `bits`, borrowed
        // mutably for the whole call; 0 names the calling thread
        let got =
            unsafe { libc::syscall(libc::SYS_sched_getaffinity, 0, size_of_val(bits.as_slice()), bits.as_mut_ptr()) };
        if got >= 0 {
            return Ok(set_of(&bits));
        }
        let error = io::Error::last_os_error();
        // EINVAL: the kernel's mask is longer than this one
        if error.raw_os_error() != Some(libc::EINVAL) || words >= MOST_WORDS {
            return Err(error);
        }
        words *= 2;
    }
}

/// Binds the calling thread to `cpus` and returns the mask that the kernel made of it: it silently drops those that
/// the cpuset forbids, so the caller compares.
pub fn bind(cpus: &CpuSet) -> io::Result<CpuSet> {
    let highest = cpus.last().map_or(0, |cpu| cpu.0 as usize);
    if highest >= CPU_LIMIT as usize {
        return Err(io::Error::from_raw_os_error(libc::EINVAL));
    }
    let mut bits: Vec<Word> = vec![0; START_WORDS.max(highest / BITS + 1)];
    for Cpu(cpu) in cpus.iter() {
        bits[cpu as usize / BITS] |= 1 << (cpu as usize % BITS);
    }
    // SAFETY: the kernel reads the given number of bytes, which is the length of `bits`, borrowed for the whole call;
    // 0 names the calling thread
    let done = unsafe { libc::syscall(libc::SYS_sched_setaffinity, 0, size_of_val(bits.as_slice()), bits.as_ptr()) };
    if done < 0 { Err(io::Error::last_os_error()) } else { mask() }
}

/// The cpu on which the calling thread runs at this moment.
pub fn current_cpu() -> io::Result<Cpu> {
    let mut cpu: libc::c_uint = 0;
    // SAFETY: the kernel writes one unsigned int to the first pointer, which is to `cpu`; null for the others means
    // that they are not wanted
    let done = unsafe {
        let nothing = std::ptr::null_mut::<libc::c_void>();
        libc::syscall(libc::SYS_getcpu, &raw mut cpu, nothing, nothing)
    };
    if done < 0 { Err(io::Error::last_os_error()) } else { Ok(Cpu(cpu)) }
}

/// Has the calling thread, and those that it starts, take new memory from this node only (`set_mempolicy(2)`, from
/// memory: policy 2 is `MPOL_BIND`, the mask is counted in bits and one more than the highest bit is asked for).
pub fn take_memory_from(node: u32) -> io::Result<()> {
    const BIND: libc::c_int = 2;
    let mut bits: Vec<Word> = vec![0; node as usize / BITS + 1];
    bits[node as usize / BITS] |= 1 << (node as usize % BITS);
    // SAFETY: the kernel reads at most the stated number of bits, which is the length of `bits`, borrowed for the call
    let done = unsafe { libc::syscall(libc::SYS_set_mempolicy, BIND, bits.as_ptr(), bits.len() * BITS + 1) };
    if done < 0 { Err(io::Error::last_os_error()) } else { Ok(()) }
}

/// Gives the calling thread, and those that it starts, the lowest priority: beside a thread of normal priority on the
/// same cpu it gets about a seventieth of the time (sched(7), from memory: weight 15 against 1024).
pub fn step_back() {
    // SAFETY: a system call without pointers; who = 0 names the calling thread on Linux
    let _ = unsafe { libc::setpriority(libc::PRIO_PROCESS, 0, 19) };
}

fn set_of(bits: &[Word]) -> CpuSet {
    let set = |(index, word): (usize, &Word)| {
        let word = *word;
        (0..BITS).filter(move |bit| word >> bit & 1 == 1).map(move |bit| Cpu((index * BITS + bit) as u32))
    };
    bits.iter().enumerate().flat_map(set).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn mask_words_become_cpu_numbers() {
        let set = set_of(&[1 | 1 << (BITS - 1), 0, 2]);
        let expected: Vec<u32> = vec![0, BITS as u32 - 1, 2 * BITS as u32 + 1];
        assert_eq!(set.iter().map(|c| c.0).collect::<Vec<_>>(), expected);
    }
}
