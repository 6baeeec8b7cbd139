//! What a core is made to do: deterministic computations without IO, clock or threads, knowing no golden value.

pub mod catalogue;
pub mod compare;
pub mod float;
pub mod integer;
pub mod isa;
pub mod kernel;
pub mod lanes;
pub mod operands;

pub use kernel::{Build, Case, Kernel, Proven, Ready, Seed, Size, Variant, Work};
