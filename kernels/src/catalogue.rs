//! The one list of kernels. A test proves that no kernel file stands outside it.

use crate::kernel::Kernel;

/// Every kernel, by family and then name.
pub static KERNELS: &[&dyn Kernel] = &[
    &crate::integer::multiply::Multiply,
    &crate::integer::divide::Divide,
    &crate::integer::carry::Carry,
    &crate::integer::bits::BitOperations,
    &crate::integer::bignum::Bignum,
    &crate::integer::compress::Compress,
    &crate::integer::sort::Sort,
    &crate::checksum::crc32c::Crc32c,
    &crate::checksum::clmul::Clmul,
    &crate::float::chain32::Chain32,
    &crate::float::chain64::Chain64,
    &crate::float::convert::Conversions,
    &crate::float::powcast::PowCast,
    &crate::float::elementary::Elementary,
    &crate::float::x87::X87,
    &crate::fma::chain32::Chain32,
    &crate::fma::chain64::Chain64,
    &crate::fma::matmul32::Matmul32,
    &crate::fma::matmul64::Matmul64,
    &crate::fma::mixed::Mixed,
    &crate::vector::shuffle::Shuffle,
    &crate::vector::gather::Gather,
    &crate::vector::integer::Integer,
    &crate::vector::permute::Permute,
    &crate::vector::dot8::Dot8,
    &crate::vector::mask::Mask,
    &crate::cipher::aes::Aes,
    &crate::cipher::sha256::Sha256,
    &crate::string::copy::Copy,
    &crate::cache::walk::Walk,
    &crate::cache::forward::Forward,
    &crate::cache::evict::Evict,
    &crate::memory::march::March,
    &crate::memory::copy::Copy,
    &crate::memory::stream::Stream,
    &crate::memory::walk::Walk,
    &crate::sync::counter::Counter,
    &crate::sync::lock::Locks,
    &crate::sync::pingpong::PingPong,
    &crate::sync::ordering::MemoryOrder,
];

/// The kernel with this id.
pub fn find(id: &str) -> Option<&'static dyn Kernel> {
    KERNELS.iter().copied().find(|k| k.id() == id)
}
