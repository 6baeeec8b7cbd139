//! What the hardware could do at best: for each kernel the bare loop of its instruction at peak throughput.
//!
//! A yardstick computes nothing of use and checks nothing. It has enough independent chains to fill the units, all its
//! operands come through `black_box`, and so do its results.

use kernels::{Variant, catalogue, isa};

mod cache_evict;
mod cache_forward;
mod cache_walk;
mod checksum_clmul;
mod checksum_crc32c;
mod cipher_aes;
mod cipher_sha256;
mod float_chain32;
mod float_chain64;
mod float_common;
mod float_convert;
mod float_elementary;
mod float_powcast;
mod float_x87;
mod fma_chain32;
mod fma_chain64;
mod fma_common;
mod fma_matmul32;
mod fma_matmul64;
mod fma_mixed;
mod integer_bignum;
mod integer_bits;
mod integer_carry;
mod integer_compress;
mod integer_divide;
mod integer_multiply;
mod integer_sort;
mod memory_copy;
mod memory_march;
mod memory_stream;
mod memory_walk;
mod string_copy;
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
        integer_bits::yardsticks(),
        integer_bignum::yardsticks(),
        integer_compress::yardsticks(),
        integer_sort::yardsticks(),
        checksum_crc32c::yardsticks(),
        checksum_clmul::yardsticks(),
        float_chain32::yardsticks(),
        float_chain64::yardsticks(),
        float_convert::yardsticks(),
        float_powcast::yardsticks(),
        float_elementary::yardsticks(),
        float_x87::yardsticks(),
        fma_chain32::yardsticks(),
        fma_chain64::yardsticks(),
        fma_matmul32::yardsticks(),
        fma_matmul64::yardsticks(),
        fma_mixed::yardsticks(),
        vector_shuffle::yardsticks(),
        vector_gather::yardsticks(),
        vector_integer::yardsticks(),
        vector_permute::yardsticks(),
        vector_dot8::yardsticks(),
        vector_mask::yardsticks(),
        cipher_aes::yardsticks(),
        cipher_sha256::yardsticks(),
        string_copy::yardsticks(),
        cache_walk::yardsticks(),
        cache_forward::yardsticks(),
        cache_evict::yardsticks(),
        memory_march::yardsticks(),
        memory_copy::yardsticks(),
        memory_stream::yardsticks(),
        memory_walk::yardsticks(),
    ]
    .into_iter()
    .flatten()
    .collect()
}
