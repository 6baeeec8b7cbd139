//! Memory and the paths to it: march tests, copies at every alignment.

mod common_digest;
mod common_lanes;
#[cfg(target_arch = "aarch64")]
mod common_lanes_arm;
#[cfg(target_arch = "x86_64")]
mod common_lanes_x86;
pub mod copy;
pub mod march;
