//! References of the sync family.
