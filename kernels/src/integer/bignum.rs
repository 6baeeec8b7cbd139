//! `integer.bignum`: products of 2,048-bit numbers limb by limb, and a modular power by P. Montgomery's method ("Modular
//! Multiplication Without Trial Division", Mathematics of Computation 44 (1985)).
//!
//! 1. A and B are multiplied sixteen times; after product i, A ← (its low half) ⊕ Cᵢ, B ← (its high half) ⊕ (Cᵢ, limbs in
//!    reverse order). Nothing of a product is left out.
//! 2. With N odd, at least 2²⁰⁴⁷, R = 2²⁰⁴⁸, and M(u, v) = u·v/R mod N, fully reduced: for each of 24 bits of the exponent e, from
//!    bit 23 down: y ← M(y, y), then y ← M(y, x₁) for a one, M(y, x₀) for a zero.
//!
//! Eight limbs of one factor meet all limbs of the other, one after the other: a window of eight limbs of the sum stays in
//! registers and moves up by one limb each time ("row"). Montgomery's reduction finds eight multiples of N from N's lowest eight
//! limbs; then these eight are the fixed factor for the rest of N.
//!
//! Operands, in stream order, numbers from the lowest limb: A, B, C₀ … C₁₅, N, y, x₀, x₁, e. In N the lowest bit and the highest
//! are set, in y, x₀ and x₁ the highest is cleared. Output: the sixteenth product, 64 limbs; y after 12 bits and after 24.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

use super::common_rows::{ByCarry, Eight, Rows};

const LIMBS: usize = 32;
const PRODUCTS: usize = 16;
const BITS: usize = 24;

type Number = [u64; LIMBS];
type Double = [u64; 2 * LIMBS];

/// See the file's head.
pub struct Bignum;

impl Kernel for Bignum {
    fn id(&self) -> &'static str {
        "integer.bignum"
    }

    fn summary(&self) -> &'static str {
        "multiplier and carries: 2048-bit products and a Montgomery power"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(6)]
    }

    fn output_words(&self, _size: Size) -> usize {
        4 * LIMBS
    }

    fn work(&self, _size: Size) -> Work {
        // a reduction takes as many products of limbs as a product, and one for each limb's multiple, which is not counted
        Work { amount: ((PRODUCTS + 2 * 2 * BITS) * LIMBS * LIMBS) as u64, unit: "multiply" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["mul", "adc"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi2, Feature::Adx],
                    marks: &["mulx", "adcx", "adox"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build {
                variant: Variant::Portable,
                needs: &[],
                marks: &["umulh", "mul", "adcs"],
                proven: Proven::Emulator,
            }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        const TOP: u64 = 1 << 63;
        let mut operands = Operands::new(case);
        let mut number = || -> Number { std::array::from_fn(|_| operands.word()) };
        let factors = [number(), number()];
        let masks = (0..PRODUCTS).map(|_| number()).collect();
        let [mut modulus, mut start, mut zero, mut one] = [number(), number(), number(), number()];
        modulus[0] |= 1;
        modulus[LIMBS - 1] |= TOP;
        for below in [&mut start, &mut zero, &mut one] {
            below[LIMBS - 1] &= !TOP;
        }
        let exponent = operands.word();
        operands.finish((2 + PRODUCTS + 4) * LIMBS + 1);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Roles::One(Box::new(Task {
            numbers: Numbers { factors, masks, modulus, start, bases: [zero, one], exponent },
            run,
        }))
    }
}

struct Numbers {
    factors: [Number; 2],
    masks: Vec<Number>,
    modulus: Number,
    start: Number,
    bases: [Number; 2],
    exponent: u64,
}

struct Task {
    numbers: Numbers,
    run: fn(&Numbers, &mut [u64]),
}

impl Ready for Task {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.numbers, out);
    }
}

/// A number by eight limbs. The length is hidden from the compiler, which would unroll every loop over it and leave code that
/// no instruction cache holds.
#[inline(always)]
fn eights(number: &Number) -> &[Eight] {
    std::hint::black_box(number.as_chunks::<8>().0)
}

#[inline(always)]
fn multiply<R: Rows>(a: &Number, b: &Number, out: &mut Double) {
    out[..LIMBS].fill(0);
    let out = out.as_chunks_mut::<8>().0;
    let b = eights(b);
    for (k, a) in eights(a).iter().enumerate() {
        let mut window = [0; 8];
        for (b, out) in b.iter().zip(&mut out[k..]) {
            R::add_rows(out, a, b, &mut window);
        }
        out[k + LIMBS / 8] = window;
    }
}

/// −1/n mod 2⁶⁴ for odd n: Newton's iteration doubles the number of right bits, three at first.
#[inline(always)]
fn inverse(n: u64) -> u64 {
    let mut x = n;
    for _ in 0..5 {
        x = x.wrapping_mul(2u64.wrapping_sub(n.wrapping_mul(x)));
    }
    x.wrapping_neg()
}

/// y ← t/R mod n, fully reduced, for t below R·n.
#[inline(always)]
fn reduce<R: Rows>(t: &mut Double, n: &Number, inverse: u64, y: &mut Number) {
    let t = t.as_chunks_mut::<8>().0;
    let Some((lowest, others)) = eights(n).split_first() else { return };
    let mut carry = false;
    for k in std::hint::black_box(0..LIMBS / 8) {
        let mut window = [0; 8];
        let multiples = R::find_rows(&t[k], lowest, inverse, &mut window);
        for (n, t) in others.iter().zip(&mut t[k + 1..]) {
            R::add_rows(t, &multiples, n, &mut window);
        }
        for (t, w) in t[k + LIMBS / 8].iter_mut().zip(window) {
            (*t, carry) = t.carrying_add(w, carry);
        }
    }
    let high = t[LIMBS / 8..].as_flattened();
    let mut borrow = false;
    for ((y, high), n) in y.iter_mut().zip(high).zip(n) {
        (*y, borrow) = high.borrowing_sub(*n, borrow);
    }
    // n did not fit: as it was
    let keep = u64::from(borrow && !carry).wrapping_neg();
    for (y, high) in y.iter_mut().zip(high) {
        *y = high & keep | *y & !keep;
    }
}

#[inline(always)]
fn body<R: Rows>(numbers: &Numbers, out: &mut [u64]) {
    let mut t = [0; 2 * LIMBS];
    let [mut a, mut b] = numbers.factors;
    for mask in &numbers.masks {
        multiply::<R>(&a, &b, &mut t);
        let (low, high) = t.split_at(LIMBS);
        for i in 0..LIMBS {
            a[i] = low[i] ^ mask[i];
            b[i] = high[i] ^ mask[LIMBS - 1 - i];
        }
    }
    let (product, powers) = out.split_at_mut(2 * LIMBS);
    product.copy_from_slice(&t);
    let inverse = inverse(numbers.modulus[0]);
    let mut y = numbers.start;
    for step in 0..2 * BITS {
        // an even step squares, an odd one takes a bit of the exponent in
        let bit = numbers.exponent >> (BITS - 1 - step / 2) & 1;
        let factor = if step % 2 == 0 { y } else { numbers.bases[bit as usize] };
        multiply::<R>(&y, &factor, &mut t);
        reduce::<R>(&mut t, &numbers.modulus, inverse, &mut y);
        if step % BITS == BITS - 1 {
            powers[step / BITS * LIMBS..][..LIMBS].copy_from_slice(&y);
        }
    }
}

#[inline(never)]
fn portable(numbers: &Numbers, out: &mut [u64]) {
    body::<ByCarry>(numbers, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi2,adx")]
fn avx2(numbers: &Numbers, out: &mut [u64]) {
    body::<super::common_rows_x86::TwoFlags>(numbers, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(numbers: &Numbers, out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when its features are present
    unsafe { avx2(numbers, out) }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The largest operands carry as far as carries go: (2ᵏ − 1)² = 2²ᵏ − 2ᵏ⁺¹ + 1; and with N = R − 1, R ≡ 1: M(u, v) = u·v mod N.
    fn extremes<R: Rows>() {
        let all = [u64::MAX; LIMBS];
        let mut t = [0; 2 * LIMBS];
        multiply::<R>(&all, &all, &mut t);
        let square: Double = std::array::from_fn(|i| match i {
            0 => 1,
            LIMBS => u64::MAX - 1,
            _ if i < LIMBS => 0,
            _ => u64::MAX,
        });
        assert_eq!(t, square);
        // N − 1 squared is 1
        let mut below = all;
        below[0] -= 1;
        multiply::<R>(&below, &below, &mut t);
        let mut one = [0; LIMBS];
        one[0] = 1;
        let mut y = all;
        reduce::<R>(&mut t, &all, inverse(u64::MAX), &mut y);
        assert_eq!(y, one);
        // N itself, as a factor, is nothing
        multiply::<R>(&all, &below, &mut t);
        reduce::<R>(&mut t, &all, inverse(u64::MAX), &mut y);
        assert_eq!(y, [0; LIMBS]);
    }

    #[test]
    fn longest_carries_by_plain_code() {
        extremes::<ByCarry>();
    }

    #[cfg(target_arch = "x86_64")]
    #[test]
    fn longest_carries_by_two_flags() {
        use crate::isa::Feature;
        if Feature::Bmi2.present() && Feature::Adx.present() {
            extremes::<super::super::common_rows_x86::TwoFlags>();
        }
    }
}
