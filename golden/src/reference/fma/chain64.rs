//! `fma.chain64`: binary64 by softfloat, chain by chain.

use kernels::Case;

use super::common_chain::{Plan, ends};
use crate::softfloat::Format;

/// How binary64 chains are driven.
pub(super) const PLAN: Plan = Plan { format: Format::F64, lanes: 8 };

/// The ends of the 96 chains, by accumulator, then lane, then the lanes' sums.
pub fn words(case: &Case) -> Vec<u64> {
    ends(&PLAN, case)
}
