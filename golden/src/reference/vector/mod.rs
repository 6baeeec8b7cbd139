//! References of the vector family.

pub mod shuffle;
