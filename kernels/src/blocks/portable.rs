//! A block moved by ordinary array code.

use super::{Block, Blocks, Elements};

/// One block, no vector register of its own.
#[derive(Clone, Copy)]
pub struct Bytes(Block);

/// Elements of `SIZE` bytes, alternately of a and b, from byte `start` of each lane.
#[inline(always)]
fn zip<const SIZE: usize>(a: &[u8; 32], b: &[u8; 32], start: usize) -> Bytes {
    Bytes(Block(std::array::from_fn(|i| {
        let (lane, at) = (i & 16, i & 15);
        let from = lane + start + at / (2 * SIZE) * SIZE + at % SIZE;
        if (at / SIZE) & 1 == 0 { a[from] } else { b[from] }
    })))
}

#[inline(always)]
fn by_words(a: Bytes, b: Bytes, f: impl Fn(u64, u64) -> u64) -> Bytes {
    let (a, b) = (a.0.to_words(), b.0.to_words());
    Bytes(Block::from_words(std::array::from_fn(|i| f(a[i], b[i]))))
}

macro_rules! zips {
    ($($low:ident $high:ident $size:literal;)*) => {$(
        #[inline(always)]
        fn $low(self, other: Self) -> Self {
            zip::<$size>(&self.0.0, &other.0.0, 0)
        }
        #[inline(always)]
        fn $high(self, other: Self) -> Self {
            zip::<$size>(&self.0.0, &other.0.0, 8)
        }
    )*};
}

impl Blocks for Bytes {
    const WIDTH: usize = 1;

    #[inline(always)]
    unsafe fn load<const N: usize>(nets: &[[Block; N]], k: usize) -> Self {
        Bytes(nets[0][k])
    }

    #[inline(always)]
    fn store<const N: usize>(self, nets: &mut [[Block; N]], k: usize) {
        nets[0][k] = self.0;
    }

    #[inline(always)]
    unsafe fn splat(block: &Block) -> Self {
        Bytes(*block)
    }

    #[inline(always)]
    fn shuffle_bytes(self, control: Self) -> Self {
        Bytes(Block(std::array::from_fn(|i| {
            let c = control.0.0[i];
            // all ones unless the control has bit 7
            self.0.0[i & 16 | usize::from(c & 15)] & (c >> 7).wrapping_sub(1)
        })))
    }

    #[inline(always)]
    fn permute_elements(self, from: &Elements) -> Self {
        let mut out = [0; 32];
        for i in 0..8 {
            let source = 4 * usize::from(from.elements.0[4 * i] & 7);
            let element: [u8; 4] = std::array::from_fn(|b| self.0.0[source + b]);
            out[4 * i..4 * i + 4].copy_from_slice(&element);
        }
        Bytes(Block(out))
    }

    #[inline(always)]
    fn permute_words<const ORDER: i32>(self) -> Self {
        let words = self.0.to_words();
        Bytes(Block::from_words(std::array::from_fn(|i| words[(ORDER >> (2 * i)) as usize & 3])))
    }

    #[inline(always)]
    fn align<const BYTES: i32>(self, low: Self) -> Self {
        Bytes(Block(std::array::from_fn(|i| {
            let at = (i & 15) + BYTES as usize;
            if at < 16 { low.0.0[i & 16 | at] } else { self.0.0[i & 16 | at & 15] }
        })))
    }

    #[inline(always)]
    fn blend(self, other: Self, mask: Self) -> Self {
        let spread = |m: u64| (m >> 7 & 0x0101_0101_0101_0101) * 0xff;
        let chosen = by_words(other, mask, |o, m| o & spread(m));
        let kept = by_words(self, mask, |s, m| s & !spread(m));
        by_words(chosen, kept, |c, k| c | k)
    }

    zips! {
        zip8_low zip8_high 1;
        zip16_low zip16_high 2;
        zip32_low zip32_high 4;
        zip64_low zip64_high 8;
    }

    #[inline(always)]
    fn low_lanes(self, other: Self) -> Self {
        Bytes(Block(std::array::from_fn(|i| if i < 16 { self.0.0[i] } else { other.0.0[i - 16] })))
    }

    #[inline(always)]
    fn high_lanes(self, other: Self) -> Self {
        Bytes(Block(std::array::from_fn(|i| if i < 16 { self.0.0[i + 16] } else { other.0.0[i] })))
    }

    #[inline(always)]
    fn pack(self, other: Self) -> Self {
        Bytes(Block(std::array::from_fn(|i| {
            let from = if i & 8 == 0 { &self.0.0 } else { &other.0.0 };
            let at = (i & 16) + 2 * (i & 7);
            i16::from_le_bytes([from[at], from[at + 1]]).clamp(0, 255) as u8
        })))
    }

    #[inline(always)]
    fn add(self, other: Self) -> Self {
        by_words(self, other, u64::wrapping_add)
    }

    #[inline(always)]
    fn and(self, other: Self) -> Self {
        by_words(self, other, |a, b| a & b)
    }
}
