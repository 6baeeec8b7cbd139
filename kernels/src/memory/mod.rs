//! Memory and the paths to it: march tests, copies at every alignment, streams around the caches, walks over pages.

pub(crate) mod common_digest;
pub(crate) mod common_lanes;
#[cfg(target_arch = "aarch64")]
pub(crate) mod common_lanes_arm;
#[cfg(target_arch = "x86_64")]
pub(crate) mod common_lanes_x86;
mod common_quad;
mod common_stream;
#[cfg(target_arch = "aarch64")]
mod common_stream_arm;
#[cfg(target_arch = "x86_64")]
mod common_stream_x86;
pub mod copy;
pub mod march;
pub mod stream;
pub mod walk;
