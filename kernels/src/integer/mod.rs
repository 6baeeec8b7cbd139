//! Integer units: multiplier, divider, carry chains.

pub mod carry;
#[cfg(target_arch = "x86_64")]
#[macro_use]
mod common_multiply_x86;
pub mod divide;
pub mod multiply;
