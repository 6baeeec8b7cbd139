//! The one list of kernels. A test proves that no kernel file stands outside it.

use crate::kernel::Kernel;

/// Every kernel, by family and then name.
pub static KERNELS: &[&dyn Kernel] = &[
    &crate::integer::multiply::Multiply,
    &crate::integer::divide::Divide,
    &crate::integer::carry::Carry,
    &crate::float::chain32::Chain32,
    &crate::float::chain64::Chain64,
    &crate::float::convert::Conversions,
    &crate::float::powcast::PowCast,
    &crate::fma::chain32::Chain32,
    &crate::fma::chain64::Chain64,
    &crate::vector::shuffle::Shuffle,
    &crate::vector::gather::Gather,
    &crate::cipher::aes::Aes,
    &crate::cipher::sha256::Sha256,
    &crate::cache::walk::Walk,
    &crate::memory::march::March,
    &crate::memory::copy::Copy,
    &crate::sync::counter::Counter,
    &crate::sync::lock::Locks,
    &crate::sync::pingpong::PingPong,
    &crate::sync::ordering::MemoryOrder,
];

/// The kernel with this id.
pub fn find(id: &str) -> Option<&'static dyn Kernel> {
    KERNELS.iter().copied().find(|k| k.id() == id)
}
