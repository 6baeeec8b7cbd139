//! References of the vector family.

pub mod gather;
pub mod shuffle;
