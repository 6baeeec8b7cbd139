//! Source of truth: `rustc_apfloat` (a port of LLVM's APFloat) for the x87 extended format at its full 64 bits.

use golden::softfloat::Round;
use golden::softfloat::extended::{Control, Extended};
use rustc_apfloat::ieee::X87DoubleExtended as Theirs;
use rustc_apfloat::{Float, Round as TheirRound};

use crate::inputs::Mix;

fn theirs(x: Extended) -> Theirs {
    let [significand, upper] = x.words();
    Theirs::from_bits(u128::from(upper) << 64 | u128::from(significand))
}

fn number(mix: &mut Mix, near: i32) -> Extended {
    let place = mix.below(64);
    let noise = mix.next();
    let significand = 1 << 63 | if mix.below(2) == 0 { noise } else { noise >> place << place };
    let exponent = near + mix.below(140) as i32 - 70;
    Extended { negative: mix.below(2) == 0, exponent, significand }
}

#[test]
fn arithmetic_of_64_bits() {
    let mut mix = Mix(87);
    for i in 0..400_000 {
        let round = Round::ALL[i % 4];
        let direction = match round {
            Round::NearestEven => TheirRound::NearestTiesToEven,
            Round::TowardZero => TheirRound::TowardZero,
            Round::Up => TheirRound::TowardPositive,
            Round::Down => TheirRound::TowardNegative,
        };
        let near = mix.below(4000) as i32 - 2000;
        let (a, b) = (number(&mut mix, near), number(&mut mix, near));
        let c = Control { round, bits: 64 };
        let (x, y) = (theirs(a), theirs(b));
        let same = |ours: Extended, right: Theirs| {
            assert_eq!(theirs(ours).to_bits(), right.to_bits(), "{a:?} {b:?} {round:?}")
        };
        if a != b.negate() {
            same(a.add(b, c), x.add_r(y, direction).value);
        }
        same(a.mul(b, c), x.mul_r(y, direction).value);
        same(a.div(b, c), x.div_r(y, direction).value);
        same(a.integral(round), x.round_to_integral(direction).value);
        assert_eq!(a.less(b), x < y, "{a:?} {b:?}");
        if (0..63).contains(&(a.exponent - b.exponent)) {
            same(a.remainder(b).0, x.c_fmod(y).value);
        }
    }
}
