//! `memory.copy`: the payloads never change, so only the order matters in which each hop takes their lines.

use kernels::Case;

use super::common_digest::Lane;
use crate::reference::chacha::Stream;

/// Side and byte offset of each place of the path.
fn path() -> Vec<(u32, u32)> {
    let mut places: Vec<(u32, u32)> = (0..64).map(|t| (t & 1, 27 * t % 64)).collect();
    for pair in 0..32 {
        places.extend([(1, pair), (1, 63 - pair)]);
    }
    places
}

/// The digests of 16 groups of hops and of the last reading.
pub fn words(case: &Case) -> Vec<u64> {
    let (payloads, rounds) = match case.size.0 {
        24 => (1, 128),
        384 => (16, 16),
        _ => (128, 8),
    };
    let mut stream = Stream::new(case);
    let (starts, first) = (stream.words(8), stream.words(8));
    let step = stream.word() | 1;
    let path = path();

    let fresh =
        |group: usize| -> Vec<Lane> { starts.iter().map(|p| Lane::new(p.wrapping_add(group as u64))).collect() };
    let take = |digest: &mut Vec<Lane>, payload: usize, upwards: bool| {
        for n in 0..190 {
            let i = if upwards { n } else { 189 - n };
            for (lane, s) in digest.iter_mut().zip(&first) {
                lane.push(s.wrapping_add(((payload * 190 + i) as u64).wrapping_mul(step)));
            }
        }
    };
    let mut out = Vec::new();
    let mut digest = fresh(0);
    let mut hops = 0;
    for round in 0..rounds {
        for payload in 0..payloads {
            let t = payload * 128 / payloads + round;
            let ((side, offset), (next_side, next_offset)) = (path[t % 128], path[(t + 1) % 128]);
            // a move up over itself must begin at its end
            take(&mut digest, payload, !(side == next_side && next_offset > offset));
            hops += 1;
            if hops % (rounds * payloads / 16) == 0 {
                out.extend(digest.iter().map(|lane| lane.finish()));
                digest = fresh(hops / (rounds * payloads / 16));
            }
        }
    }
    for payload in 0..payloads {
        take(&mut digest, payload, true);
    }
    out.extend(digest.into_iter().map(Lane::finish));
    out
}
