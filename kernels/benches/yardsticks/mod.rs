//! What a kernel's throughput is held against: the bare loop of the same instruction, as fast as the core issues it.

use kernels::Variant;

mod integer_carry;
mod integer_divide;
mod integer_multiply;
mod vector_gather;
mod vector_shuffle;

/// The bare loop for one kernel and variant.
pub struct Yardstick {
    /// Catalogue id.
    pub kernel: &'static str,
    /// The variant whose instruction it uses.
    pub variant: Variant,
    /// Units of [`kernels::Kernel::work`] per call.
    pub units: u64,
    /// One call.
    pub run: Box<dyn FnMut()>,
}

/// Every yardstick that this CPU can run.
pub fn all() -> Vec<Yardstick> {
    [
        integer_multiply::yardsticks(),
        integer_divide::yardsticks(),
        integer_carry::yardsticks(),
        vector_shuffle::yardsticks(),
        vector_gather::yardsticks(),
    ]
        .into_iter()
        .flatten()
        .collect()
}
