//! `integer.divide`: the divider at every width, quotient and remainder both consumed.
//!
//! Four independent chains of a word x. A step divides five times, each time by the step's own divisor:
//! 1. 128 / 64 bit, the dividend h·2⁶⁴ + l with l = rotl(x, 32) ⊕ a and h the leading bits of x, one fewer than the
//!    divisor has, so that h is below the divisor and the quotient fits in 64 bits whatever x is;
//! 2. 64 / 64 bit, x unsigned; 3. 64 / 64 bit, x signed (truncating towards zero);
//! 4. 32 / 32 bit, the low half of x unsigned; 5. 32 / 32 bit, the high half of x signed.
//!
//! After each one x ← rotl(x + q, 29)·K + r mod 2⁶⁴. That is a bijection of x + q for a given r, and one of r for a
//! given q: a wrong quotient or a wrong remainder always changes x, and a changed x stays changed but for coincidence.
//! Divisors have every bit length, so quotients are short and long.
//!
//! Operands, in stream order: 4 starts, then for each of 128 steps six words: wide divisor w₀, addend a, long divisor
//! w₂, signed divisor w₃, short divisors w₄ (low half unsigned, high half signed), and the shape word w₅. A divisor is
//! its word with the top bit set, shifted right: by w₅\[0..6\] (w₀), w₅\[6..12\] (w₂), 1 + min(w₅\[12..18\], 61) (w₃),
//! w₅\[19..24\] (low w₄), 1 + min(w₅\[24..29\], 29) (high w₄). The signed two are negated where w₅ has bit 18 or bit 29.
//! Their magnitude is at least 2, so the one overflowing quotient cannot arise. Output: the 4 chains.
//!
//! On x86-64 the avx2 build gives division 1 to a single `div`; portable builds use two 64 / 32 bit divisions.

use std::num::{NonZeroU32, NonZeroU64};

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const CHAINS: usize = 4;
const STEPS: usize = 128;
const DIVISIONS: usize = 5;
const SPREAD: u64 = 0x9e37_79b9_7f4a_7c15;

/// See the file's head.
pub struct Divide;

impl Kernel for Divide {
    fn id(&self) -> &'static str {
        "integer.divide"
    }

    fn summary(&self) -> &'static str {
        "integer divider: 128/64, 64/64 and 32/32 bit, signed and unsigned, quotient and remainder consumed"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(6)]
    }

    fn output_words(&self, _size: Size) -> usize {
        CHAINS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (CHAINS * STEPS * DIVISIONS) as u64, unit: "divide" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["div", "idiv"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Bmi1, Feature::Bmi2],
                    marks: &["div", "idiv", "rorx"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["udiv", "sdiv"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let start = std::array::from_fn(|_| operands.word());
        let steps = (0..STEPS).map(|_| Step::draw(&mut operands)).collect();
        operands.finish(CHAINS + 6 * STEPS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Roles::One(Box::new(Chains { start, steps, run }))
    }
}

/// The divisors of one step.
struct Step {
    wide: NonZeroU64,
    addend: u64,
    long: NonZeroU64,
    signed: i64,
    short: NonZeroU32,
    short_signed: i32,
}

impl Step {
    fn draw(operands: &mut Operands) -> Step {
        let mut w = [0; 6];
        w.fill_with(|| operands.word());
        let shape = w[5];
        let field = |from: u32, bits: u32| (shape >> from) as u32 & ((1 << bits) - 1);
        let negated = |bit: u32| shape >> bit & 1 == 1;
        // every shift stays below the width, so the bit set at the top survives and no divisor is zero
        let cut = |word: u64, shift: u32| NonZeroU64::new((word | 1 << 63) >> shift).expect("top bit was set");
        let cut_short = |word: u32, shift: u32| NonZeroU32::new((word | 1 << 31) >> shift).expect("top bit was set");
        let signed = ((w[3] | 1 << 63) >> (1 + field(12, 6).min(61))) as i64;
        let short_signed = (((w[4] >> 32) as u32 | 1 << 31) >> (1 + field(24, 5).min(29))) as i32;
        Step {
            wide: cut(w[0], field(0, 6)),
            addend: w[1],
            long: cut(w[2], field(6, 6)),
            signed: if negated(18) { -signed } else { signed },
            short: cut_short(w[4] as u32, field(19, 5)),
            short_signed: if negated(29) { -short_signed } else { short_signed },
        }
    }
}

struct Chains {
    start: [u64; CHAINS],
    steps: Vec<Step>,
    run: fn(&[Step], [u64; CHAINS]) -> [u64; CHAINS],
}

impl Ready for Chains {
    fn run(&mut self, out: &mut [u64]) {
        out.copy_from_slice(&(self.run)(&self.steps, self.start));
    }
}

/// The high half of division 1's dividend: below `divisor`, which has `64 - leading_zeros` bits, because it has one
/// bit fewer. Two shifts, as one by 64 would not be defined.
#[inline(always)]
fn high_half(x: u64, divisor: NonZeroU64) -> u64 {
    (x >> 1) >> divisor.leading_zeros()
}

#[inline(always)]
fn absorb(x: u64, quotient: u64, remainder: u64) -> u64 {
    x.wrapping_add(quotient).rotate_left(29).wrapping_mul(SPREAD).wrapping_add(remainder)
}

#[inline(always)]
fn body(steps: &[Step], mut chains: [u64; CHAINS], wide: impl Fn(u64, u64, NonZeroU64) -> (u64, u64)) -> [u64; CHAINS] {
    for step in steps {
        for x in &mut chains {
            let (q, r) = wide(*x, x.rotate_left(32) ^ step.addend, step.wide);
            *x = absorb(*x, q, r);
            let (q, r) = (*x / step.long, *x % step.long);
            *x = absorb(*x, q, r);
            let (n, d) = (*x as i64, step.signed);
            *x = absorb(*x, n.wrapping_div(d) as u64, n.wrapping_rem(d) as u64);
            let (n, d) = (*x as u32, step.short);
            *x = absorb(*x, u64::from(n / d), u64::from(n % d));
            let (n, d) = ((*x >> 32) as i32, step.short_signed);
            *x = absorb(*x, u64::from(n.wrapping_div(d) as u32), u64::from(n.wrapping_rem(d) as u32));
        }
    }
    chains
}

/// Two digits of base 2³² by long division, each digit estimated by one 64-bit division and corrected at most twice
/// (D. Knuth, The Art of Computer Programming vol. 2, §4.3.1, algorithm D).
#[inline(always)]
fn by_digits(x: u64, low: u64, divisor: NonZeroU64) -> (u64, u64) {
    const DIGIT: u64 = 0xffff_ffff;
    let high = high_half(x, divisor);
    let shift = divisor.leading_zeros();
    let d = divisor.get() << shift;
    let Some(lead) = NonZeroU64::new(d >> 32) else { return (0, 0) };
    let tail = d & DIGIT;
    let (top, bottom) = (high << shift | (low >> 1) >> (63 - shift), low << shift);
    let digit = |rest: u64, next: u64| {
        let (mut q, mut r) = (rest / lead, rest % lead);
        while q > DIGIT || q.wrapping_mul(tail) > (r << 32 | next) {
            q -= 1;
            r += lead.get();
            if r > DIGIT {
                break;
            }
        }
        (q, (rest << 32 | next).wrapping_sub(q.wrapping_mul(d)))
    };
    let (first, rest) = digit(top, bottom >> 32);
    let (second, rest) = digit(rest, bottom & DIGIT);
    (first << 32 | second, rest >> shift)
}

#[inline(never)]
fn portable(steps: &[Step], chains: [u64; CHAINS]) -> [u64; CHAINS] {
    body(steps, chains, by_digits)
}

#[cfg(target_arch = "x86_64")]
#[inline(always)]
fn at_once(x: u64, low: u64, divisor: NonZeroU64) -> (u64, u64) {
    let high = high_half(x, divisor);
    let (quotient, remainder);
    // SAFETY: `div` faults only for a zero divisor, which the type excludes, or where the high half is not below the
    // divisor, which `high_half` excludes for every x; it touches only the registers named
    unsafe {
        std::arch::asm!(
            "div {d}",
            d = in(reg) divisor.get(),
            inlateout("rax") low => quotient,
            inlateout("rdx") high => remainder,
            options(pure, nomem, nostack),
        );
    }
    (quotient, remainder)
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,bmi1,bmi2")]
fn avx2(steps: &[Step], chains: [u64; CHAINS]) -> [u64; CHAINS] {
    body(steps, chains, at_once)
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(steps: &[Step], chains: [u64; CHAINS]) -> [u64; CHAINS] {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when bmi1, bmi2 and avx2 are
    // present
    unsafe { avx2(steps, chains) }
}
