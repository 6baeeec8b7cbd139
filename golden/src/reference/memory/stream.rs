//! `memory.stream`: which instruction stores or loads a line changes nothing, so a pass is its lines in the order of reading.

use kernels::Case;

use super::common_digest::Lane;
use crate::reference::chacha::Stream;

/// The eight lane digests of every pass.
pub fn words(case: &Case) -> Vec<u64> {
    let passes: u64 = match case.size.0 {
        24 => 8,
        384 => 4,
        _ => 2,
    };
    let lines = u64::from(case.size.0) * 1024 / 64;
    let mut stream = Stream::new(case);
    let (starts, first) = (stream.words(8), stream.words(8));
    let (step, pass_step) = (stream.word() | 1, stream.word() | 1);
    let mut out = Vec::new();
    for pass in 0..passes {
        for (start, s) in starts.iter().zip(&first) {
            let mut digest = Lane::new(start.wrapping_add(pass));
            for n in 0..lines {
                let line = if pass % 2 == 0 { n } else { lines - 1 - n };
                digest.push(s.wrapping_add(pass.wrapping_mul(pass_step)).wrapping_add(line.wrapping_mul(step)));
            }
            out.push(digest.finish());
        }
    }
    out
}
