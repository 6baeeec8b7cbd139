//! What the hardware could do at best: for each kernel the bare loop of its instruction at peak throughput.
//!
//! A yardstick computes nothing of use and checks nothing. It has enough independent chains to fill the units, all its
//! operands come through `black_box`, and so do its results.

use kernels::{Variant, catalogue, isa};

mod fma_chain32;
mod fma_chain64;
mod fma_common;
mod integer_multiply;
mod float_chain32;
mod float_chain64;
mod float_common;
mod float_convert;
mod float_powcast;

/// The bare loop beside one variant of one kernel.
pub struct Yardstick {
    /// Catalogue id of the kernel that it belongs to.
    pub kernel: &'static str,
    /// The variant whose instructions it uses.
    pub variant: Variant,
    /// Units of the kernel's `work` in one call.
//! What a kernel's throughput is held against: the bare loop of the same instruction, as fast as the core issues it.

use kernels::Variant;

mod integer_carry;
mod integer_divide;
mod integer_multiply;
mod vector_gather;
mod vector_shuffle;

/// The bare loop for one kernel and variant.
pub struct Yardstick {
    /// Catalogue id.
    pub kernel: &'static str,
    /// The variant whose instruction it uses.
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

/// Whether this CPU has what `variant` of `kernel` needs: a yardstick is listed only then, so that it may use the same.
pub fn available(kernel: &str, variant: Variant) -> bool {
    catalogue::find(kernel).is_some_and(|k| isa::prove(k, variant).is_ok())
}

/// Every yardstick that can run here.
pub fn all() -> Vec<Yardstick> {
    [integer_multiply::yardsticks(), fma_chain32::yardsticks(), fma_chain64::yardsticks()]
/// Every yardstick that this CPU can run.
pub fn all() -> Vec<Yardstick> {
    [
        integer_multiply::yardsticks(),
        integer_divide::yardsticks(),
        integer_carry::yardsticks(),
        vector_shuffle::yardsticks(),
        vector_gather::yardsticks(),
    ]
        .into_iter()
        .flatten()
        .collect()
/// Every yardstick that this CPU can run.
pub fn all() -> Vec<Yardstick> {
    [
        cipher_aes::yardsticks(),
        cipher_sha256::yardsticks(),
        cache_walk::yardsticks(),
        memory_march::yardsticks(),
        memory_copy::yardsticks(),
    [
        float_chain32::yardsticks(),
        float_chain64::yardsticks(),
        float_convert::yardsticks(),
        float_powcast::yardsticks(),
    ]
    .into_iter()
    .flatten()
    .collect()
}
