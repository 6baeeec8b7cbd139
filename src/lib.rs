//! Finds CPU cores that compute wrongly, and says how rare their wrong answers are.

pub mod stats;
