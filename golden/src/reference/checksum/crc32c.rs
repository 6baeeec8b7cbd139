//! `checksum.crc32c`: a shift register, one bit of the message at a time, one chain after the other.

use kernels::Case;

use crate::reference::chacha::Stream;

const POLYNOMIAL: u32 = 0x1edc_6f41;

/// The register, highest power of x in bit 31, after the bits of `message`, the lowest of each byte first.
fn shift(mut register: u32, message: &[u8]) -> u32 {
    for byte in message {
        for bit in 0..8 {
            let out = register >> 31 ^ u32::from(byte >> bit & 1);
            register <<= 1;
            if out == 1 {
                register ^= POLYNOMIAL;
            }
        }
    }
    register
}

fn checksum(register: u32) -> u64 {
    u64::from(!register.reverse_bits())
}

/// After every fourth group the CRCs of the four chains.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let data: Vec<u8> = stream.words(2048).into_iter().flat_map(u64::to_le_bytes).collect();
    let mut groups = Vec::new();
    for _ in 0..32 {
        let length = (stream.word() % 1024) as usize;
        groups.push((length, stream.word()));
        groups.push((1023 - length, stream.word()));
    }
    let mut out = vec![0; 32];
    for chain in 0..4 {
        let mut register = u32::MAX;
        for (number, (length, offsets)) in groups.iter().enumerate() {
            let at = ((offsets >> (14 * chain)) % 16384 % 15361) as usize;
            register = shift(register, &data[at..at + length]);
            if number % 4 == 3 {
                out[number / 4 * 2 + chain / 2] |= checksum(register) << (32 * (chain % 2));
            }
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// RFC 3720 appendix B.4, whose byte strings are the CRC's bytes from the lowest; the last is the check value of the
    /// CRC catalogues.
    #[test]
    fn published_values() {
        let up: Vec<u8> = (0..32).collect();
        let down: Vec<u8> = (0..32).rev().collect();
        for (message, crc) in [
            (&[0; 32][..], 0x8a91_36aa),
            (&[0xff; 32], 0x62a8_ab43),
            (&up, 0x46dd_794e),
            (&down, 0x113f_db5c),
            (b"123456789", 0xe306_9283),
        ] {
            assert_eq!(checksum(shift(u32::MAX, message)), crc);
        }
    }
}
