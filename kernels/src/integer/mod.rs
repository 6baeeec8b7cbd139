//! Integer units: multiplier, divider, carry chains.

pub mod multiply;
