//! `vector.integer`: more than a hundred integer operations of the vector units, each result kept.
//!
//! Four nets, each of eight blocks of 16 bytes. A round ([`integer_round!`](crate::integer_round) is the exact statement)
//! adds, subtracts or xors the results of the operations of [`crate::vectors`] to the blocks, in groups of two; each group
//! takes in functions of operands and of the two groups whose turn is the longest ago, so that no group waits for the one
//! before it. Every such update is a bijection of the block that takes it in, so whatever an operation gets wrong stays,
//! and spreads to all blocks within two rounds, even where the operation itself saturates or compares and would have
//! swallowed it. The accumulating instructions are of the subject themselves: `paddb` to `psubq` and `pxor`. Once a round
//! the signs of one vector's bytes (`pmovmskb`) go into a word, 16 bits a net; the words are digested as
//! h ← rotl(h, 29)·c + word, a bijection in both.
//!
//! Comparisons for equality would find nothing equal in random data: they compare a minimum or maximum with one of the
//! two that it was taken of, or a row of elements with one that it was made of.
//!
//! # Reading a mismatch
//! A word of the output is word (i mod 2) of net (i div 2 mod 4) of block i div 8. Nets never mix: where only one net is
//! wrong, the lane of 16 bytes is known: nets 0 to 3 are bytes 0–15, 16–31, 32–47, 48–63 of a 512-bit register, and
//! alternately the low and the high half of a 256-bit one. The words of a wrong net tell no more than that.
//!
//! Operands, in stream order: the blocks (8 × 8 words, word by word as in the output); then for each of 32 rounds eight
//! lines of 8 words (word i belongs to net i div 2), a line of eight counts (word mod (1 + width of the elements shifted
//! by it)), a line of counts for elements of 32 bits (each mod 32) and one for elements of 64 bits (each mod 64). The
//! rounds are gone through three times. Output: the blocks, then the digest of the signs.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;
use crate::vectors::Line;

const NETS: usize = 4;
const BLOCKS: usize = 8;
const ROUNDS: usize = 32;
const PASSES: usize = 3;
/// Calls of the operations in [`integer_round!`](crate::integer_round) and `signs`.
const OPERATIONS: usize = 1 + 249;
/// Elements' width for each of the counts in a round's line 8.
const COUNTED: [u64; 8] = [16, 32, 64, 16, 16, 32, 64, 32];

/// A round's lines: 0 to 7 random, 8 to 10 counts.
type Round = [Line; 11];
/// Signs of the vectors that the rounds gave.
type Signs = [[u8; 8]; PASSES * ROUNDS];

/// See the file's head.
pub struct Integer;

#[cfg(target_arch = "x86_64")]
#[rustfmt::skip] // one a line would be longer than all the rest
const SSE2_MARKS: &[&str] = &[
    "paddb", "paddw", "paddd", "paddq", "psubb", "psubw", "psubd", "psubq", "pand", "por", "pxor", "pandn", "paddsb",
    "paddsw", "paddusb", "paddusw", "psubsb", "psubsw", "psubusb", "psubusw", "pavgb", "pavgw", "pmullw", "pmulhw",
    "pmulhuw", "pmuludq", "pmaddwd", "pminub", "pmaxub", "pminsw", "pmaxsw", "pcmpeqb", "pcmpeqw", "pcmpeqd",
    "pcmpgtb", "pcmpgtw", "pcmpgtd", "packsswb", "packssdw", "packuswb", "punpcklbw", "punpcklwd", "punpckldq",
    "punpcklqdq", "punpckhbw", "punpckhwd", "punpckhdq", "punpckhqdq", "psadbw", "psllw", "pslld", "psllq", "psrlw",
    "psrld", "psrlq", "psraw", "psrad", "pslldq", "psrldq", "pmovmskb", "pshufd", "shufps", "shufpd",
];

#[cfg(target_arch = "x86_64")]
#[rustfmt::skip] // one a line would be longer than all the rest
const AVX2_MARKS: &[&str] = &[
    "vpaddb", "vpaddw", "vpaddd", "vpaddq", "vpsubb", "vpsubw", "vpsubd", "vpsubq", "vpand", "vpor", "vpxor", "vpandn",
    "vpaddsb", "vpaddsw", "vpaddusb", "vpaddusw", "vpsubsb", "vpsubsw", "vpsubusb", "vpsubusw", "vpavgb", "vpavgw",
    "vpmullw", "vpmulhw", "vpmulhuw", "vpmuludq", "vpmaddwd", "vpmulld", "vpmuldq", "vpmaddubsw", "vpmulhrsw",
    "vpsignb", "vpsignw", "vpsignd", "vpminub", "vpmaxub", "vpminsw", "vpmaxsw", "vpminsb", "vpmaxsb", "vpminuw",
    "vpmaxuw", "vpminsd", "vpmaxsd", "vpminud", "vpmaxud", "vpcmpeqb", "vpcmpeqw", "vpcmpeqd", "vpcmpeqq", "vpcmpgtb",
    "vpcmpgtw", "vpcmpgtd", "vpcmpgtq", "vpacksswb", "vpackssdw", "vpackuswb", "vpackusdw", "vpunpcklbw", "vpunpcklwd",
    "vpunpckldq", "vpunpcklqdq", "vpunpckhbw", "vpunpckhwd", "vpunpckhdq", "vpunpckhqdq", "vpsadbw", "vphaddw",
    "vphaddd", "vphaddsw", "vphsubw", "vphsubd", "vphsubsw", "vpsllvd", "vpsllvq", "vpsrlvd", "vpsrlvq", "vpsravd",
    "vpabsb", "vpabsw", "vpabsd", "vpsllw", "vpslld", "vpsllq", "vpsrlw", "vpsrld", "vpsrlq", "vpsraw", "vpsrad",
    "vpslldq", "vpsrldq", "vpmovzxbw", "vpmovzxbd", "vpmovzxbq", "vpmovzxwd", "vpmovzxwq", "vpmovzxdq", "vpmovsxbw",
    "vpmovsxbd", "vpmovsxbq", "vpmovsxwd", "vpmovsxwq", "vpmovsxdq", "vpmovmskb", "vmpsadbw", "vphminposuw",
    "vextractf128",
];

#[cfg(target_arch = "x86_64")]
#[rustfmt::skip] // one a line would be longer than all the rest
const AVX512_MARKS: &[&str] = &[
    "vpaddb", "vpaddw", "vpaddd", "vpaddq", "vpsubb", "vpsubw", "vpsubd", "vpsubq", "vpandd", "vporq", "vpxorq",
    "vpandnd", "vpaddsb", "vpaddsw", "vpaddusb", "vpaddusw", "vpsubsb", "vpsubsw", "vpsubusb", "vpsubusw", "vpavgb",
    "vpavgw", "vpmullw", "vpmulhw", "vpmulhuw", "vpmuludq", "vpmaddwd", "vpmulld", "vpmuldq", "vpmaddubsw",
    "vpmulhrsw", "vpminub", "vpmaxub", "vpminsw", "vpmaxsw", "vpminsb", "vpmaxsb", "vpminuw", "vpmaxuw", "vpminsd",
    "vpmaxsd", "vpminud", "vpmaxud", "vpacksswb", "vpackssdw", "vpackuswb", "vpackusdw", "vpunpcklbw", "vpunpcklwd",
    "vpunpckldq", "vpunpcklqdq", "vpunpckhbw", "vpunpckhwd", "vpunpckhdq", "vpunpckhqdq", "vpsadbw", "vpsllvd",
    "vpsllvq", "vpsrlvd", "vpsrlvq", "vpsravd", "vpabsb", "vpabsw", "vpabsd", "vpsllw", "vpslld", "vpsllq", "vpsrlw",
    "vpsrld", "vpsrlq", "vpsraw", "vpsrad", "vpslldq", "vpsrldq", "vpmovzxbw", "vpmovzxbd", "vpmovzxbq", "vpmovzxwd",
    "vpmovzxwq", "vpmovzxdq", "vpmovsxbw", "vpmovsxbd", "vpmovsxbq", "vpmovsxwd", "vpmovsxwq", "vpmovsxdq", "vpcmpeqb",
    "vpcmpeqw", "vpcmpeqd", "vpcmpeqq", "vpcmpgtb", "vpcmpgtw", "vpcmpgtd", "vpcmpgtq", "vpmovm2b", "vpmovm2w",
    "vpmovm2d", "vpmovm2q", "vpmovb2m", "kmovq", "vpsignb", "vpsignw", "vpsignd", "vphaddw", "vphaddd", "vphaddsw",
    "vphsubw", "vphsubd", "vphsubsw", "vmpsadbw", "vphminposuw",
];

impl Kernel for Integer {
    fn id(&self) -> &'static str {
        "vector.integer"
    }

    fn summary(&self) -> &'static str {
        "integer vector units: sums, products, comparisons, packs, shifts at every width, saturating and not"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(23)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * NETS * BLOCKS + 1
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (NETS * PASSES * ROUNDS * OPERATIONS) as u64, unit: "block operation" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: SSE2_MARKS, proven: Proven::Hardware },
                Build { variant: Variant::Avx2, needs: &[Feature::Avx2], marks: AVX2_MARKS, proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx2, Feature::Avx512f, Feature::Avx512bw, Feature::Avx512dq, Feature::Avx512vl],
                    marks: AVX512_MARKS,
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            &[Build {
                variant: Variant::Neon,
                needs: &[Feature::Neon],
                marks: &[
                    "add", "sub", "and", "orr", "eor", "sqadd", "uqadd", "sqsub", "uqsub", "urhadd", "mul", "umin",
                    "umax", "smin", "smax", "cmeq", "cmgt", "zip1", "zip2", "addp", "ushl", "bic", "smull", "smull2",
                    "uzp2", "umull", "umull2", "xtn", "sqxtn", "sqxtn2", "sqxtun", "sqxtun2", "uabd", "uaddlp", "uzp1",
                    "neg", "sshl", "cmlt", "bsl", "uminv", "dup", "shl", "ushr", "sshr", "ext", "uxtl", "sxtl",
                ],
                proven: Proven::Emulator,
            }]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let mut line = || Line::from_words(std::array::from_fn(|_| operands.word()));
        let blocks = std::array::from_fn(|_| line());
        let rounds = (0..ROUNDS).map(|_| std::array::from_fn(|i| counts(i, line()))).collect();
        operands.finish(8 * BLOCKS + 8 * 11 * ROUNDS);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Portable => run_portable,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => run_neon,
            other => panic!("{other} is none of this kernel's builds"),
        };
        Roles::One(Box::new(Nets { blocks, rounds, run }))
    }
}

/// The i-th line of a round, made from random words.
fn counts(i: usize, line: Line) -> Line {
    let words = line.to_words();
    Line::from_words(std::array::from_fn(|j| match i {
        8 => words[j] % (1 + COUNTED[j]),
        9 => words[j] & 0x0000_001f_0000_001f,
        10 => words[j] & 63,
        _ => words[j],
    }))
}

struct Nets {
    blocks: [Line; BLOCKS],
    rounds: Vec<Round>,
    run: fn(&[Round], &mut [Line; BLOCKS], &mut Signs),
}

impl Ready for Nets {
    fn run(&mut self, out: &mut [u64]) {
        let (mut blocks, mut signs) = (self.blocks, [[0; 8]; PASSES * ROUNDS]);
        (self.run)(&self.rounds, &mut blocks, &mut signs);
        let (digest, words) = out.split_last_mut().expect("the output has 65 words");
        for (place, line) in words.as_chunks_mut::<8>().0.iter_mut().zip(blocks) {
            *place = line.to_words();
        }
        *digest = signs.iter().fold(0, |h: u64, word| {
            h.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15).wrapping_add(u64::from_le_bytes(*word))
        });
    }
}

macro_rules! wrapped {
    ($name:ident $run:ident $module:ident $features:literal, $arch:literal) => {
        #[cfg(target_arch = $arch)]
        #[inline(never)]
        #[target_feature(enable = $features)]
        fn $name(rounds: &[Round], blocks: &mut [Line; BLOCKS], bits: &mut Signs) {
            use crate::vectors::$module::*;
            for at in (0..64).step_by(WIDTH) {
                // known here, so that no load has to check it
                assert!(at <= 64 - WIDTH);
                let [a, b, c, d, e, f, g, h] = &*blocks;
                let mut x = [
                    load(a, at), load(b, at), load(c, at), load(d, at), load(e, at), load(f, at), load(g, at), load(h, at)
                ];
                let mut place = bits.iter_mut();
                for _ in 0..PASSES {
                    for round in rounds {
                        macro_rules! k {
                            ($i:literal) => {
                                load(&round[$i], at)
                            };
                            (count $i:literal) => {
                                count::<$i>(&round[8])
                            };
                            ($widened:ident $i:literal) => {
                                $widened(&round[$i], at)
                            };
                        }
                        let last = crate::integer_round!(x, x, k);
                        if let Some(word) = place.next() {
                            signs(last, word, at);
                        }
                    }
                }
                for (line, block) in blocks.iter_mut().zip(x) {
                    store(line, at, block);
                }
            }
        }

        #[cfg(target_arch = $arch)]
        fn $run(rounds: &[Round], blocks: &mut [Line; BLOCKS], bits: &mut Signs) {
            // SAFETY: chosen only in `prepare`, for a `Proof` of this variant, which `isa` makes only when all of the
            // build's features are present (sse2 and neon are in their targets' baseline)
            unsafe { $name(rounds, blocks, bits) }
        }
    };
}

wrapped!(portable run_portable sse2 "sse2", "x86_64");
wrapped!(avx2 run_avx2 avx2 "avx2", "x86_64");
wrapped!(avx512 run_avx512 avx512 "avx2,avx512f,avx512bw,avx512dq,avx512vl", "x86_64");
wrapped!(neon run_neon neon "neon", "aarch64");
