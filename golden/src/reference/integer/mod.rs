//! References of the integer family.

pub mod multiply;
