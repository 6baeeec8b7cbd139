//! Vector registers behind traits, so that an algorithm is written once and walked in any width.
//!
//! Every method is `#[inline(always)]` and `unsafe`: the caller is a wrapper with `#[target_feature]`, reached only
//! with a [`crate::isa::Proof`], and that is where the instructions end up. No method changes rounding or flushing modes.

pub mod arithmetic;
pub mod bits;
pub mod convert;
mod f32;
mod f64;
pub mod fma;
pub mod fma32;
pub mod fma64;
pub mod mixed;

pub use arithmetic::Arithmetic;
pub use convert::Convert;
