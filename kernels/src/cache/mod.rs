//! Caches: dependent loads and stores over footprints of each level, conflicts within sets,
//! loads right behind stores.

mod common_touch;
#[cfg(target_arch = "aarch64")]
mod common_touch_arm;
#[cfg(target_arch = "x86_64")]
mod common_touch_x86;
pub mod evict;
pub mod forward;
pub mod walk;
