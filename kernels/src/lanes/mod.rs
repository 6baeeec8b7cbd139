//! One generic body over a lane trait: each kernel's algorithm is written once, a variant only walks it in other widths.

pub mod fma;
pub mod fma32;
pub mod fma64;
