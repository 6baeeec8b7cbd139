//! References of the string family.
