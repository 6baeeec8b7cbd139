//! From a wrong output to a statement about a core: confirmation, then verdict.

pub mod confirm;
pub mod design;
pub mod verdict;
