//! References of the memory family.

pub mod common_digest;
pub mod copy;
pub mod march;
pub mod stream;
pub mod walk;
