//! References of the cache family.

pub mod walk;
