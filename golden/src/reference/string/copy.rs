//! `string.copy`: what each slot holds afterwards is said byte by byte, from where its byte must have come; nothing is moved.

use kernels::Case;

use crate::reference::chacha::Stream;

/// a ← a + (v ⊕ ⌊v / 2³²⌋), b ← b + a in eight lanes; closed by a + F · b.
struct Lanes([(u64, u64); 8]);

const F: u64 = 0xa24b_aed4_963e_e407;

impl Lanes {
    fn push(&mut self, line: impl Iterator<Item = u64>) {
        for ((a, b), v) in self.0.iter_mut().zip(line) {
            *a = a.wrapping_add(v ^ (v / (1 << 32)));
            *b = b.wrapping_add(*a);
        }
    }

    fn push_bytes(&mut self, bytes: &[u8]) {
        for line in bytes.chunks(64) {
            self.push(line.chunks(8).map(little));
        }
    }

    fn words(&self) -> impl Iterator<Item = u64> {
        self.0.iter().map(|(a, b)| a.wrapping_add(b.wrapping_mul(F)))
    }
}

fn little(bytes: &[u8]) -> u64 {
    bytes.iter().rev().fold(0, |value, byte| value << 8 | u64::from(*byte))
}

/// The digests of 16 groups of lengths and of the last reading.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let mut page: Vec<u8> = (0..=255).collect();
    for i in (1..256).rev() {
        let other = stream.word() % (i as u64 + 1);
        page.swap(i, other as usize);
    }
    let (key, key_step) = (stream.word(), stream.word() | 1);
    let (factor, first) = (1 + stream.word() % 256, stream.word() % 257);
    let starts = stream.words(8);
    let book: Vec<u8> = (0..4096u64)
        .map(|o| (u64::from(page[o as usize % 256]) + key % 256 + (o / 256) * (key_step % 256)) as u8)
        .collect();
    let fresh = |group: u64| Lanes(std::array::from_fn(|l| (starts[l].wrapping_add(group), 0)));

    let seed = u128::from(case.seed.0);
    let mut slots = vec![vec![0u8; 512]; 32];
    let mut out = Vec::new();
    let (mut digest, mut group, mut used) = (fresh(0), 0, 0);
    for j in 0..257 {
        if 16 * j / 257 != group {
            out.extend(digest.words());
            group = 16 * j / 257;
            digest = fresh(group);
        }
        let n = ((factor * j + first) % 257) as usize;
        let (draw, value) = (stream.word(), stream.word());
        let (x, y) = ((draw % 57) as usize, (draw >> 16 & 0xffff) as usize % 55);
        let mut answers = [0u64; 8];
        for form in (0..10).filter(|form| form % 3 == ((n as u128 + seed) % 3) as usize) {
            let s = ((seed + (5 * n + 9 * form) as u128) % 64) as usize;
            let t = ((27 * seed + seed / 64 + (11 * n + 23 * form) as u128) % 64) as usize;
            let w = 1usize << ((seed / 64 + (n + t + form) as u128) % 4);
            let source = 64 * ((x + 5 * form) % 57) + s;
            let cover = 64 * ((x + 1 + y + 5 * form) % 57);
            if form == 9 {
                let e = (value >> 32) as usize % (n / w + 1);
                for (i, w) in [w, if w == 8 { 1 } else { 2 * w }].into_iter().enumerate() {
                    let at = |k: usize| little(&book[source + k * w..][..w]);
                    let wanted = at(e % (n / w + 1));
                    let equal: Vec<usize> = (0..n / w).filter(|k| at(*k) == wanted).collect();
                    answers[2 + 2 * i] = *equal.first().unwrap_or(&(n / w)) as u64;
                    answers[3 + 2 * i] = equal.last().map_or(0, |k| k + 1) as u64;
                    // the sum of all the sums: each element as often as elements follow, and once
                    let (mut a, mut b) = (0u64, 0u64);
                    for k in 0..n / w {
                        a = a.wrapping_add(at(k));
                        b = b.wrapping_add(at(k).wrapping_mul((n / w - k) as u64));
                    }
                    answers[6 + i] = a.wrapping_add(F.wrapping_mul(b));
                }
                continue;
            }
            let slot = &mut slots[used % 32];
            used += 1;
            let up = (t + 128 - s - 1) % 64 + 1;
            let down = (s + 128 - t - 1) % 64 + 1;
            *slot = (0..512usize)
                .map(|i| match form {
                    0..=2 if (64 + t..64 + t + n).contains(&i) => book[source + i - 64 - t],
                    3 | 4 if (64 + s + up..64 + s + up + n).contains(&i) => book[cover + i - up],
                    5 | 6 if (64 + t..64 + t + n).contains(&i) => book[cover + i + down],
                    7 | 8 if (64 + t..64 + t + n / w * w).contains(&i) => value.to_le_bytes()[(i - 64 - t) % w],
                    _ => book[cover + i],
                })
                .collect();
            if form == 2 {
                let (p, q) = ((draw >> 32 & 0xffff) as usize % (n + 1), (draw >> 48) as usize % (n + 1));
                slot[64 + t + p] = 255 - slot[64 + t + p];
                slot[64 + t + q] = ((u32::from(slot[64 + t + q]) + 1) % 256) as u8;
                let differing: Vec<usize> =
                    (0..n / w * w).filter(|i| slot[64 + t + i] != book[source + i]).map(|i| i / w).collect();
                answers[0] = *differing.first().unwrap_or(&(n / w)) as u64;
                answers[1] = differing.last().map_or(0, |k| k + 1) as u64;
            }
            digest.push_bytes(slot);
        }
        digest.push(answers.into_iter());
    }
    out.extend(digest.words());
    let mut last = fresh(16);
    last.push_bytes(&book);
    slots.iter().for_each(|slot| last.push_bytes(slot));
    out.extend(last.words());
    out
}
