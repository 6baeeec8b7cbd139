//! Fused multiply-add units. There is no x86-64 `portable` here: without the instruction, a fused multiply-add is a
//! library routine on the integer units.

pub mod chain32;
pub mod chain64;
mod common_matmul;
mod common_operands;
mod common_walk;
pub mod matmul32;
pub mod matmul64;
pub mod mixed;
