//! The bijections that outputs of this family are digested with, and numbers cut to a width.

/// One step of a digest: exclusive or, product with the golden-ratio constant, rotation by 29 to the left.
pub fn chain(digest: u64, word: u64) -> u64 {
    let product = (u128::from(digest ^ word) * 0x9e37_79b9_7f4a_7c15 % (1 << 64)) as u64;
    // the upper 29 bits and the lower 35 change places
    let (upper, lower) = (product / (1 << 35), product % (1 << 35));
    lower * (1 << 29) + upper
}

/// The finaliser of splitmix64.
pub fn mix(word: u64) -> u64 {
    let first = (word ^ (word / (1 << 30))).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    let second = (first ^ (first / (1 << 27))).wrapping_mul(0x94d0_49bb_1331_11eb);
    second ^ (second / (1 << 31))
}

/// The low `bits` bits.
pub fn cut(word: u64, bits: u32) -> u64 {
    (u128::from(word) % (1u128 << bits)) as u64
}
