//! What passes between two cores: atomics, locks, ownership of cache lines, order of memory accesses.
//!
//! Every kernel here takes an ordered pair of cpus. Each role writes its own half of the output, so that the half, and the
//! place in it, that is wrong says which of the two saw or did the wrong thing.

pub mod common_access;
pub mod common_atoms;
#[cfg(target_arch = "aarch64")]
pub mod common_atoms_arm;
#[cfg(target_arch = "x86_64")]
pub mod common_atoms_x86;
pub mod common_carry;
mod common_counter;
pub mod common_locks;
pub mod common_meet;
pub mod common_shapes;
pub mod counter;
pub mod lock;
pub mod ordering;
pub mod pingpong;
