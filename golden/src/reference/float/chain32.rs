//! `float.chain32` on softfloat.

use kernels::Case;

use super::common_chain::Recipe;
use crate::reference::chacha::Stream;
use crate::softfloat::Format;

const RECIPE: Recipe = Recipe { format: Format::F32, span: 32, shallow: 2, deep: 8 };

/// The 128 last states, two a word.
pub fn words(case: &Case) -> Vec<u64> {
    let chains = RECIPE.draw(&mut Stream::new(case), 128, case.seed.0 % 2 == 1);
    RECIPE.walk(&chains, 16).chunks(2).map(|pair| pair[0] | pair[1] << 32).collect()
}
