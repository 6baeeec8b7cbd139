//! Caches: dependent loads and stores over footprints of each level.

pub mod walk;
