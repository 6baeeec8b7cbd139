//! `fma.chain32`: binary32 by softfloat, chain by chain.

use kernels::Case;

use super::common_chain::{Plan, ends};
use crate::softfloat::Format;

/// How binary32 chains are driven.
pub(super) const PLAN: Plan = Plan { format: Format::F32, lanes: 16 };

/// The ends of the 192 chains, by accumulator, then lane, then the lanes' sums, two to a word.
pub fn words(case: &Case) -> Vec<u64> {
    ends(&PLAN, case).chunks(2).map(|pair| pair[0] | pair[1] << 32).collect()
}
