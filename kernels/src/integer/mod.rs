//! Integer units: multiplier, divider, carry chains, bit operations, and longer code made of them.

pub mod bignum;
pub mod bits;
pub mod carry;
mod common_bits;
#[cfg(target_arch = "x86_64")]
#[macro_use]
mod common_bits_x86;
#[cfg(target_arch = "x86_64")]
mod common_bits_x86_bmi;
mod common_match;
mod common_rows;
#[cfg(target_arch = "x86_64")]
mod common_rows_x86;
mod common_sort;
mod common_stream;
#[cfg(target_arch = "x86_64")]
#[macro_use]
mod common_multiply_x86;
pub mod compress;
pub mod divide;
pub mod multiply;
pub mod sort;
