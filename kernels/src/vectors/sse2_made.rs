//! Operations that came after SSE2, made of baseline instructions.

use std::arch::x86_64::*;

use super::sse2::*;

/// `name "mnemonic";` with a number: elements of one vector, or of two (low ones of the first, high ones of the second).
macro_rules! picks {
    ($($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "` by N")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name<const N: i32>(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the baseline
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {a}, {b}, {n}"), a = inlateout(xmm_reg) a => r,
                    b = in(xmm_reg) b, n = const N, options(nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

picks! { pick32 "shufps"; pick64 "shufpd"; }

/// `pshufd`
#[inline]
#[target_feature(enable = "sse2")]
pub fn order32<const N: i32>(a: V) -> V {
    let r;
    // SAFETY: touches the registers named only
    unsafe {
        std::arch::asm!("pshufd {r}, {a}, {n}", a = in(xmm_reg) a, r = lateout(xmm_reg) r, n = const N,
            options(nomem, nostack, preserves_flags));
    }
    r
}

macro_rules! made {
    ($($(#[$doc:meta])* fn $name:ident($($a:ident),*) $body:block)*) => {$(
        $(#[$doc])*
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name($($a: V),*) -> V $body
    )*};
}

made! {
    /// `pabsb`
    fn abs8(a) { min_u8(sub8(_mm_setzero_si128(), a), a) }
    /// `pabsw`
    fn abs16(a) { max_s16(sub16(_mm_setzero_si128(), a), a) }
    /// `pabsd`
    fn abs32(a) {
        let sign = right_s32_by::<31>(a);
        sub32(xor(a, sign), sign)
    }
    /// `psignb`: a negated, zeroed or kept by the sign of b
    fn sign8(a, b) {
        let (minus, none) = (gt8(_mm_setzero_si128(), b), eq8(b, _mm_setzero_si128()));
        andnot(none, sub8(xor(a, minus), minus))
    }
    /// `psignw`
    fn sign16(a, b) {
        let (minus, none) = (right_s16_by::<15>(b), eq16(b, _mm_setzero_si128()));
        andnot(none, sub16(xor(a, minus), minus))
    }
    /// `psignd`
    fn sign32(a, b) {
        let (minus, none) = (right_s32_by::<31>(b), eq32(b, _mm_setzero_si128()));
        andnot(none, sub32(xor(a, minus), minus))
    }
    /// `pmulhrsw`: bits 15 to 30 of the product, rounded by the bit below
    fn mul_round16(a, b) {
        let (high, low) = (mul_high_s16(a, b), mul_low16(a, b));
        add16(left16_by::<1>(high), avg16(right16_by::<14>(low), _mm_setzero_si128()))
    }
    /// `pmaddubsw`: unsigned bytes of a times signed bytes of b, sums of two, saturated
    fn madd8(a, b) {
        let even = mul_low16(and(a, _mm_set1_epi16(255)), right_s16_by::<8>(left16_by::<8>(b)));
        let odd = mul_low16(right16_by::<8>(a), right_s16_by::<8>(b));
        adds_s16(even, odd)
    }
    /// `pmulld`
    fn mul_low32(a, b) {
        let (even, odd) = (mul_u32(a, b), mul_u32(right64_by::<32>(a), right64_by::<32>(b)));
        low32(order32::<0x08>(even), order32::<0x08>(odd))
    }
    /// `pmuldq`: products of the signed elements 0 and 2
    fn mul_s32(a, b) {
        let below = add64(and(order32::<0xa0>(right_s32_by::<31>(a)), order32::<0xa0>(b)),
            and(order32::<0xa0>(right_s32_by::<31>(b)), order32::<0xa0>(a)));
        sub64(mul_u32(a, b), left64_by::<32>(below))
    }
    /// `pminsb`
    fn min_s8(a, b) { select(gt8(a, b), b, a) }
    /// `pmaxsb`
    fn max_s8(a, b) { select(gt8(a, b), a, b) }
    /// `pminuw`
    fn min_u16(a, b) { sub16(a, subs_u16(a, b)) }
    /// `pmaxuw`
    fn max_u16(a, b) { add16(subs_u16(a, b), b) }
    /// `pminsd`
    fn min_s32(a, b) { select(gt32(a, b), b, a) }
    /// `pmaxsd`
    fn max_s32(a, b) { select(gt32(a, b), a, b) }
    /// `pminud`
    fn min_u32(a, b) { select(gt_u32(a, b), b, a) }
    /// `pmaxud`
    fn max_u32(a, b) { select(gt_u32(a, b), a, b) }
    /// a > b, unsigned
    fn gt_u32(a, b) {
        let top = _mm_set1_epi32(i32::MIN);
        gt32(xor(a, top), xor(b, top))
    }
    /// absolute differences between the low eight bytes of a and 16-bit numbers
    fn distance(a, b) {
        let a = low8(a, _mm_setzero_si128());
        or(subs_u16(a, b), subs_u16(b, a))
    }
    /// bits of a where the mask has ones, else bits of b
    fn select(mask, a, b) { or(and(mask, a), andnot(mask, b)) }
    /// `pcmpeqq`
    fn eq64(a, b) {
        let halves = eq32(a, b);
        and(halves, order32::<0xb1>(halves))
    }
    /// `pcmpgtq`: by the high halves, or where they are equal by the borrow of b − a
    fn gt64(a, b) {
        let level = and(eq32(a, b), sub64(b, a));
        right_s32_by::<31>(order32::<0xf5>(or(gt32(a, b), level)))
    }
    /// `packusdw`
    fn pack_u32(a, b) {
        let (half, top) = (_mm_set1_epi32(0x8000), _mm_set1_epi16(i16::MIN));
        let a = sub32(andnot(right_s32_by::<31>(a), a), half);
        let b = sub32(andnot(right_s32_by::<31>(b), b), half);
        xor(pack_s32(a, b), top)
    }
    /// even and odd 16-bit numbers apart: the even ones
    fn even16(a, b) { pack_s32(right_s32_by::<16>(left32_by::<16>(a)), right_s32_by::<16>(left32_by::<16>(b))) }
    /// the odd ones
    fn odd16(a, b) { pack_s32(right_s32_by::<16>(a), right_s32_by::<16>(b)) }
    /// `phaddw`
    fn pairs_add16(a, b) { add16(even16(a, b), odd16(a, b)) }
    /// `phaddsw`
    fn pairs_adds16(a, b) { adds_s16(even16(a, b), odd16(a, b)) }
    /// `phsubw`
    fn pairs_sub16(a, b) { sub16(even16(a, b), odd16(a, b)) }
    /// `phsubsw`
    fn pairs_subs16(a, b) { subs_s16(even16(a, b), odd16(a, b)) }
    /// `phaddd`
    fn pairs_add32(a, b) { add32(pick32::<0x88>(a, b), pick32::<0xdd>(a, b)) }
    /// `phsubd`
    fn pairs_sub32(a, b) { sub32(pick32::<0x88>(a, b), pick32::<0xdd>(a, b)) }
    /// `psllvq`
    fn left_each64(a, count) { pick64::<2>(left64(a, count), left64(a, right_bytes::<8>(count))) }
    /// `psrlvq`
    fn right_each64(a, count) { pick64::<2>(right64(a, count), right64(a, right_bytes::<8>(count))) }
}

/// Shifts with a count for each of four elements: the whole vector by each count, and of each one element.
macro_rules! four {
    ($($name:ident $shift:ident;)*) => {$(
        #[doc = concat!("[`", stringify!($shift), "`] with a count for each element")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name(a: V, count: V) -> V {
            let (lowest, upper) = (_mm_set_epi32(0, 0, 0, -1), right_bytes::<8>(count));
            let first = $shift(a, and(count, lowest));
            let second = $shift(a, right64_by::<32>(count));
            let third = $shift(a, and(upper, lowest));
            let fourth = $shift(a, right64_by::<32>(upper));
            let (even, odd) = (pick64::<2>(first, third), pick64::<2>(second, fourth));
            select(_mm_set_epi32(0, -1, 0, -1), even, odd)
        }
    )*};
}

four! { left_each32 left32; right_each32 right32; right_each_s32 right_s32; }

/// `mpsadbw` with 5: sums of four absolute differences between the bytes from each place up to 7 on in `a` (from its byte
/// 4 on) and bytes 4 to 7 of `b`.
#[inline]
#[target_feature(enable = "sse2")]
pub fn sad_window(a: V, b: V) -> V {
    // each of the four bytes as eight 16-bit numbers
    let numbers = low8(right_bytes::<4>(b), _mm_setzero_si128());
    let pairs = low16(numbers, numbers);
    let near = add16(
        distance(right_bytes::<4>(a), order32::<0x00>(pairs)),
        distance(right_bytes::<5>(a), order32::<0x55>(pairs)),
    );
    let far = add16(
        distance(right_bytes::<6>(a), order32::<0xaa>(pairs)),
        distance(right_bytes::<7>(a), order32::<0xff>(pairs)),
    );
    add16(near, far)
}

/// `phminposuw`: the least 16-bit number, in the lowest place, then that number's first place.
#[inline]
#[target_feature(enable = "sse2")]
pub fn least_u16(a: V) -> V {
    // numbers times 8 plus their places, so that one minimum finds both; 32-bit numbers that stay below 2¹⁹
    let none = _mm_setzero_si128();
    let low = or(left32_by::<3>(low16(a, none)), _mm_set_epi32(3, 2, 1, 0));
    let high = or(left32_by::<3>(high16(a, none)), _mm_set_epi32(7, 6, 5, 4));
    let least = select(gt32(low, high), high, low);
    let other = right_bytes::<8>(least);
    let least = select(gt32(least, other), other, least);
    let other = right_bytes::<4>(least);
    let least = and(select(gt32(least, other), other, least), _mm_set_epi32(0, 0, 0, -1));
    or(right32_by::<3>(least), left64_by::<16>(and(least, _mm_set_epi32(0, 0, 0, 7))))
}

/// Elements of memory widened to fill a register: how many bytes of it, and what is made of them.
macro_rules! widened {
    ($($name:ident $bytes:literal |$a:ident| $made:expr;)*) => {$(
        #[doc = concat!("From ", stringify!($bytes), " bytes.")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name(line: &super::Line, at: usize) -> V {
            let from: &[u8; $bytes] = line.0[at * $bytes / 16..].first_chunk().expect("a line has four nets");
            let mut word = [0; 8];
            word[..$bytes].copy_from_slice(from);
            let $a = _mm_cvtsi64_si128(i64::from_le_bytes(word));
            $made
        }
    )*};
}

widened! {
    zero8to16 8 |a| low8(a, _mm_setzero_si128());
    zero8to32 4 |a| low16(low8(a, _mm_setzero_si128()), _mm_setzero_si128());
    zero8to64 2 |a| low32(low16(low8(a, _mm_setzero_si128()), _mm_setzero_si128()), _mm_setzero_si128());
    zero16to32 8 |a| low16(a, _mm_setzero_si128());
    zero16to64 4 |a| low32(low16(a, _mm_setzero_si128()), _mm_setzero_si128());
    zero32to64 8 |a| low32(a, _mm_setzero_si128());
    sign8to16 8 |a| right_s16_by::<8>(low8(a, a));
    sign8to32 4 |a| {
        let twice = low8(a, a);
        right_s32_by::<24>(low16(twice, twice))
    };
    sign8to64 2 |a| {
        let twice = low8(a, a);
        let number = right_s32_by::<24>(low16(twice, twice));
        low32(number, right_s32_by::<31>(number))
    };
    sign16to32 8 |a| right_s32_by::<16>(low16(a, a));
    sign16to64 4 |a| {
        let number = right_s32_by::<16>(low16(a, a));
        low32(number, right_s32_by::<31>(number))
    };
    sign32to64 8 |a| low32(a, right_s32_by::<31>(a));
}
