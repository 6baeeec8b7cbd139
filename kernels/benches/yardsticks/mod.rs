//! Bare loops of the instructions that the kernels lean on, at their peak throughput: what a kernel's rate is held against.

mod cache_walk;
mod cipher_aes;
mod cipher_sha256;
mod memory_copy;
mod memory_march;

use kernels::Variant;

/// A loop that does nothing but the kernel's characteristic work.
pub struct Yardstick {
    /// Catalogue id of the kernel.
    pub kernel: &'static str,
    /// Instruction-set level of the loop.
    pub variant: Variant,
    /// Units of [`kernels::Kernel::work`] per call.
    pub units: u64,
    /// One call.
    pub run: Box<dyn FnMut()>,
}

/// Every yardstick that this CPU can run.
pub fn all() -> Vec<Yardstick> {
    [
        cipher_aes::yardsticks(),
        cipher_sha256::yardsticks(),
        cache_walk::yardsticks(),
        memory_march::yardsticks(),
        memory_copy::yardsticks(),
    ]
    .into_iter()
    .flatten()
    .collect()
}
