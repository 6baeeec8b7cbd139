//! References of the checksum family.
