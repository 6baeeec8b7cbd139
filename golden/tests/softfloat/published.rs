//! Published values by name.

use golden::softfloat::{Format, Round, div, from_int, mul, sub};
use golden::{reference, table};
use kernels::{Case, Seed, Size};

const F: Format = Format::F64;
const NEAR: Round = Round::NearestEven;

fn whole(v: i64) -> u64 {
    from_int(F, v, NEAR).0
}

/// The division control: 4195835/3145727 is 1.33382044913624…, a 1994 divider gave 1.33373906890203…, for which
/// x − y·(x/y) is 256 (Nicely's report of 1994 and its follow-ups; bits computed with MPFR).
#[test]
fn division_control() {
    let (x, y) = (whole(4_195_835), whole(3_145_727));
    let quotient = div(F, x, y, NEAR).0;
    assert_eq!(quotient, 0x3ff5_5754_1c7c_6b43);
    assert_eq!(sub(F, x, mul(F, y, quotient, NEAR).0, NEAR).0, 0);
}

/// 1.1^n and its integer part: Dixit et al. 2021, arXiv 2102.11245 §5 (integers); bits by MPFR, correctly rounded.
const POWERS: [(i32, u64, u64); 7] = [
    (53, 0x4063_87e9_44c9_6648, 156),
    (68, 0x4084_6577_acf6_ca26, 652),
    (3, 0x3ff5_4bc6_a7ef_9db4, 1),
    (107, 0x40da_39a0_f45e_6452, 26854),
    (-3, 0x3fe8_0ac5_565b_efd6, 0),
    (52, 0x4061_c15f_b2e5_a2cd, 142),
    (78, 0x409a_7392_2a42_128f, 1692),
];

/// The published powers stand first in every output of `float.powcast`, in the table and by the reference.
#[test]
fn published_powers() {
    for seed in [0, 1, 63] {
        let case = Case { kernel: "float.powcast", seed: Seed(seed), size: Size(4) };
        let accepted = table::expected(&case).expect("a case of the table");
        let computed = reference::words(&case).expect("a reference");
        for (i, (exponent, bits, integer)) in POWERS.into_iter().enumerate() {
            for words in [accepted, &computed] {
                assert_eq!(words[i], bits, "1.1^{exponent}: {:#x}", words[i]);
                assert_eq!(words[48 + i], integer, "int(1.1^{exponent})");
            }
        }
    }
}
