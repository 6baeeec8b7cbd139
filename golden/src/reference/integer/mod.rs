//! References of the integer family.

pub mod carry;
pub mod divide;
pub mod multiply;
