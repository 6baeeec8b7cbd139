//! References of the integer family.

pub mod bignum;
pub mod bits;
pub mod carry;
pub mod compress;
pub mod divide;
pub mod multiply;
pub mod sort;
