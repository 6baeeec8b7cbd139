//! `vector.shuffle`: each operation as a rule for where a byte comes from, after the pseudo-code of the x86 instruction
//! set manuals, one byte or element at a time.

use kernels::Case;

use crate::reference::chacha::Stream;

type Block = [u8; 32];
type State = [Block; 8];

/// Byte i of the result is chosen by `f` from its lane (0 or 16) and place in the lane.
fn by_lane(f: impl Fn(usize, usize) -> u8) -> Block {
    std::array::from_fn(|i| f(i / 16 * 16, i % 16))
}

/// PSHUFB: FOR i = 0 TO 15: IF SRC2\[i\]\[7\] THEN DEST\[i\] := 0 ELSE DEST\[i\] := SRC1\[SRC2\[i\]\[3:0\]\].
fn shuffle_bytes(a: &Block, control: &Block) -> Block {
    by_lane(|lane, i| {
        let c = control[lane + i];
        if c >= 128 { 0 } else { a[lane + usize::from(c % 16)] }
    })
}

/// PALIGNR: temp := (DEST << 128) OR SRC; temp := temp >> (imm8 · 8); DEST := temp\[127:0\]; `a` is DEST.
fn align(a: &Block, low: &Block, imm: usize) -> Block {
    by_lane(|lane, i| {
        let temp: Vec<u8> = low[lane..lane + 16].iter().chain(&a[lane..lane + 16]).copied().collect();
        temp[i + imm]
    })
}

/// PUNPCKL and PUNPCKH: interleave the low or high halves of the lanes, by elements of `size` bytes.
fn zip(a: &Block, b: &Block, size: usize, high: bool) -> Block {
    let mut out = Vec::with_capacity(32);
    for lane in [0, 16] {
        let start = lane + if high { 8 } else { 0 };
        for at in (start..start + 8).step_by(size) {
            out.extend_from_slice(&a[at..at + size]);
            out.extend_from_slice(&b[at..at + size]);
        }
    }
    out.try_into().expect("two lanes of 16 bytes")
}

/// VPERMD and VPERMQ: DEST element i := SRC element index\[i\], over the whole block.
fn permute(a: &Block, size: usize, index: impl Fn(usize) -> usize) -> Block {
    std::array::from_fn(|i| a[index(i / size) * size + i % size])
}

fn permute_elements(a: &Block, from: &[u8]) -> Block {
    permute(a, 4, |i| usize::from(from[i] % 8))
}

fn permute_words(a: &Block, imm: u32) -> Block {
    permute(a, 8, |i| (imm / 4u32.pow(i as u32) % 4) as usize)
}

/// VPBLENDVB: IF MASK\[i\]\[7\] THEN DEST\[i\] := SRC2\[i\] ELSE DEST\[i\] := SRC1\[i\].
fn blend(a: &Block, b: &Block, mask: &Block) -> Block {
    std::array::from_fn(|i| if mask[i] >= 128 { b[i] } else { a[i] })
}

/// VPERM2I128 with the same lane (0 or 1) of both sources.
fn lanes(a: &Block, b: &Block, lane: usize) -> Block {
    let from = 16 * lane;
    [&a[from..from + 16], &b[from..from + 16]].concat().try_into().expect("two lanes of 16 bytes")
}

/// PACKUSWB: signed words of the first, then of the second source, saturated to unsigned bytes, lane by lane.
fn pack(a: &Block, b: &Block) -> Block {
    by_lane(|lane, i| {
        let source = if i < 8 { a } else { b };
        let at = lane + i % 8 * 2;
        match (source[at], source[at + 1]) {
            (_, high) if high >= 128 => 0,
            (low, 0) => low,
            _ => 255,
        }
    })
}

/// PADDQ, with the carry handed from byte to byte.
fn add(a: &mut Block, b: Block) {
    let mut carry = 0;
    for i in 0..32 {
        if i % 8 == 0 {
            carry = 0;
        }
        let sum = u16::from(a[i]) + u16::from(b[i]) + carry;
        a[i] = (sum % 256) as u8;
        carry = sum / 256;
    }
}

struct Round {
    tag_bytes: Vec<Block>,
    tag_elements: Vec<Vec<u8>>,
    tag_masks: Vec<Block>,
    sum_bytes: Vec<Block>,
    sum_elements: Vec<Vec<u8>>,
    sum_masks: Vec<Block>,
}

fn bytes(stream: &mut Stream, words: usize) -> Vec<u8> {
    stream.words(words).iter().flat_map(|w| (0..8).map(move |b| (w >> (8 * b)) as u8)).collect()
}

fn blocks(stream: &mut Stream, count: usize) -> Vec<Block> {
    bytes(stream, 4 * count).chunks(32).map(|b| b.try_into().expect("32 bytes")).collect()
}

fn order(random: &[u8]) -> Vec<u8> {
    let mut places: Vec<u8> = (0..random.len() as u8).collect();
    for i in (1..places.len()).rev() {
        places.swap(i, usize::from(random[i]) % (i + 1));
    }
    places
}

fn draw(stream: &mut Stream) -> Round {
    let orders = |block: Block| [order(&block[..16]), order(&block[16..])].concat().try_into().expect("32 bytes");
    let zeroing = |b: u8| if b / 16 % 8 == 7 { 128 + b % 16 } else { b % 16 };
    Round {
        tag_bytes: blocks(stream, 4).into_iter().map(orders).collect(),
        tag_elements: (0..4).map(|_| order(&bytes(stream, 1))).collect(),
        tag_masks: blocks(stream, 2),
        sum_bytes: blocks(stream, 2).into_iter().map(|b| b.map(zeroing)).collect(),
        sum_elements: (0..2).map(|_| bytes(stream, 1)).collect(),
        sum_masks: blocks(stream, 2),
    }
}

fn tags(x: &mut State, round: &Round) {
    let mut pair = |(a, b): (usize, usize), f: &dyn Fn(&Block, &Block) -> (Block, Block)| {
        (x[a], x[b]) = f(&x[a], &x[b]);
    };
    for k in 0..8 {
        pair((k, k), &|a, _| {
            let moved = shuffle_bytes(a, &round.tag_bytes[k % 4]);
            (moved, moved)
        });
    }
    for (k, size) in [(0, 1), (2, 2), (4, 4), (6, 8)] {
        pair((k, k + 1), &|a, b| (zip(a, b, size, false), zip(a, b, size, true)));
    }
    for k in 0..8 {
        pair((k, k), &|a, _| {
            let moved = permute_elements(a, &round.tag_elements[k % 4]);
            (moved, moved)
        });
    }
    for (k, order) in [0x93, 0x4e, 0x39, 0x1b, 0xb1, 0xd2, 0x2d, 0x87].into_iter().enumerate() {
        pair((k, k), &|a, _| (permute_words(a, order), permute_words(a, order)));
    }
    for (a, b) in [(0, 2), (1, 3), (4, 6), (5, 7)] {
        let mask = &round.tag_masks[a / 4];
        pair((a, b), &|a, b| (blend(a, b, mask), blend(b, a, mask)));
    }
    pair((0, 4), &|a, b| (align(a, b, 5), align(b, a, 5)));
    pair((1, 5), &|a, b| (align(a, b, 11), align(b, a, 11)));
    for k in [2, 3] {
        pair((k, k + 4), &|a, b| (lanes(a, b, 0), lanes(a, b, 1)));
    }
}

fn sums(x: &mut State, round: &Round) {
    let (s, e, m) = (&round.sum_bytes, &round.sum_elements, &round.sum_masks);
    // words up to 511
    let near = |a: &Block| -> Block { std::array::from_fn(|i| if i % 2 == 0 { a[i] } else { a[i] % 2 }) };
    let [mut a, mut b, mut c, mut d, mut p, mut q, mut r, mut t] = *x;
    add(&mut a, shuffle_bytes(&p, &s[0]));
    add(&mut a, align(&q, &r, 7));
    add(&mut b, permute_elements(&q, &e[0]));
    add(&mut b, zip(&t, &p, 2, true));
    add(&mut c, zip(&r, &t, 1, false));
    add(&mut c, permute_words(&p, 0x1e));
    add(&mut d, blend(&p, &r, &m[0]));
    add(&mut d, pack(&near(&q), &near(&t)));
    add(&mut p, shuffle_bytes(&a, &s[1]));
    add(&mut p, align(&c, &b, 9));
    add(&mut q, permute_elements(&b, &e[1]));
    add(&mut q, zip(&d, &a, 4, false));
    add(&mut r, zip(&c, &d, 1, true));
    add(&mut r, permute_words(&a, 0xb1));
    add(&mut t, blend(&b, &d, &m[1]));
    add(&mut t, lanes(&b, &c, 0));
    *x = [a, b, c, d, p, q, r, t];
}

/// Tags of both nets, then sums of both nets, after twelve passes of 24 rounds.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let keys = stream.words(2);
    let tagged = keys.iter().map(|key| -> State {
        std::array::from_fn(|k| std::array::from_fn(|b| (32 * k + b) as u8 ^ (key % 256) as u8))
    });
    let mut all_tags: Vec<State> = tagged.collect();
    let mut all_sums: Vec<State> = (0..2).map(|_| blocks(&mut stream, 8).try_into().expect("8 blocks")).collect();
    let rounds: Vec<Round> = (0..24).map(|_| draw(&mut stream)).collect();
    for round in (0..12).flat_map(|_| &rounds) {
        all_tags.iter_mut().for_each(|x| tags(x, round));
        all_sums.iter_mut().for_each(|x| sums(x, round));
    }
    let out: Vec<u8> = all_tags.iter().chain(&all_sums).flatten().flatten().copied().collect();
    out.chunks(8).map(|w| w.iter().rev().fold(0, |word, &b| word << 8 | u64::from(b))).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn counting() -> Block {
        std::array::from_fn(|i| i as u8)
    }

    /// PSHUFB (x86 manual, from memory): bit 7 of a control byte clears, else its low four bits pick within the lane.
    #[test]
    fn shuffle_bytes_picks_within_its_lane_and_clears() {
        let mut control = [0x80; 32];
        control[..4].copy_from_slice(&[0x07, 0x0f, 0xff, 0x00]);
        control[16..20].copy_from_slice(&[0x07, 0x0f, 0x8f, 0x00]);
        let out = shuffle_bytes(&counting(), &control);
        assert_eq!(out[..5], [7, 15, 0, 0, 0]);
        assert_eq!(out[16..21], [23, 31, 0, 16, 0]);
    }

    /// PALIGNR (x86 manual, from memory): imm 0 gives the low operand, imm 1 takes one byte of the high one in at the
    /// top; the 256-bit form does so in each lane.
    #[test]
    fn align_shifts_the_pair_right() {
        let (high, low) = ([0xaa; 32], counting());
        assert_eq!(align(&high, &low, 0), low);
        let out = align(&high, &low, 1);
        assert_eq!((out[0], out[14], out[15], out[16], out[30], out[31]), (1, 15, 0xaa, 17, 31, 0xaa));
    }

    /// PUNPCKLBW and PUNPCKHBW (x86 manual, from memory): the first operand's byte comes lowest; together the two
    /// results hold every byte once.
    #[test]
    fn zips_alternate() {
        let (a, b) = (counting(), counting().map(|v| v + 100));
        assert_eq!(zip(&a, &b, 1, false)[..4], [0, 100, 1, 101]);
        assert_eq!(zip(&a, &b, 1, true)[..4], [8, 108, 9, 109]);
        assert_eq!(zip(&a, &b, 1, false)[16..20], [16, 116, 17, 117]);
        assert_eq!(zip(&a, &b, 2, false)[..4], [0, 1, 100, 101]);
        assert_eq!(zip(&a, &b, 8, true)[7..10], [15, 108, 109]);
        for size in [1, 2, 4, 8] {
            let mut all = [zip(&a, &b, size, false), zip(&a, &b, size, true)].concat();
            all.sort_unstable();
            assert_eq!(all, [a, b].concat());
        }
    }

    /// VPERMQ: 0xe4 changes nothing, 0x4e swaps the lanes, 0x1b turns the words round; VPERMD picks over both lanes by
    /// the low three bits of each index (x86 manual, from memory).
    #[test]
    fn permutes_cross_lanes() {
        let a = counting();
        assert_eq!(permute_words(&a, 0xe4), a);
        assert_eq!(permute_words(&a, 0x4e), std::array::from_fn(|i| ((i + 16) % 32) as u8));
        assert_eq!(permute_words(&a, 0x1b)[..9], [24, 25, 26, 27, 28, 29, 30, 31, 16]);
        assert_eq!(permute_elements(&a, &[7, 0, 9, 8, 5, 6, 3, 2])[..9], [28, 29, 30, 31, 0, 1, 2, 3, 4]);
    }

    /// PACKUSWB (x86 manual, from memory): above 255 becomes 255, negative becomes 0, the rest stays.
    #[test]
    fn pack_saturates() {
        let mut a = [0; 32];
        for (place, number) in a.chunks_exact_mut(2).zip([-1i16, 0, 255, 256, i16::MAX, i16::MIN, 128, 127]) {
            place.copy_from_slice(&number.to_le_bytes());
        }
        assert_eq!(pack(&a, &counting())[..10], [0, 0, 255, 255, 255, 0, 128, 127, 255, 255]);
        assert_eq!(pack(&[1; 32], &a)[8..18], [0, 0, 255, 255, 255, 0, 128, 127, 255, 255]);
    }

    /// PADDQ: a carry stops at the word's end.
    #[test]
    fn sums_are_of_words() {
        let mut a = [0xff; 32];
        let mut one = [0; 32];
        one[0] = 1;
        add(&mut a, one);
        assert_eq!(a, std::array::from_fn(|i| if i < 8 { 0 } else { 0xff }));
    }

    /// The tags' part loses no byte and makes none.
    #[test]
    fn tags_are_permuted() {
        let case = Case { kernel: "vector.shuffle", seed: kernels::Seed(9), size: kernels::Size(13) };
        let out = words(&case);
        for (net, key) in Stream::new(&case).words(2).into_iter().enumerate() {
            let mut bytes: Vec<u8> = out[32 * net..32 * net + 32].iter().flat_map(|w| w.to_le_bytes()).collect();
            bytes.iter_mut().for_each(|b| *b ^= key as u8);
            assert!(bytes.iter().enumerate().any(|(i, &b)| i != usize::from(b)));
            bytes.sort_unstable();
            assert!(bytes.iter().enumerate().all(|(i, &b)| i == usize::from(b)));
        }
    }
}
