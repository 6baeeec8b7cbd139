//! `cipher.sha256`: FIPS 180-4 with its constants computed: the first 32 fraction bits of the square and cube roots of the
//! first primes (§4.2.2, §5.3.3), by integer roots.

use kernels::Case;

use crate::reference::chacha::Stream;

fn primes(count: usize) -> Vec<u128> {
    (2..).filter(|n| (2..*n).all(|d| n % d != 0)).take(count).collect()
}

/// ⌊n^(1/power)⌋ by bisection.
fn root(n: u128, power: u32) -> u128 {
    let (mut low, mut high) = (0u128, 1u128 << 38);
    while high - low > 1 {
        let middle = (low + high) / 2;
        if middle.checked_pow(power).is_some_and(|p| p <= n) { low = middle } else { high = middle }
    }
    low
}

struct Constants {
    initial: Vec<u32>,
    k: Vec<u32>,
}

impl Constants {
    fn new() -> Constants {
        let initial = primes(8).into_iter().map(|p| root(p << 64, 2) as u32).collect();
        let k = primes(64).into_iter().map(|p| root(p << 96, 3) as u32).collect();
        Constants { initial, k }
    }
}

fn compress(k: &[u32], h: &[u32], block: &[u8]) -> Vec<u32> {
    let mut w: Vec<u32> = block.chunks_exact(4).map(|b| b.iter().fold(0, |x, &b| x << 8 | u32::from(b))).collect();
    for t in 16..64 {
        let small0 = w[t - 15].rotate_right(7) ^ w[t - 15].rotate_right(18) ^ (w[t - 15] >> 3);
        let small1 = w[t - 2].rotate_right(17) ^ w[t - 2].rotate_right(19) ^ (w[t - 2] >> 10);
        w.push(small1.wrapping_add(w[t - 7]).wrapping_add(small0).wrapping_add(w[t - 16]));
    }
    // v[0] … v[7] are a … h
    let mut v = h.to_vec();
    for t in 0..64 {
        let (a, b, c, e, f, g) = (v[0], v[1], v[2], v[4], v[5], v[6]);
        let big1 = e.rotate_right(6) ^ e.rotate_right(11) ^ e.rotate_right(25);
        let choose = (e & f) ^ (!e & g);
        let t1 = v[7].wrapping_add(big1).wrapping_add(choose).wrapping_add(k[t]).wrapping_add(w[t]);
        let big0 = a.rotate_right(2) ^ a.rotate_right(13) ^ a.rotate_right(22);
        let majority = (a & b) ^ (a & c) ^ (b & c);
        v.rotate_right(1);
        v[0] = t1.wrapping_add(big0).wrapping_add(majority);
        v[4] = v[4].wrapping_add(t1);
    }
    v.iter().zip(h).map(|(x, y)| x.wrapping_add(*y)).collect()
}

fn digest(constants: &Constants, message: &[u8]) -> Vec<u32> {
    let mut padded = message.to_vec();
    padded.push(0x80);
    while padded.len() % 64 != 56 {
        padded.push(0);
    }
    padded.extend((8 * message.len() as u64).to_be_bytes());
    padded.chunks_exact(64).fold(constants.initial.clone(), |h, block| compress(&constants.k, &h, block))
}

/// The digests of the eight messages.
pub fn words(case: &Case) -> Vec<u64> {
    let constants = Constants::new();
    let mut stream = Stream::new(case);
    let mut out = Vec::new();
    for _ in 0..8 {
        let mut message: Vec<u8> = (0..255).flat_map(|_| stream.word().to_le_bytes()).collect();
        message.pop();
        let digest = digest(&constants, &message);
        out.extend(digest.chunks_exact(2).map(|h| u64::from(h[0]) << 32 | u64::from(h[1])));
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180-2 appendix B.1: "abc".
    #[test]
    fn one_block_example() {
        let expected =
            [0xba78_16bf, 0x8f01_cfea, 0x4141_40de, 0x5dae_2223, 0xb003_61a3, 0x9617_7a9c, 0xb410_ff61, 0xf200_15ad];
        assert_eq!(digest(&Constants::new(), b"abc"), expected);
    }
}
