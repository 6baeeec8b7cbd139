//! `vector.integer`: each block a 128-bit number, its elements taken out as numbers of unbounded sign, worked on by
//! ordinary arithmetic and put back; one net after the other.

use kernels::Case;

use crate::reference::chacha::Stream;

/// 16 bytes, the first one lowest.
type Block = u128;
/// The words of one line: two for each net.
type Line = [u64; 8];

const fn mask(width: u32) -> u128 {
    u128::MAX >> (128 - width)
}

/// The i-th element of `width` bits.
fn unsigned(x: Block, width: u32, i: u32) -> i128 {
    (x >> (width * i) & mask(width)) as i128
}

fn signed(x: Block, width: u32, i: u32) -> i128 {
    let value = unsigned(x, width, i);
    if value >> (width - 1) == 1 { value - (1 << width) } else { value }
}

type Take = fn(Block, u32, u32) -> i128;

/// The block whose i-th element is f(i), cut to `width` bits.
fn build(width: u32, f: impl Fn(u32) -> i128) -> Block {
    (0..128 / width).fold(0, |x, i| x | (f(i) as u128 & mask(width)) << (width * i))
}

/// Elements of two blocks, place by place.
fn each(width: u32, take: Take, a: Block, b: Block, f: impl Fn(i128, i128) -> i128) -> Block {
    build(width, |i| f(take(a, width, i), take(b, width, i)))
}

/// The nearest number that `width` bits can hold.
fn near(take: Take, width: u32, value: i128) -> i128 {
    let all = 1 << width;
    if take(mask(width), width, 0) < 0 { value.clamp(-all / 2, all / 2 - 1) } else { value.clamp(0, all - 1) }
}

fn add(width: u32, a: Block, b: Block) -> Block {
    each(width, unsigned, a, b, |a, b| a + b)
}

fn sub(width: u32, a: Block, b: Block) -> Block {
    each(width, unsigned, a, b, |a, b| a - b)
}

fn adds(width: u32, take: Take, a: Block, b: Block) -> Block {
    each(width, take, a, b, |a, b| near(take, width, a + b))
}

fn subs(width: u32, take: Take, a: Block, b: Block) -> Block {
    each(width, take, a, b, |a, b| near(take, width, a - b))
}

fn average(width: u32, a: Block, b: Block) -> Block {
    each(width, unsigned, a, b, |a, b| (a + b + 1) / 2)
}

/// Bits from `drop` on of each product.
fn product(width: u32, take: Take, drop: u32, a: Block, b: Block) -> Block {
    each(width, take, a, b, |a, b| (a * b) >> drop)
}

/// Whole products of the elements 0 and 2 of 32 bits.
fn wide_product(take: Take, a: Block, b: Block) -> Block {
    build(64, |i| take(a, 32, 2 * i) * take(b, 32, 2 * i))
}

/// Sums of two products of 16-bit numbers.
fn sum_of_products(a: Block, b: Block) -> Block {
    build(32, |i| (2 * i..2 * i + 2).map(|j| signed(a, 16, j) * signed(b, 16, j)).sum())
}

fn mixed_products(a: Block, b: Block) -> Block {
    build(16, |i| near(signed, 16, (2 * i..2 * i + 2).map(|j| unsigned(a, 8, j) * signed(b, 8, j)).sum()))
}

fn rounded_product(a: Block, b: Block) -> Block {
    each(16, signed, a, b, |a, b| (a * b + (1 << 14)).div_euclid(1 << 15))
}

fn least(width: u32, take: Take, a: Block, b: Block) -> Block {
    each(width, take, a, b, i128::min)
}

fn greatest(width: u32, take: Take, a: Block, b: Block) -> Block {
    each(width, take, a, b, i128::max)
}

fn equal(width: u32, a: Block, b: Block) -> Block {
    each(width, unsigned, a, b, |a, b| -i128::from(a == b))
}

fn greater(width: u32, a: Block, b: Block) -> Block {
    each(width, signed, a, b, |a, b| -i128::from(a > b))
}

fn absolute(width: u32, a: Block) -> Block {
    build(width, |i| signed(a, width, i).abs())
}

fn with_sign(width: u32, a: Block, b: Block) -> Block {
    each(width, signed, a, b, |a, b| a * b.signum())
}

/// Signed elements of `from` bits of a, then of b, in half of their width.
fn pack(from: u32, take: Take, a: Block, b: Block) -> Block {
    let count = 128 / from;
    build(from / 2, |i| near(take, from / 2, signed(if i < count { a } else { b }, from, i % count)))
}

/// Elements from the `start`-th on, alternately of a and b.
fn zip(width: u32, start: u32, a: Block, b: Block) -> Block {
    build(width, |i| unsigned(if i % 2 == 0 { a } else { b }, width, start + i / 2))
}

/// f of neighbouring elements of a, then of b.
fn pairs(width: u32, a: Block, b: Block, f: impl Fn(i128, i128) -> i128) -> Block {
    let half = 64 / width;
    build(width, |i| {
        let (x, at) = (if i < half { a } else { b }, 2 * (i % half));
        f(signed(x, width, at), signed(x, width, at + 1))
    })
}

fn left(width: u32, a: Block, count: i128) -> Block {
    build(width, |i| if count < width.into() { unsigned(a, width, i) << count } else { 0 })
}

fn right(width: u32, take: Take, a: Block, count: i128) -> Block {
    build(width, |i| take(a, width, i) >> count)
}

fn left_each(width: u32, a: Block, counts: Block) -> Block {
    each(width, unsigned, a, counts, |a, count| a << count)
}

fn right_each(width: u32, take: Take, a: Block, counts: Block) -> Block {
    build(width, |i| take(a, width, i) >> unsigned(counts, width, i))
}

fn distances(a: Block, b: Block) -> Block {
    build(64, |i| (8 * i..8 * i + 8).map(|j| (unsigned(a, 8, j) - unsigned(b, 8, j)).abs()).sum())
}

fn distances_of_windows(a: Block, b: Block) -> Block {
    build(16, |i| (4..8).map(|j| (unsigned(a, 8, i + j) - unsigned(b, 8, j)).abs()).sum())
}

fn least_and_place(a: Block) -> Block {
    let numbers: Vec<i128> = (0..8).map(|i| unsigned(a, 16, i)).collect();
    let value = numbers.iter().copied().min().expect("eight numbers");
    let place = numbers.iter().position(|n| *n == value).expect("one is the least");
    value as u128 | (place as u128) << 16
}

/// The net's share of as many elements at the line's start as fill four nets when `to` bits wide.
fn widen(line: &Line, net: u32, take: Take, from: u32, to: u32) -> Block {
    build(to, |i| {
        let element = net * (128 / to) + i;
        take(u128::from(line[(element * from / 64) as usize]), from, element * from % 64 / from)
    })
}

struct Round<'a> {
    lines: &'a [Line],
    counts: Line,
    net: u32,
}

impl Round<'_> {
    fn block(&self, i: usize) -> Block {
        let at = 2 * self.net as usize;
        u128::from(self.lines[i][at]) | u128::from(self.lines[i][at + 1]) << 64
    }

    /// Counts for elements of 32 bits.
    fn counts32(&self) -> Block {
        let block = self.block(9);
        build(32, |i| unsigned(block, 32, i) % 32)
    }

    fn counts64(&self) -> Block {
        let block = self.block(10);
        build(64, |i| unsigned(block, 64, i) % 64)
    }

    fn count(&self, i: usize) -> i128 {
        self.counts[i].into()
    }

    /// The `to` bits wide elements of line i.
    fn widened(&self, i: usize, take: Take, from: u32, to: u32) -> Block {
        widen(&self.lines[i], self.net, take, from, to)
    }

    /// Returns the byte signs of what the round gives.
    fn apply(&self, x: &mut [Block; 8]) -> u64 {
        let k = |i| self.block(i);
        let count = |i| self.count(i);
        x[0] = add(8, x[0], adds(8, signed, x[4], k(0)));
        x[1] = sub(16, x[1], adds(16, signed, x[5], k(1)));
        x[0] = add(32, x[0], adds(8, unsigned, x[2], k(2)));
        x[1] = sub(64, x[1], adds(16, unsigned, x[3], k(3)));
        x[0] ^= subs(8, signed, x[5], k(2));
        x[1] = add(64, x[1], subs(16, signed, x[2], k(3)));
        x[0] = sub(8, x[0], subs(8, unsigned, x[3], k(0)));
        x[1] = add(16, x[1], subs(16, unsigned, x[4], k(1)));
        x[0] = sub(32, x[0], average(8, x[4], x[5]));
        x[1] = add(8, x[1], average(16, x[2], x[3]));
        x[0] = sub(16, x[0], product(16, signed, 0, x[4], x[3]));
        x[1] = add(32, x[1], product(16, signed, 16, x[5], x[2]));
        x[0] = add(64, x[0], product(16, unsigned, 16, x[2], x[4]));
        x[1] = sub(8, x[1], wide_product(unsigned, x[3], x[5]));
        x[0] ^= sum_of_products(x[4], x[2]);
        x[1] = sub(64, x[1], product(32, unsigned, 0, x[5], x[3]));
        x[0] = add(16, x[0], wide_product(signed, x[2], x[5]));
        x[1] = add(32, x[1], mixed_products(x[3], x[4]));
        x[0] = add(64, x[0], rounded_product(x[5], x[4]));
        let a = least(8, unsigned, x[4], x[5]);
        x[1] = sub(8, x[1], a);
        x[0] = sub(64, x[0], equal(8, a, x[5]));
        let a = greatest(16, unsigned, x[2], x[3]);
        x[1] ^= a;
        x[0] = add(8, x[0], equal(16, a, x[2]));
        let a = least(32, signed, x[5], x[3]);
        x[1] = sub(32, x[1], a);
        x[0] = sub(8, x[0], equal(32, a, x[3]));
        x[1] = sub(64, x[1], greatest(8, unsigned, x[2], x[4]));
        x[0] = sub(32, x[0], least(16, signed, x[3], x[5]));
        x[1] ^= greatest(16, signed, x[4], x[2]);
        x[0] = add(32, x[0], greater(8, x[3], x[2]));
        x[1] = add(16, x[1], greater(16, x[4], x[5]));
        x[0] = sub(64, x[0], greater(32, x[5], x[2]));
        x[1] = add(8, x[1], greater(64, x[2], x[4]));
        x[0] = sub(16, x[0], pack(16, signed, x[4], x[2]));
        x[2] = sub(32, x[2], pack(32, signed, x[7], x[5]));
        x[3] = add(16, x[3], pack(16, unsigned, x[4], x[7]));
        x[2] = add(64, x[2], pack(32, unsigned, x[5], x[6]));
        x[3] ^= zip(8, 0, x[7], x[5]);
        x[2] = add(8, x[2], zip(16, 0, x[4], x[6]));
        x[3] = sub(8, x[3], zip(32, 0, x[5], x[7]));
        let a = zip(64, 0, x[6], x[4]);
        x[2] = sub(16, x[2], a);
        x[3] = add(8, x[3], equal(64, a, x[6]));
        x[2] = sub(16, x[2], absolute(8, x[4]));
        x[3] = add(32, x[3], absolute(16, x[5]));
        x[2] ^= absolute(32, x[6]);
        x[3] = sub(32, x[3], with_sign(8, x[7], x[4]));
        x[2] = add(64, x[2], with_sign(16, x[4], x[5]));
        x[3] = sub(16, x[3], with_sign(32, x[5], x[6]));
        x[2] = add(16, x[2], pairs(16, x[6], x[5], |x, y| x + y));
        x[3] = add(64, x[3], pairs(32, x[7], x[6], |x, y| x - y));
        x[2] = sub(8, x[2], pairs(16, x[4], x[7], |x, y| near(signed, 16, x + y)));
        x[3] ^= left(16, x[5], 3);
        x[2] = sub(64, x[2], left(32, x[6], 11));
        x[3] = add(16, x[3], left(64, x[7], 23));
        x[2] = add(32, x[2], x[4] << (8 * 5));
        x[3] = add(64, x[3], x[6] & x[5]);
        x[2] = add(32, x[2], self.widened(1, unsigned, 8, 16));
        x[3] = sub(64, x[3], self.widened(2, unsigned, 8, 32));
        x[2] ^= self.widened(3, unsigned, 8, 64);
        x[3] = add(8, x[3], self.widened(0, signed, 16, 32));
        x[2] = sub(32, x[2], self.widened(1, signed, 16, 64));
        x[3] = sub(8, x[3], self.widened(2, signed, 32, 64));
        x[2] = sub(64, x[2], left(16, x[6], count(0)));
        x[3] = sub(32, x[3], left(32, x[7], count(1)));
        x[2] = add(8, x[2], left(64, x[4], count(2)));
        x[3] = add(32, x[3], right(16, signed, x[5], count(3)));
        x[2] = add(16, x[2], left_each(32, x[7], self.counts32()));
        x[3] = sub(64, x[3], left_each(64, x[4], self.counts64()));
        x[2] = sub(8, x[2], distances(x[5], x[4]));
        x[4] = sub(64, x[4], adds(8, signed, x[1], k(4)));
        x[5] = add(8, x[5], adds(16, unsigned, x[6], k(5)));
        x[4] ^= subs(8, unsigned, x[7], k(6));
        x[5] = add(32, x[5], subs(16, signed, x[0], k(7)));
        x[4] = add(16, x[4], average(8, x[6], k(7)));
        x[5] = sub(32, x[5], product(16, signed, 0, x[7], k(4)));
        x[4] = add(64, x[4], product(16, unsigned, 16, x[0], k(5)));
        x[5] = sub(8, x[5], sum_of_products(x[1], k(6)));
        x[4] = add(32, x[4], product(32, unsigned, 0, x[7], x[0]));
        x[5] = sub(16, x[5], mixed_products(x[0], x[6]));
        x[4] = add(8, x[4], wide_product(unsigned, x[1], x[7]));
        let a = greatest(8, signed, x[0], x[1]);
        x[5] ^= a;
        x[4] = sub(8, x[4], equal(8, a, x[0]));
        let a = greatest(32, unsigned, x[6], x[7]);
        x[5] = add(64, x[5], a);
        x[4] = sub(32, x[4], equal(32, a, x[7]));
        let a = least(16, unsigned, x[1], x[6]);
        x[5] = sub(64, x[5], a);
        x[4] = add(8, x[4], equal(16, a, x[6]));
        x[5] ^= least(8, signed, x[0], x[7]);
        x[4] = add(16, x[4], greatest(32, signed, x[1], x[0]));
        x[5] = add(8, x[5], least(32, unsigned, x[7], x[6]));
        x[4] = sub(16, x[4], greater(8, x[0], x[6]));
        x[5] = add(32, x[5], greater(16, x[1], x[7]));
        x[4] = sub(8, x[4], greater(32, x[6], x[0]));
        x[5] = sub(16, x[5], greater(64, x[7], x[1]));
        x[4] ^= zip(8, 8, x[0], x[1]);
        x[5] = sub(64, x[5], zip(16, 4, x[1], x[6]));
        x[4] = add(32, x[4], zip(32, 2, x[6], x[7]));
        let a = zip(64, 1, x[1], x[2]);
        x[6] = add(64, x[6], a);
        x[7] = add(64, x[7], equal(64, a, x[2]));
        x[6] = add(16, x[6], pairs(32, x[3], x[1], |x, y| x + y));
        x[7] = sub(16, x[7], pairs(16, x[0], x[3], |x, y| x - y));
        x[6] = sub(32, x[6], pairs(16, x[1], x[2], |x, y| near(signed, 16, x - y)));
        x[7] = sub(32, x[7], right(16, unsigned, x[2], 5));
        x[6] = sub(8, x[6], right(32, unsigned, x[3], 9));
        x[7] = sub(64, x[7], right(64, unsigned, x[0], 21));
        x[6] = add(16, x[6], right(16, signed, x[1], 4));
        x[7] = add(8, x[7], right(32, signed, x[3], 13));
        x[6] ^= x[2] >> (8 * 7);
        x[7] = add(64, x[7], x[1] | x[3]);
        x[6] = sub(8, x[6], !x[0] & x[2]);
        x[7] = sub(64, x[7], self.widened(4, signed, 8, 16));
        x[6] = add(8, x[6], self.widened(5, signed, 8, 32));
        x[7] ^= self.widened(6, signed, 8, 64);
        x[6] = add(32, x[6], self.widened(7, unsigned, 16, 32));
        x[7] = add(16, x[7], self.widened(5, unsigned, 16, 64));
        x[6] = sub(32, x[6], self.widened(6, unsigned, 32, 64));
        x[7] = add(8, x[7], right(16, unsigned, x[2], count(4)));
        x[6] ^= right(32, unsigned, x[3], count(5));
        x[7] = add(32, x[7], right(64, unsigned, x[0], count(6)));
        x[6] = add(64, x[6], right(32, signed, x[1], count(7)));
        x[7] = sub(32, x[7], right_each(32, unsigned, x[3], self.counts32()));
        x[6] = sub(64, x[6], right_each(64, unsigned, x[0], self.counts64()));
        x[7] = sub(8, x[7], right_each(32, signed, x[1], self.counts32()));
        x[6] = sub(16, x[6], distances_of_windows(x[2], x[1]));
        x[7] = add(16, x[7], least_and_place(x[3]));
        x[6] = add(8, x[6], distances(x[0], x[3]));
        let last = sub(8, x[0], x[5]);
        (0..16).map(|i| u64::from(signed(last, 8, i) < 0) << i).sum()
    }
}

fn line(stream: &mut Stream) -> Line {
    stream.words(8).try_into().expect("eight words")
}

/// The blocks after three passes of 32 rounds, then the digest of the signs.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let start: Vec<Line> = (0..8).map(|_| line(&mut stream)).collect();
    let rounds: Vec<Vec<Line>> = (0..32).map(|_| (0..11).map(|_| line(&mut stream)).collect()).collect();
    let (mut out, mut signs) = (vec![0; 65], vec![0u64; 96]);
    for net in 0..4 {
        let own = Round { lines: &start, counts: [0; 8], net };
        let mut x: [Block; 8] = std::array::from_fn(|i| own.block(i));
        for (word, lines) in signs.iter_mut().zip((0..3).flat_map(|_| &rounds)) {
            let widths = [16, 32, 64, 16, 16, 32, 64, 32];
            let counts = std::array::from_fn(|i| lines[8][i] % (widths[i] + 1));
            *word |= Round { lines, counts, net }.apply(&mut x) << (16 * net);
        }
        for (block, value) in x.into_iter().enumerate() {
            out[8 * block + 2 * net as usize] = value as u64;
            out[8 * block + 2 * net as usize + 1] = (value >> 64) as u64;
        }
    }
    out[64] =
        signs.iter().fold(0, |h: u64, word| h.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15).wrapping_add(*word));
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn bytes(list: &[i64]) -> Block {
        build(8, |i| list.get(i as usize).copied().unwrap_or(0).into())
    }

    fn numbers(list: &[i64]) -> Block {
        build(16, |i| list.get(i as usize).copied().unwrap_or(0).into())
    }

    /// Corner cases of the x86 manual's descriptions (from memory): PMADDUBSW and PADDSW saturate, PMULHRSW and PMADDWD
    /// wrap around for the most negative operands, PABSB leaves −128, PSIGNB zeroes by zero.
    #[test]
    fn corners() {
        assert_eq!(mixed_products(bytes(&[255, 255]), bytes(&[127, 127])), numbers(&[32767]));
        assert_eq!(mixed_products(bytes(&[255, 255]), bytes(&[-128, -128])), numbers(&[-32768]));
        assert_eq!(rounded_product(numbers(&[-32768, 1, -1]), numbers(&[-32768, 16384, 16384])), numbers(&[-32768, 1]));
        assert_eq!(sum_of_products(numbers(&[-32768, -32768]), numbers(&[-32768, -32768])), 1 << 31);
        assert_eq!(absolute(8, bytes(&[-128, -1, 5])), bytes(&[-128, 1, 5]));
        assert_eq!(with_sign(8, bytes(&[7, 7, 7]), bytes(&[-3, 0, 9])), bytes(&[-7, 0, 7]));
        assert_eq!(adds(16, signed, numbers(&[32767, -32768]), numbers(&[1, -1])), numbers(&[32767, -32768]));
        assert_eq!(subs(8, unsigned, bytes(&[3, 200]), bytes(&[4, 100])), bytes(&[0, 100]));
        assert_eq!(average(8, bytes(&[255, 2]), bytes(&[255, 3])), bytes(&[255, 3]));
    }

    /// PACKUSWB, PACKSSDW, PUNPCKHWD, PHSUBW, PHMINPOSUW, PSADBW (x86 manual, from memory).
    #[test]
    fn orders() {
        assert_eq!(
            pack(16, unsigned, numbers(&[-1, 256, 255]), numbers(&[7])),
            bytes(&[0, 255, 255, 0, 0, 0, 0, 0, 7])
        );
        assert_eq!(pack(32, signed, 0x8000_0000, 0x7fff_ffff), numbers(&[-32768, 0, 0, 0, 32767]));
        let (a, b) = (numbers(&[0, 1, 2, 3, 4, 5, 6, 7]), numbers(&[10, 11, 12, 13, 14, 15, 16, 17]));
        assert_eq!(zip(16, 4, a, b), numbers(&[4, 14, 5, 15, 6, 16, 7, 17]));
        assert_eq!(pairs(16, a, numbers(&[9, 4]), |x, y| x - y), numbers(&[-1, -1, -1, -1, 5]));
        assert_eq!(least_and_place(numbers(&[9, 4, 3, 8, 3, 9, 9, 9])), 2 << 16 | 3);
        assert_eq!(distances(bytes(&[3, 250]), bytes(&[250, 3])), 494);
    }

    /// PSLLW by 16 and more clears, PSRAW by 16 fills with the sign; shifts of more than one element do not mix them.
    #[test]
    fn shifts_end_at_the_width() {
        assert_eq!(left(16, numbers(&[-1, 3]), 16), 0);
        assert_eq!(left(16, numbers(&[-1, 3]), 15), numbers(&[-32768, -32768]));
        assert_eq!(right(16, signed, numbers(&[-2, 2]), 16), numbers(&[-1, 0]));
        assert_eq!(right(32, unsigned, u128::MAX, 31), 0x0000_0001_0000_0001_0000_0001_0000_0001);
    }
}
