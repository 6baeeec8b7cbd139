//! Vector data movement: shuffles and gathers.

pub mod shuffle;
