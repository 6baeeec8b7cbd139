//! Vector units: integer arithmetic; data movement by shuffles and gathers.

mod common_gather;
pub mod dot8;
pub mod gather;
pub mod integer;
pub mod mask;
pub mod permute;
pub mod shuffle;
