//! What can be run on this host, and what cannot and why.

use kernels::isa::{self, Missing};
use kernels::{Size, Variant, catalogue};

/// Kernel × variant × size: the smallest thing that a plan speaks of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Unit {
    /// Kernel id.
    pub kernel: &'static str,
    /// Variant.
    pub variant: Variant,
    /// Footprint.
    pub size: Size,
}

/// A variant that was built but cannot run here.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Skipped {
    /// Kernel id.
    pub kernel: &'static str,
    /// Variant.
    pub variant: Variant,
    /// Why.
    pub why: String,
}

/// Every unit of the kernels that `wanted` accepts, and the variants that cannot run here.
pub fn available(wanted: impl Fn(&str) -> bool) -> (Vec<Unit>, Vec<Skipped>) {
    let (mut units, mut skipped) = (Vec::new(), Vec::new());
    for kernel in catalogue::KERNELS.iter().filter(|k| wanted(k.id())) {
        for (variant, proof) in isa::survey(*kernel) {
            match proof {
                Ok(_) => units.extend(kernel.sizes().iter().map(|&size| Unit { kernel: kernel.id(), variant, size })),
                Err(Missing::NotBuilt) => {}
                Err(why) => skipped.push(Skipped { kernel: kernel.id(), variant, why: why.to_string() }),
            }
        }
    }
    (units, skipped)
}
