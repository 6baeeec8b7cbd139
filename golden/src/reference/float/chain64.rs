//! `float.chain64` on softfloat.

use kernels::Case;

use super::common_chain::Recipe;
use crate::reference::chacha::Stream;
use crate::softfloat::Format;

pub(super) const RECIPE: Recipe = Recipe { format: Format::F64, span: 256, shallow: 4, deep: 16 };

/// The 64 last states.
pub fn words(case: &Case) -> Vec<u64> {
    let chains = RECIPE.draw(&mut Stream::new(case), 64, case.seed.0 % 2 == 1);
    RECIPE.walk(&chains, 16)
}
