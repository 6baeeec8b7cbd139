//! `fma.matmul64` on softfloat.

use kernels::Case;

use super::common_matmul::Plan;
use crate::softfloat::Format;

/// The closed product's alarms and digests.
pub fn words(case: &Case) -> Vec<u64> {
    Plan { format: Format::F64, span: 900 }.words(case)
}
