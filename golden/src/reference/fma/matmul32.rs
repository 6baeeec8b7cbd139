//! `fma.matmul32` on softfloat.

use kernels::Case;

use super::common_matmul::Plan;
use crate::softfloat::Format;

/// The closed product's alarms and digests.
pub fn words(case: &Case) -> Vec<u64> {
    Plan { format: Format::F32, span: 100 }.words(case)
}
