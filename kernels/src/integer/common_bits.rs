//! The operations of `integer.bits` by name, each with its definition in plain Rust; the x86 builds override nearly all.

/// What an addition or subtraction of `bits` bits says of itself.
struct Flags {
    carry: bool,
    zero: bool,
    sign: bool,
    overflow: bool,
    parity: bool,
}

impl Flags {
    /// Of x + y, or of x − y where `minus`; both are below 2ᵇⁱᵗˢ.
    #[inline(always)]
    fn of(x: u64, y: u64, bits: u32, minus: bool) -> Flags {
        let top = |v: u64| v >> (bits - 1) & 1 == 1;
        let (wrapped, wide) = if minus { x.overflowing_sub(y) } else { x.overflowing_add(y) };
        let result = wrapped & (u64::MAX >> (64 - bits));
        Flags {
            carry: if bits == 64 { wide } else { wrapped != result },
            zero: result == 0,
            sign: top(result),
            overflow: top(x) != top(result) && (top(x) == top(y)) != minus,
            parity: (result as u8).count_ones().is_multiple_of(2),
        }
    }

    /// The sixteen conditions of the x86 instruction set in the order of their codes: o no b ae e ne be a s ns p np l ge le g.
    #[inline(always)]
    fn conditions(&self) -> [bool; 16] {
        let less = self.sign != self.overflow;
        let yes = [
            self.overflow,
            self.carry,
            self.zero,
            self.carry || self.zero,
            self.sign,
            self.parity,
            less,
            less || self.zero,
        ];
        std::array::from_fn(|i| yes[i / 2] != (i % 2 == 1))
    }
}

/// The operations; a count k is below 64 everywhere. What each is may be read at the head of `bits.rs`.
pub(super) trait Bits {
    #[inline(always)]
    fn shl(a: u64, k: u32) -> u64 {
        a << k
    }
    #[inline(always)]
    fn shr(a: u64, k: u32) -> u64 {
        a >> k
    }
    #[inline(always)]
    fn sar(a: u64, k: u32) -> u64 {
        (a as i64 >> k) as u64
    }
    #[inline(always)]
    fn shl32(a: u64, k: u32) -> u64 {
        u64::from((a as u32) << (k & 31))
    }
    #[inline(always)]
    fn shr32(a: u64, k: u32) -> u64 {
        u64::from(a as u32 >> (k & 31))
    }
    #[inline(always)]
    fn sar32(a: u64, k: u32) -> u64 {
        u64::from((a as i32 >> (k & 31)) as u32)
    }
    #[inline(always)]
    fn shld(a: u64, b: u64, k: u32) -> u64 {
        ((u128::from(a) << 64 | u128::from(b)) << k >> 64) as u64
    }
    #[inline(always)]
    fn shrd(a: u64, b: u64, k: u32) -> u64 {
        ((u128::from(b) << 64 | u128::from(a)) >> k) as u64
    }
    #[inline(always)]
    fn rol(a: u64, k: u32) -> u64 {
        a.rotate_left(k)
    }
    #[inline(always)]
    fn ror(a: u64, k: u32) -> u64 {
        a.rotate_right(k)
    }
    #[inline(always)]
    fn rol32(a: u64, k: u32) -> u64 {
        u64::from((a as u32).rotate_left(k & 31))
    }
    #[inline(always)]
    fn ror32(a: u64, k: u32) -> u64 {
        u64::from((a as u32).rotate_right(k & 31))
    }
    #[inline(always)]
    fn rol16(a: u64, k: u32) -> u64 {
        u64::from((a as u16).rotate_left(k & 15))
    }
    #[inline(always)]
    fn ror8(a: u64, k: u32) -> u64 {
        u64::from((a as u8).rotate_right(k & 7))
    }
    /// Rotates the carry and a, 65 bits, to the left.
    #[inline(always)]
    fn rcl(a: u64, k: u32, carry: bool) -> (u64, bool) {
        let ring = u128::from(carry) << 64 | u128::from(a);
        let turned = ring << k | ring >> (65 - k);
        (turned as u64, turned >> 64 & 1 == 1)
    }
    /// The same to the right.
    #[inline(always)]
    fn rcr(a: u64, k: u32, carry: bool) -> (u64, bool) {
        let ring = u128::from(carry) << 64 | u128::from(a);
        let turned = ring >> k | ring << (65 - k);
        (turned as u64, turned >> 64 & 1 == 1)
    }
    #[inline(always)]
    fn popcnt(a: u64) -> u64 {
        u64::from(a.count_ones())
    }
    #[inline(always)]
    fn popcnt32(a: u64) -> u64 {
        u64::from((a as u32).count_ones())
    }
    #[inline(always)]
    fn lzcnt(a: u64) -> u64 {
        u64::from(a.leading_zeros())
    }
    #[inline(always)]
    fn lzcnt32(a: u64) -> u64 {
        u64::from((a as u32).leading_zeros())
    }
    #[inline(always)]
    fn tzcnt(a: u64) -> u64 {
        u64::from(a.trailing_zeros())
    }
    #[inline(always)]
    fn tzcnt32(a: u64) -> u64 {
        u64::from((a as u32).trailing_zeros())
    }
    /// Place of the highest bit; a is not zero.
    #[inline(always)]
    fn bsr(a: u64) -> u64 {
        u64::from(63 - a.leading_zeros())
    }
    /// Place of the lowest bit; a is not zero.
    #[inline(always)]
    fn bsf(a: u64) -> u64 {
        u64::from(a.trailing_zeros())
    }
    #[inline(always)]
    fn pdep(a: u64, mut mask: u64) -> u64 {
        let mut out = 0;
        let mut bit = 1;
        while mask != 0 {
            if a & bit != 0 {
                out |= mask & mask.wrapping_neg();
            }
            mask &= mask - 1;
            bit <<= 1;
        }
        out
    }
    #[inline(always)]
    fn pext(a: u64, mut mask: u64) -> u64 {
        let (mut out, mut k) = (0, 0);
        while mask != 0 {
            out |= (a >> mask.trailing_zeros() & 1) << k;
            mask &= mask - 1;
            k += 1;
        }
        out
    }
    #[inline(always)]
    fn bextr(a: u64, start: u32, length: u32) -> u64 {
        (a >> start) & ((1 << length) - 1)
    }
    #[inline(always)]
    fn bzhi(a: u64, k: u32) -> u64 {
        a & ((1 << k) - 1)
    }
    #[inline(always)]
    fn blsi(a: u64) -> u64 {
        a & a.wrapping_neg()
    }
    #[inline(always)]
    fn blsr(a: u64) -> u64 {
        a & a.wrapping_sub(1)
    }
    #[inline(always)]
    fn blsmsk(a: u64) -> u64 {
        a ^ a.wrapping_sub(1)
    }
    #[inline(always)]
    fn andn(a: u64, b: u64) -> u64 {
        !a & b
    }
    #[inline(always)]
    fn rorx27(a: u64) -> u64 {
        a.rotate_right(27)
    }
    #[inline(always)]
    fn bswap(a: u64) -> u64 {
        a.swap_bytes()
    }
    #[inline(always)]
    fn bswap32(a: u64) -> u64 {
        u64::from((a as u32).swap_bytes())
    }
    /// The same as `bswap`, `bswap32` and one for 16 bits, but between register and memory where there is such a thing.
    #[inline(always)]
    fn movbe(a: u64) -> u64 {
        a.swap_bytes()
    }
    #[inline(always)]
    fn movbe32(a: u64) -> u64 {
        u64::from((a as u32).swap_bytes())
    }
    #[inline(always)]
    fn movbe16(a: u64) -> u64 {
        u64::from((a as u16).swap_bytes())
    }
    #[inline(always)]
    fn bt(a: u64, k: u32) -> bool {
        a >> k & 1 == 1
    }
    #[inline(always)]
    fn bts(a: u64, k: u32) -> (u64, bool) {
        (a | 1 << k, a >> k & 1 == 1)
    }
    #[inline(always)]
    fn btr(a: u64, k: u32) -> (u64, bool) {
        (a & !(1 << k), a >> k & 1 == 1)
    }
    #[inline(always)]
    fn btc(a: u64, k: u32) -> (u64, bool) {
        (a ^ 1 << k, a >> k & 1 == 1)
    }
    #[inline(always)]
    fn moves(e: u64, f: u64, yes: u64, no: u64) -> u64 {
        let conditions = Flags::of(e, f, 64, true).conditions();
        conditions.iter().fold(0, |h: u64, c| h.wrapping_mul(9).wrapping_add(if *c { yes } else { no }))
    }
    #[inline(always)]
    fn sets(e: u32, f: u32) -> [u64; 2] {
        let conditions = Flags::of(u64::from(e), u64::from(f), 32, false).conditions();
        std::array::from_fn(|half| (0..8).fold(0, |word, i| word | u64::from(conditions[8 * half + i]) << (8 * i)))
    }
    #[inline(always)]
    fn jumps(e: u16, f: u16) -> u64 {
        let conditions = Flags::of(u64::from(e), u64::from(f), 16, true).conditions();
        conditions.iter().zip(1..).fold(0, |h, (c, i)| 9 * h + if *c { 0 } else { i })
    }
    #[inline(always)]
    fn exchange_add(a: u64, b: u64, c: u64) -> [u64; 2] {
        [c.wrapping_add(b), a.wrapping_sub(c)]
    }
    /// Memory holds `held`: where that is `wanted`, `new` takes its place. Memory afterwards, what was held, equality.
    #[inline(always)]
    fn cmpxchg(held: u64, wanted: u64, new: u64) -> (u64, u64, bool) {
        if held == wanted { (new, held, true) } else { (held, held, false) }
    }
    /// The same by the instruction for two halves.
    #[inline(always)]
    fn cmpxchg8b(held: u64, wanted: u64, new: u64) -> (u64, u64, bool) {
        Self::cmpxchg(held, wanted, new)
    }
    /// The same for two words, without what was held.
    #[inline(always)]
    fn cmpxchg16b(held: [u64; 2], wanted: [u64; 2], new: [u64; 2]) -> ([u64; 2], bool) {
        if held == wanted { (new, true) } else { (held, false) }
    }
    #[inline(always)]
    fn neg(a: u64) -> u64 {
        a.wrapping_neg()
    }
    #[inline(always)]
    fn not(a: u64) -> u64 {
        !a
    }
    #[inline(always)]
    fn adc(a: u64, b: u64, carry: bool) -> (u64, bool) {
        a.carrying_add(b, carry)
    }
    #[inline(always)]
    fn sbb(a: u64, b: u64, borrow: bool) -> (u64, bool) {
        a.borrowing_sub(b, borrow)
    }
    #[inline(always)]
    fn carry_play(a: u64) -> u64 {
        a.wrapping_add(1).wrapping_add(u64::from(a != u64::MAX - 1))
    }
    #[inline(always)]
    fn mul8(a: u8, b: u8) -> u64 {
        u64::from(u16::from(a) * u16::from(b))
    }
    #[inline(always)]
    fn imul16(a: u16, b: u16) -> u64 {
        u64::from((i32::from(a as i16) * i32::from(b as i16)) as u32)
    }
    /// The divisor is odd.
    #[inline(always)]
    fn div8(a: u8, d: u8) -> u64 {
        let d = d.max(1);
        u64::from(a / d) | u64::from(a % d) << 8
    }
    /// The divisor is odd and positive.
    #[inline(always)]
    fn idiv16(a: u16, d: u16) -> u64 {
        let (a, d) = (a as i16, (d as i16).max(1));
        u64::from((a / d) as u16) | u64::from((a % d) as u16) << 16
    }
    #[inline(always)]
    fn lea(a: u64, b: u64) -> u64 {
        a.wrapping_add(b.wrapping_mul(8)).wrapping_add(0x123_4567)
    }
    #[inline(always)]
    fn lea32(a: u64, b: u64) -> u64 {
        u64::from((a as u32).wrapping_add((b as u32).wrapping_mul(4)).wrapping_sub(77))
    }
    #[inline(always)]
    fn movsx8(a: u64) -> u64 {
        i64::from(a as i8) as u64
    }
    #[inline(always)]
    fn movsx16(a: u64) -> u64 {
        i64::from(a as i16) as u64
    }
    #[inline(always)]
    fn movsxd(a: u64) -> u64 {
        i64::from(a as i32) as u64
    }
    #[inline(always)]
    fn movzx(a: u64, b: u64) -> u64 {
        u64::from(a as u8) + u64::from(b as u16)
    }
    /// From 8 bits to 64 by three doublings.
    #[inline(always)]
    fn widen(a: u64) -> u64 {
        i64::from(a as i8) as u64
    }
    /// Copies of a's sign in 64 bits, plus copies of the sign of b's low half in 32.
    #[inline(always)]
    fn signs(a: u64, b: u64) -> u64 {
        ((a as i64 >> 63) as u64).wrapping_add(u64::from((b as i32 >> 31) as u32))
    }
    #[inline(always)]
    fn flags_byte(a: u8) -> u64 {
        u64::from(a & 0xd5 | 2)
    }
    #[inline(always)]
    fn threefold(a: u64, count: u64) -> u64 {
        (0..count).fold(a, |h, _| h.wrapping_mul(3))
    }
    #[inline(always)]
    fn byte_of(table: &u64, i: u8) -> u64 {
        u64::from(table.to_le_bytes()[usize::from(i & 7)])
    }
}

/// The definitions as they stand.
#[cfg(not(target_arch = "x86_64"))]
pub(super) struct Plain;

#[cfg(not(target_arch = "x86_64"))]
impl Bits for Plain {}
