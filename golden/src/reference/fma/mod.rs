//! References of the fused multiply-add family.

pub mod chain32;
pub mod chain64;
mod common_chain;
mod common_matmul;
pub mod matmul32;
pub mod matmul64;
pub mod mixed;
