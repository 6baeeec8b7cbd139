//! References of the cache family.

pub mod evict;
pub mod forward;
pub mod walk;
