//! Integer-only references, one a kernel, under the kernel's own file stem. `scripts/check-reference` holds the rules:
//! no `f32`/`f64`, no SIMD, nothing of `kernels` but [`Case`].

pub mod cache;
pub mod chacha;
pub mod checksum;
pub mod cipher;
pub mod float;
pub mod fma;
pub mod integer;
pub mod memory;
pub mod string;
pub mod sync;
pub mod vector;

use kernels::Case;

/// Computes the right output words of a case.
pub type Reference = fn(&Case) -> Vec<u64>;

/// Every reference by kernel id.
pub static REFERENCES: &[(&str, Reference)] = &[
    ("integer.multiply", integer::multiply::words),
    ("integer.divide", integer::divide::words),
    ("integer.carry", integer::carry::words),
    ("integer.bits", integer::bits::words),
    ("integer.bignum", integer::bignum::words),
    ("integer.compress", integer::compress::words),
    ("integer.sort", integer::sort::words),
    ("checksum.crc32c", checksum::crc32c::words),
    ("checksum.clmul", checksum::clmul::words),
    ("float.chain32", float::chain32::words),
    ("float.chain64", float::chain64::words),
    ("float.convert", float::convert::words),
    ("float.powcast", float::powcast::words),
    ("float.elementary", float::elementary::words),
    ("float.x87", float::x87::words),
    ("fma.chain32", fma::chain32::words),
    ("fma.chain64", fma::chain64::words),
    ("fma.matmul32", fma::matmul32::words),
    ("fma.matmul64", fma::matmul64::words),
    ("fma.mixed", fma::mixed::words),
    ("vector.shuffle", vector::shuffle::words),
    ("vector.gather", vector::gather::words),
    ("vector.integer", vector::integer::words),
    ("vector.permute", vector::permute::words),
    ("vector.dot8", vector::dot8::words),
    ("vector.mask", vector::mask::words),
    ("cipher.aes", cipher::aes::words),
    ("cipher.sha256", cipher::sha256::words),
    ("string.copy", string::copy::words),
    ("cache.walk", cache::walk::words),
    ("cache.forward", cache::forward::words),
    ("cache.evict", cache::evict::words),
    ("memory.march", memory::march::words),
    ("memory.copy", memory::copy::words),
    ("memory.stream", memory::stream::words),
    ("memory.walk", memory::walk::words),
    ("sync.counter", sync::counter::words),
    ("sync.lock", sync::lock::words),
    ("sync.pingpong", sync::pingpong::words),
    ("sync.ordering", sync::ordering::words),
];

/// The right output of `case`, computed now; `None` for an unknown kernel.
pub fn words(case: &Case) -> Option<Vec<u64>> {
    REFERENCES.iter().find(|(id, _)| *id == case.kernel).map(|(_, reference)| reference(case))
}
