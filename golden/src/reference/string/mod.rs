//! References of the string family.

pub mod copy;
