//! Integer units: multiplier, divider, carry chains.

pub mod carry;
pub mod divide;
pub mod multiply;
