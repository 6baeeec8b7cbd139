//! Vector data movement: shuffles and gathers.

mod common_gather;
pub mod gather;
pub mod shuffle;
