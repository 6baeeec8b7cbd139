//! Integer-only references, one a kernel, under the kernel's own file stem. `scripts/check-reference` holds the rules:
//! no `f32`/`f64`, no SIMD, nothing of `kernels` but [`Case`].

pub mod chacha;
pub mod float;
pub mod integer;

use kernels::Case;

/// Computes the right output words of a case.
pub type Reference = fn(&Case) -> Vec<u64>;

/// Every reference by kernel id.
pub static REFERENCES: &[(&str, Reference)] = &[
    ("integer.multiply", integer::multiply::words),
    ("float.chain32", float::chain32::words),
    ("float.chain64", float::chain64::words),
    ("float.convert", float::convert::words),
    ("float.powcast", float::powcast::words),
];

/// The right output of `case`, computed now; `None` for an unknown kernel.
pub fn words(case: &Case) -> Option<Vec<u64>> {
    REFERENCES.iter().find(|(id, _)| *id == case.kernel).map(|(_, reference)| reference(case))
}
