//! References of the sync family: what two roles bring about together, computed one after the other.

pub mod common_words;
pub mod counter;
pub mod lock;
pub mod ordering;
pub mod pingpong;
