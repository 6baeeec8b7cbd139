//! What a host can tell, read from made-up trees and from the machine that the tests run on.
//!
//! The trees are written by `hosts` after the formats of the kernel's documentation, as named there.

mod allowed;
mod counters;
mod cpulist;
mod garbage;
mod hosts;
mod identity;
mod real;
mod sensors;
mod survey;
mod topology;
mod tree;

use proofhouse::host::{Cpu, CpuSet};

/// A list in the kernel's syntax that is right for certain.
fn set(list: &str) -> CpuSet {
    CpuSet::parse_kernel(list).expect("the test's own list")
}

fn numbers(set: &CpuSet) -> Vec<u32> {
    set.iter().map(|cpu| cpu.0).collect()
}

fn cpu(number: u32) -> Cpu {
    Cpu(number)
}
