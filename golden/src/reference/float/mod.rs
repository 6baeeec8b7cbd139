//! Floating-point units, on softfloat.

pub mod chain32;
pub mod chain64;
mod common_chain;
pub mod convert;
pub mod elementary;
pub mod powcast;
pub mod x87;
