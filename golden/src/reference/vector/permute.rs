//! `vector.permute`: for each move, the place that a byte comes from, byte by byte.

use kernels::Case;

use crate::reference::chacha::Stream;

/// A block of 64 bytes; places are (lane, byte within the lane).
type Block = [u8; 64];
type Set = [Block; 4];

/// The block whose byte at (lane, byte) is the one of `from` at f(lane, byte).
fn alone(from: &Block, f: impl Fn(usize, usize) -> (usize, usize)) -> Block {
    std::array::from_fn(|i| {
        let (lane, byte) = f(i / 16, i % 16);
        from[16 * lane + byte]
    })
}

/// The same of two blocks: f also gets and says which of the two, 0 or 1.
fn both(x: &mut Set, (a, b): (usize, usize), f: impl Fn(usize, usize, usize) -> (usize, usize, usize)) {
    let from = [x[a], x[b]];
    let made = |which: usize| -> Block {
        std::array::from_fn(|i| {
            let (block, lane, byte) = f(which, i / 16, i % 16);
            from[block][16 * lane + byte]
        })
    };
    (x[a], x[b]) = (made(0), made(1));
}

/// Elements of `size` bytes of both blocks' lanes alternate, lower ones in the first block, upper ones in the second.
fn zip(size: usize) -> impl Fn(usize, usize, usize) -> (usize, usize, usize) {
    move |which, lane, byte| {
        let element = byte / size;
        (element % 2, lane, 8 * which + element / 2 * size + byte % size)
    }
}

/// Bytes from `start` to before `end` of each lane change blocks.
fn change(start: usize, end: usize) -> impl Fn(usize, usize, usize) -> (usize, usize, usize) {
    move |which, lane, byte| (if (start..end).contains(&byte) { 1 - which } else { which }, lane, byte)
}

/// The first `size` bytes of the lanes of each half change places.
fn first(size: usize) -> impl Fn(usize, usize) -> (usize, usize) {
    move |lane, byte| (if byte < size { lane ^ 1 } else { lane }, byte)
}

/// Places of each half, in 64-bit elements: the element at i comes from order\[i\].
fn halves(order: [usize; 4]) -> impl Fn(usize, usize) -> (usize, usize) {
    move |lane, byte| {
        let from = order[lane % 2 * 2 + byte / 8];
        (lane / 2 * 2 + from / 2, from % 2 * 8 + byte % 8)
    }
}

fn round(x: &mut Set, orders: &[[usize; 16]]) {
    for (block, order) in x.iter_mut().zip(orders) {
        *block = alone(block, |lane, byte| {
            let from = order[4 * lane + byte / 4];
            (from / 4, from % 4 * 4 + byte % 4)
        });
    }
    x[0] = alone(&x[0], |lane, byte| (lane, byte ^ 4));
    x[1] = alone(&x[1], |lane, byte| (lane, byte ^ 8));
    x[2] = alone(&x[2], |lane, byte| (lane, (byte + 4) % 16));
    x[3] = alone(&x[3], |lane, byte| (lane, if byte < 8 { (byte + 6) % 8 } else { 8 + (byte + 2) % 8 }));
    both(x, (0, 1), zip(4));
    both(x, (2, 3), zip(8));
    x[0] = alone(&x[0], halves([1, 2, 3, 0]));
    x[1] = alone(&x[1], halves([3, 0, 1, 2]));
    x[2] = alone(&x[2], halves([0, 2, 1, 3]));
    x[3] = alone(&x[3], |lane, byte| (lane ^ 1, byte));
    both(x, (0, 2), change(0, 4));
    both(x, (1, 3), change(0, 8));
    x[0] = alone(&x[0], first(4));
    x[1] = alone(&x[1], first(8));
    x[2] = alone(&x[2], |lane, byte| ((lane + (byte + 4) / 16) % 4, (byte + 4) % 16));
    x[3] = alone(&x[3], |lane, byte| ([2, 0, 3, 1][lane], byte));
    both(x, (0, 3), change(6, 8));
    // from byte 5 of the other block's lane on, and on into the own
    both(x, (1, 2), |which, lane, byte| (if byte < 11 { 1 - which } else { which }, lane, (byte + 5) % 16));
    both(x, (0, 1), |which, lane, byte| (byte / 8, lane, byte % 8 / 4 * 8 + 4 * which + byte % 4));
    both(x, (2, 3), |which, lane, byte| (lane % 2, lane / 2 * 2 + which, byte));
    both(x, (0, 2), |which, lane, byte| (if byte < 8 { which } else { 1 - which }, lane, (byte + 8) % 16));
    both(x, (1, 3), zip(4));
}

fn bytes(words: &[u64]) -> Vec<u8> {
    words.iter().flat_map(|w| (0..8).map(move |b| (w >> (8 * b)) as u8)).collect()
}

fn set(bytes: &[u8]) -> Set {
    std::array::from_fn(|k| std::array::from_fn(|i| bytes[64 * k + i]))
}

fn order(random: &[u8]) -> [usize; 16] {
    let mut places = std::array::from_fn(|i| i);
    for i in (1..16).rev() {
        places.swap(i, usize::from(random[i]) % (i + 1));
    }
    places
}

/// All four sets after twelve passes of sixteen rounds.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let keys = stream.words(2);
    let mut sets: Vec<Set> =
        keys.iter().map(|key| set(&(0..=255).map(|p: u8| p ^ (key % 256) as u8).collect::<Vec<u8>>())).collect();
    sets.extend((0..2).map(|_| set(&bytes(&stream.words(32)))));
    let rounds: Vec<Vec<[usize; 16]>> =
        (0..16).map(|_| (0..4).map(|_| order(&bytes(&stream.words(2)))).collect()).collect();
    for x in &mut sets {
        for orders in (0..12).flat_map(|_| &rounds) {
            round(x, orders);
        }
    }
    let out: Vec<u8> = sets.into_iter().flatten().flatten().collect();
    out.chunks(8).map(|w| w.iter().rev().fold(0, |word, &b| word << 8 | u64::from(b))).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn counting() -> Block {
        std::array::from_fn(|i| i as u8)
    }

    /// VPERMQ by 0x39 and 0xd8, MOVSS, SHUFPS by 0x88 and PALIGNR (x86 manual, from memory).
    #[test]
    fn moves_are_those_of_the_instructions() {
        let a = counting();
        assert_eq!(alone(&a, halves([1, 2, 3, 0]))[..32], [&a[8..32], &a[..8]].concat());
        assert_eq!(alone(&a, halves([0, 2, 1, 3]))[8..16], a[16..24]);
        let other = a.map(|b| b + 100);
        let mut x = [a, other, a, other];
        both(&mut x, (0, 1), change(0, 4));
        assert_eq!(x[0][..5], [100, 101, 102, 103, 4]);
        both(&mut x, (2, 3), zip(4));
        assert_eq!(x[2][..9], [0, 1, 2, 3, 100, 101, 102, 103, 4]);
        assert_eq!(x[3][..5], [8, 9, 10, 11, 108]);
    }

    /// Nothing is lost and nothing made, whatever the orders.
    #[test]
    fn rounds_are_permutations() {
        let mut x: Set = std::array::from_fn(|k| std::array::from_fn(|i| (64 * k + i) as u8));
        let orders = [[7; 16].map(|_| 0); 4].map(|o| order(&o.map(|v: usize| v as u8 + 77)));
        round(&mut x, &orders);
        let mut all: Vec<u8> = x.concat();
        assert!(all.iter().enumerate().any(|(i, &b)| i != usize::from(b)));
        all.sort_unstable();
        assert!(all.iter().enumerate().all(|(i, &b)| i == usize::from(b)));
    }
}
