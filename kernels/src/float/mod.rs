//! Floating-point units without fused multiply-add: chains of the five operations, conversions, scalar powers.

pub mod chain32;
pub mod chain64;
mod common_boundary;
mod common_chain;
mod common_pair;
#[cfg(test)]
mod common_persistence;
pub mod convert;
pub mod elementary;
pub mod powcast;
pub mod x87;
