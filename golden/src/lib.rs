//! What is true: right outputs, accepted only where two independent ways agree.
//!
//! - [`reference`]: Rust on integers alone, sharing no code with the kernels.
//! - [`softfloat`]: IEEE 754 arithmetic on bit patterns, which the floating-point references lean on.
//! - `witness/`: Python on general-purpose libraries; run when tables are made, not at run time.
//! - [`table`]: the values on which both agreed, embedded and pinned by digest.

pub mod reference;
pub mod softfloat;
pub mod table;
