//! What the hardware could do at best: for each kernel the bare loop of its instruction at peak throughput.
//!
//! A yardstick computes nothing of use and checks nothing. It has enough independent chains to fill the units, all its
//! operands come through `black_box`, and so do its results.

use kernels::{Variant, catalogue, isa};

mod cache_walk;
mod cipher_aes;
mod cipher_sha256;
mod float_chain32;
mod float_chain64;
mod float_common;
mod float_convert;
mod float_powcast;
mod fma_chain32;
mod fma_chain64;
mod fma_common;
mod integer_carry;
mod integer_divide;
mod integer_multiply;
mod memory_copy;
mod memory_march;
mod vector_dot8;
mod vector_gather;
mod vector_integer;
mod vector_mask;
mod vector_permute;
mod vector_shuffle;

/// The bare loop beside one variant of one kernel.
pub struct Yardstick {
    /// Catalogue id of the kernel that it belongs to.
    pub kernel: &'static str,
    /// The variant whose instructions it uses.
    pub variant: Variant,
    /// Units of the kernel's `work` in one call.
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
    [
        integer_multiply::yardsticks(),
        integer_divide::yardsticks(),
        integer_carry::yardsticks(),
        float_chain32::yardsticks(),
        float_chain64::yardsticks(),
        float_convert::yardsticks(),
        float_powcast::yardsticks(),
        fma_chain32::yardsticks(),
        fma_chain64::yardsticks(),
        vector_shuffle::yardsticks(),
        vector_gather::yardsticks(),
        vector_integer::yardsticks(),
        vector_permute::yardsticks(),
        vector_dot8::yardsticks(),
        vector_mask::yardsticks(),
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
