//! `cipher.aes`: AES-128 and AES-256, encryption and decryption, each against outside values and never as a round trip.
//!
//! Four sections with a key of their own: 128-bit encryption, 128-bit decryption, 256-bit encryption, 256-bit
//! decryption. In each, 24 chains take the same 64 blocks p in: x ← E(x ⊕ p) or x ← D(x ⊕ p). Each step is a bijection
//! of x, so a wrong bit in any round of any block is in the chain's last block. The keys are expanded anew in every run
//! by the variant's own instructions.
//!
//! Operands, in stream order, for each section: key (2 or 4 words), 24 start blocks, 64 blocks; a block is two words,
//! its bytes in memory order. Output: the 24 last blocks of each section.

use super::common_aes::{Block, Job, Way, chains};
use super::common_aes_soft::Soft;
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const CHAINS: usize = 24;
const STEPS: usize = 64;
/// Direction and 64-bit key words of each section.
const SECTIONS: [(Way, usize); 4] = [(Way::Encrypt, 2), (Way::Decrypt, 2), (Way::Encrypt, 4), (Way::Decrypt, 4)];
/// Rounds that one chain takes in one step of all sections.
const ROUNDS: usize = 10 + 10 + 14 + 14;

/// See the file's head.
pub struct Aes;

impl Kernel for Aes {
    fn id(&self) -> &'static str {
        "cipher.aes"
    }

    fn summary(&self) -> &'static str {
        "AES round units: 128 and 256 bit keys, encryption and decryption in chained blocks"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(6)]
    }

    fn output_words(&self, _size: Size) -> usize {
        SECTIONS.len() * CHAINS * 2
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (CHAINS * STEPS * ROUNDS) as u64, unit: "round" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["xor", "rol"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Aes, Feature::Avx, Feature::Avx2],
                    marks: &["vaesenc", "vaesdec", "vaesimc", "vaeskeygenassist"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Aes, Feature::Avx, Feature::Avx2, Feature::Vaes, Feature::Avx512f],
                    marks: &["vaesenc", "vaesdec", "vaesimc", "vaeskeygenassist"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["eor"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon, Feature::ArmAes],
                    marks: &["aese", "aesmc", "aesd", "aesimc"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let jobs = SECTIONS
            .iter()
            .map(|&(way, key)| {
                let key = (0..key).map(|_| operands.word()).flat_map(|w| [w as u32, (w >> 32) as u32]).collect();
                let start = (0..CHAINS).map(|_| [operands.word(), operands.word()]).collect();
                let plain = (0..STEPS).map(|_| [operands.word(), operands.word()]).collect();
                Job { way, key, plain, start }
            })
            .collect();
        operands.finish(SECTIONS.iter().map(|(_, key)| key + 2 * (CHAINS + STEPS)).sum());
        Roles::One(Box::new(Sections { jobs, run: runner(proof.variant_for(self.id())) }))
    }
}

type Runner = fn(&Job, &mut [Block]);

struct Sections {
    jobs: Vec<Job>,
    run: Runner,
}

impl Ready for Sections {
    fn run(&mut self, out: &mut [u64]) {
        for (job, out) in self.jobs.iter().zip(out.chunks_exact_mut(2 * CHAINS)) {
            (self.run)(job, out.as_chunks_mut::<2>().0);
        }
    }
}

#[inline(never)]
fn portable(job: &Job, out: &mut [Block]) {
    chains::<Soft, 1>(Soft, job, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "aes,avx,avx2")]
fn avx2(job: &Job, out: &mut [Block]) {
    // SAFETY: this function is compiled for, and its callers proved, aes and avx
    let r = unsafe { super::common_aes_x86::Aesni::new() };
    chains::<_, 12>(r, job, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "aes,avx,avx2,vaes,avx512f")]
fn avx512(job: &Job, out: &mut [Block]) {
    // SAFETY: this function is compiled for, and its callers proved, vaes, aes and avx512f
    let r = unsafe { super::common_aes_x86::Vaes::new() };
    chains::<_, 6>(r, job, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
#[target_feature(enable = "neon,aes")]
fn neon(job: &Job, out: &mut [Block]) {
    // SAFETY: this function is compiled for, and its callers proved, aes
    let r = unsafe { super::common_aes_arm::Arm::new() };
    chains::<_, 12>(r, job, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |job, out| unsafe { avx2(job, out) },
        // SAFETY: as above
        #[cfg(target_arch = "x86_64")]
        Variant::Avx512 => |job, out| unsafe { avx512(job, out) },
        // SAFETY: as above
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => |job, out| unsafe { neon(job, out) },
        _ => portable,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::isa;

    fn block(hex: &str) -> Block {
        let n = u128::from_str_radix(hex, 16).expect("hexadecimal").swap_bytes();
        [n as u64, (n >> 64) as u64]
    }

    fn key(hex: &str) -> Vec<u32> {
        let words = (0..hex.len()).step_by(8).map(|i| u32::from_str_radix(&hex[i..i + 8], 16).expect("hexadecimal"));
        words.map(u32::swap_bytes).collect()
    }

    /// (key, plain, cipher): FIPS 197 appendix B, C.1 and C.3.
    const PUBLISHED: [(&str, &str, &str); 3] = [
        ("2b7e151628aed2a6abf7158809cf4f3c", "3243f6a8885a308d313198a2e0370734", "3925841d02dc09fbdc118597196a0b32"),
        ("000102030405060708090a0b0c0d0e0f", "00112233445566778899aabbccddeeff", "69c4e0d86a7b0430d8cdb78070b4c55a"),
        (
            "000102030405060708090a0b0c0d0e0f101112131415161718191a1b1c1d1e1f",
            "00112233445566778899aabbccddeeff",
            "8ea2b7ca516745bfeafc49904b496089",
        ),
    ];

    #[test]
    fn published_blocks_through_the_rounds_of_every_variant() {
        let mut ran = 0;
        for (variant, _) in isa::survey(&Aes).into_iter().filter(|(_, proof)| proof.is_ok()) {
            ran += 1;
            for (k, plain, cipher) in PUBLISHED {
                for (way, from, to) in [(Way::Encrypt, plain, cipher), (Way::Decrypt, cipher, plain)] {
                    let job = Job { way, key: key(k), plain: vec![block(from)], start: vec![[0; 2]; CHAINS] };
                    let mut out = vec![[0; 2]; CHAINS];
                    runner(variant)(&job, &mut out);
                    assert_eq!(out, vec![block(to); CHAINS], "{variant} {way:?} key {k}");
                }
            }
        }
        assert!(ran > 0, "no variant ran");
    }
}
