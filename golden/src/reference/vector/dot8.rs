//! `vector.dot8`: lane by lane, the products of two bytes one after the other in 64-bit integers.

use kernels::Case;

use crate::reference::chacha::Stream;

/// A lane's number of each line.
fn lane(line: &[u64], l: usize) -> u64 {
    line[l / 2] >> (32 * (l % 2)) & 0xffff_ffff
}

/// The number plus the products of u's unsigned and s's signed bytes, as 32 bits.
fn dot(number: u64, u: u64, s: u64) -> u64 {
    let mut sum = number as i64;
    for place in [0, 8, 16, 24] {
        let (unsigned, byte) = ((u >> place & 255) as i64, (s >> place & 255) as i64);
        let signed = if byte > 127 { byte - 256 } else { byte };
        sum += unsigned * signed;
    }
    (sum & 0xffff_ffff) as u64
}

/// One round on a lane's twelve numbers: group g of three takes in those of the groups g + 1 and g + 2.
fn round(x: &mut [u64; 12], k: &[u64]) {
    for group in 0..4 {
        for kind in 0..4 {
            for i in 0..3 {
                let target = 3 * group + i;
                let (far, near) = ((target + 6) % 12, (3 * (group + 1) + (i + 1) % 3) % 12);
                let (even, odd) = (k[2 * target], k[2 * target + 1]);
                let (u, s) = [(x[far], even), (odd, x[near]), (x[near], x[far]), (even, odd)][kind];
                x[target] = dot(x[target], u, s);
            }
        }
    }
}

/// The twelve numbers of each lane after sixteen passes of sixteen rounds.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let start = stream.words(12 * 8);
    let rounds = stream.words(16 * 24 * 8);
    let mut out = vec![0; 12 * 8];
    for l in 0..16 {
        let mut x = std::array::from_fn(|i| lane(&start[8 * i..], l));
        let own: Vec<u64> = rounds.chunks(8).map(|line| lane(line, l)).collect();
        for _ in 0..16 {
            own.chunks(24).for_each(|k| round(&mut x, k));
        }
        for (i, number) in x.into_iter().enumerate() {
            out[8 * i + l / 2] |= number << (32 * (l % 2));
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The case published in a compression library's public issue thread about a CPU that multiplied wrongly.
    #[test]
    fn published_case_of_a_bad_cpu() {
        let start: [u64; 8] = [
            304882548649473,
            702957297498669,
            661412078891339,
            271961624295744,
            583329573380896,
            1038265394263940,
            968171528097900,
            898077661810860,
        ];
        let correct = [
            243447, 134736, 222019, 219260, 260737, 201427, 189078, 102591, 175254, 166927, 155930, 264690, 252450,
            240210, 227970, 215730,
        ];
        for (l, right) in correct.into_iter().enumerate() {
            // multipliers 68, 67, … 5 for bytes 0 to 63
            let factors = (0..4).map(|b| (68 - 4 * l as u64 - b) << (8 * b)).sum();
            assert_eq!(dot(lane(&start, l), 0xffff_ffff, factors), right, "lane {l}");
        }
    }
}
