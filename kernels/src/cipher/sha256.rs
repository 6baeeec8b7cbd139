//! `cipher.sha256`: the compression function of FIPS 180-4 §6.2 over eight messages.
//!
//! Each message is 2,039 bytes, so that with its padding it fills 32 blocks exactly: the output is the messages' SHA-256
//! itself. The eight chains are independent; a variant may keep several in flight.
//!
//! Operands, in stream order: 8 × 255 words, message after message; the bytes of a message are its words in little-endian
//! order without the last byte. Output: the digests, each as four words of eight bytes read big endian.

#[cfg(target_arch = "aarch64")]
use super::common_sha_arm;
#[cfg(target_arch = "x86_64")]
use super::common_sha_x86;
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const MESSAGES: usize = 8;
/// Messages that a runner is given at once.
pub(super) const CHAINS: usize = 4;
const BLOCKS: usize = 32;
/// Operand words of one message.
const WORDS: usize = 255;

/// Chaining value.
pub(super) type State = [u32; 8];

/// H⁽⁰⁾ of FIPS 180-4 §5.3.3.
const INITIAL: State =
    [0x6a09_e667, 0xbb67_ae85, 0x3c6e_f372, 0xa54f_f53a, 0x510e_527f, 0x9b05_688c, 0x1f83_d9ab, 0x5be0_cd19];

/// K of FIPS 180-4 §4.2.2.
#[rustfmt::skip]
pub(super) static K: [u32; 64] = [
    0x428a_2f98, 0x7137_4491, 0xb5c0_fbcf, 0xe9b5_dba5, 0x3956_c25b, 0x59f1_11f1, 0x923f_82a4, 0xab1c_5ed5,
    0xd807_aa98, 0x1283_5b01, 0x2431_85be, 0x550c_7dc3, 0x72be_5d74, 0x80de_b1fe, 0x9bdc_06a7, 0xc19b_f174,
    0xe49b_69c1, 0xefbe_4786, 0x0fc1_9dc6, 0x240c_a1cc, 0x2de9_2c6f, 0x4a74_84aa, 0x5cb0_a9dc, 0x76f9_88da,
    0x983e_5152, 0xa831_c66d, 0xb003_27c8, 0xbf59_7fc7, 0xc6e0_0bf3, 0xd5a7_9147, 0x06ca_6351, 0x1429_2967,
    0x27b7_0a85, 0x2e1b_2138, 0x4d2c_6dfc, 0x5338_0d13, 0x650a_7354, 0x766a_0abb, 0x81c2_c92e, 0x9272_2c85,
    0xa2bf_e8a1, 0xa81a_664b, 0xc24b_8b70, 0xc76c_51a3, 0xd192_e819, 0xd699_0624, 0xf40e_3585, 0x106a_a070,
    0x19a4_c116, 0x1e37_6c08, 0x2748_774c, 0x34b0_bcb5, 0x391c_0cb3, 0x4ed8_aa4a, 0x5b9c_ca4f, 0x682e_6ff3,
    0x748f_82ee, 0x78a5_636f, 0x84c8_7814, 0x8cc7_0208, 0x90be_fffa, 0xa450_6ceb, 0xbef9_a3f7, 0xc671_78f2,
];

/// See the file's head.
pub struct Sha256;

impl Kernel for Sha256 {
    fn id(&self) -> &'static str {
        "cipher.sha256"
    }

    fn summary(&self) -> &'static str {
        "SHA-256 round and message units, or the same in 32-bit integer code"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(16)]
    }

    fn output_words(&self, _size: Size) -> usize {
        MESSAGES * 4
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (MESSAGES * BLOCKS) as u64, unit: "block" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["ro", "xor"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Sha, Feature::Ssse3, Feature::Sse41],
                    marks: &["sha256rnds2", "sha256msg1", "sha256msg2"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["ror"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon, Feature::ArmSha2],
                    marks: &["sha256h", "sha256h2", "sha256su0", "sha256su1"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let messages = (0..MESSAGES)
            .map(|_| {
                let bytes: Vec<u8> = operands.words(WORDS).into_iter().flat_map(u64::to_le_bytes).collect();
                pad(&bytes[..WORDS * 8 - 1])
            })
            .collect();
        operands.finish(MESSAGES * WORDS);
        Roles::One(Box::new(Messages { messages, run: runner(proof.variant_for(self.id())) }))
    }
}

/// FIPS 180-4 §5.1.1.
fn pad(message: &[u8]) -> Vec<u8> {
    let mut padded = message.to_vec();
    padded.push(0x80);
    padded.resize(padded.len() + (120 - padded.len() % 64) % 64, 0);
    padded.extend_from_slice(&(message.len() as u64 * 8).to_be_bytes());
    padded
}

/// Runs chaining values over messages of the same whole number of blocks.
type Runner = fn(&mut [State; CHAINS], [&[u8]; CHAINS]);

struct Messages {
    messages: Vec<Vec<u8>>,
    run: Runner,
}

impl Ready for Messages {
    fn run(&mut self, out: &mut [u64]) {
        let groups = self.messages.as_chunks::<CHAINS>().0;
        for (group, out) in groups.iter().zip(out.chunks_exact_mut(4 * CHAINS)) {
            let mut states = [INITIAL; CHAINS];
            (self.run)(&mut states, group.each_ref().map(Vec::as_slice));
            for (word, halves) in out.iter_mut().zip(states.as_flattened().as_chunks::<2>().0) {
                *word = u64::from(halves[0]) << 32 | u64::from(halves[1]);
            }
        }
    }
}

/// FIPS 180-4 §6.2.2 with the message schedule in a ring of 16 words.
#[inline(always)]
fn compress(state: &mut State, block: &[u8; 64]) {
    let mut w: [u32; 16] = std::array::from_fn(|t| {
        u32::from_be_bytes([block[4 * t], block[4 * t + 1], block[4 * t + 2], block[4 * t + 3]])
    });
    let [mut a, mut b, mut c, mut d, mut e, mut f, mut g, mut h] = *state;
    for t in 0..64 {
        if t >= 16 {
            let (w15, w2) = (w[(t + 1) % 16], w[(t + 14) % 16]);
            let s0 = w15.rotate_right(7) ^ w15.rotate_right(18) ^ w15 >> 3;
            let s1 = w2.rotate_right(17) ^ w2.rotate_right(19) ^ w2 >> 10;
            w[t % 16] = w[t % 16].wrapping_add(s0).wrapping_add(w[(t + 9) % 16]).wrapping_add(s1);
        }
        let sum1 = e.rotate_right(6) ^ e.rotate_right(11) ^ e.rotate_right(25);
        let t1 = h.wrapping_add(sum1).wrapping_add(g ^ e & (f ^ g)).wrapping_add(K[t]).wrapping_add(w[t % 16]);
        let sum0 = a.rotate_right(2) ^ a.rotate_right(13) ^ a.rotate_right(22);
        let t2 = sum0.wrapping_add(a & b | c & (a | b));
        (h, g, f, e, d, c, b, a) = (g, f, e, d.wrapping_add(t1), c, b, a, t1.wrapping_add(t2));
    }
    for (s, x) in state.iter_mut().zip([a, b, c, d, e, f, g, h]) {
        *s = s.wrapping_add(x);
    }
}

#[inline(never)]
fn portable(states: &mut [State; CHAINS], messages: [&[u8]; CHAINS]) {
    for (state, message) in states.iter_mut().zip(messages) {
        for block in message.as_chunks::<64>().0 {
            compress(state, block);
        }
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "sha,ssse3,sse4.1")]
fn avx2(states: &mut [State; CHAINS], messages: [&[u8]; CHAINS]) {
    common_sha_x86::compress_all(states, messages);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon,sha2")]
fn neon(states: &mut [State; CHAINS], messages: [&[u8]; CHAINS]) {
    common_sha_arm::compress_all(states, messages);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |states, messages| unsafe { avx2(states, messages) },
        // SAFETY: as above
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => |states, messages| unsafe { neon(states, messages) },
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::isa;

    /// FIPS 180-2 appendix B.1 and B.2, and the empty message of the NIST example values (SHA256ShortMsg, Len = 0).
    #[rustfmt::skip]
    const PUBLISHED: [(&str, State); 3] = [
        ("abc", [0xba78_16bf, 0x8f01_cfea, 0x4141_40de, 0x5dae_2223, 0xb003_61a3, 0x9617_7a9c, 0xb410_ff61, 0xf200_15ad]),
        (
            "abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq",
            [0x248d_6a61, 0xd206_38b8, 0xe5c0_2693, 0x0c3e_6039, 0xa33c_e459, 0x64ff_2167, 0xf6ec_edd4, 0x19db_06c1],
        ),
        ("", [0xe3b0_c442, 0x98fc_1c14, 0x9afb_f4c8, 0x996f_b924, 0x27ae_41e4, 0x649b_934c, 0xa495_991b, 0x7852_b855]),
    ];

    #[test]
    fn published_digests_through_the_compression_of_every_variant() {
        let mut ran = 0;
        for (variant, _) in isa::survey(&Sha256).into_iter().filter(|(_, proof)| proof.is_ok()) {
            ran += 1;
            for (message, digest) in PUBLISHED {
                let padded = pad(message.as_bytes());
                let mut states = [INITIAL; CHAINS];
                runner(variant)(&mut states, [&padded; CHAINS]);
                assert_eq!(states, [digest; CHAINS], "{variant} {message:?}");
            }
        }
        assert!(ran > 0, "no variant ran");
    }
}
