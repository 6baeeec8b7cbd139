//! What a core is made to do: deterministic computations without IO, clock or threads, knowing no golden value.

pub mod aligned;
mod blocks;
pub mod cache;
pub mod catalogue;
pub mod checksum;
pub mod cipher;
pub mod compare;
pub mod float;
pub mod fma;
pub mod integer;
pub mod isa;
pub mod kernel;
pub mod lanes;
pub mod memory;
pub mod operands;
pub mod string;
pub mod sync;
pub mod vector;
pub mod vectors;

pub use kernel::{Build, Case, Kernel, Proven, Ready, Roles, Seed, Size, Variant, Work};
