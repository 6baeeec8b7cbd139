//! `vector.permute`: bytes moved within and across lanes and registers, each byte saying where it came from.
//!
//! Four sets of 256 bytes, each as four blocks of 64. In sets 0 and 1, byte p starts as p ⊕ key; sets 2 and 3 are random.
//! A round ([`permute_round!`](crate::permute_round)) sends every set through the same two dozen moves, each of which is a
//! permutation of the bytes of one or two blocks; [`crate::vectors::permute`] says what each does and by which
//! instructions. Moves that lose data by themselves, such as broadcasts and insertions, go together so that nothing is
//! lost. So after any number of rounds each byte of a set is still there once.
//!
//! # Reading a mismatch
//! Output words are set 0 (blocks 0 to 3, eight words each), set 1, 2 and 3. In sets 0 and 1 a byte ⊕ key is the place
//! at which it started, and so is the byte that was due. Is the actual one another byte of the same element, lane or
//! half as the due one, or does it stand twice while another is missing, then a move went wrong: the XOR of both is the
//! XOR of the two places, whose bits 0 and 1 are the byte within an element, bits 2 and 3 the element within the lane,
//! bits 4 and 5 the lane, bits 6 and 7 the block. If one bit differs, and no byte of the set is missing but the due one
//! and none is twice but the actual one, look at sets 2 and 3: a wrong move shows there at the same place with an XOR of
//! many bits; data corrupted on the way shows with the same few bits.
//!
//! Operands, in stream order: two keys (the low byte of a word, one a set); 32 words each for sets 2 and 3; then for each
//! of 16 rounds four orders of a block's 16 elements, each from the 16 bytes of two words: start with 0 … 15, for
//! i = 15 … 1 swap places i and (byte i mod (i + 1)). The rounds are gone through twelve times.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;
use crate::vectors::{Line, permute::Order};

const SETS: usize = 4;
const ROUNDS: usize = 16;
const PASSES: usize = 12;
/// Blocks moved in one round of one set.
const MOVES: usize = 16 + 2 * 10;

type Set = [Line; 4];
type Round = [Order; 4];

/// See the file's head.
pub struct Permute;

impl Kernel for Permute {
    fn id(&self) -> &'static str {
        "vector.permute"
    }

    fn summary(&self) -> &'static str {
        "permutes, blends, inserts and broadcasts across vector lanes, on bytes that say where they came from"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(9)]
    }

    fn output_words(&self, _size: Size) -> usize {
        32 * SETS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (SETS * PASSES * ROUNDS * MOVES) as u64, unit: "block move" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &[
                        "pshufd",
                        "pshuflw",
                        "pshufhw",
                        "shufps",
                        "shufpd",
                        "unpcklps",
                        "unpckhps",
                        "unpcklpd",
                        "unpckhpd",
                        "movhlps",
                        "movlhps",
                        "movss",
                        "movsd",
                        "pinsrw",
                        "pextrw",
                        "punpckldq",
                        "punpckhdq",
                        "psrldq",
                        "pslldq",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &[
                        "vpermd",
                        "vpermps",
                        "vpermq",
                        "vpermpd",
                        "vperm2i128",
                        "vperm2f128",
                        "vinserti128",
                        "vinsertf128",
                        "vextracti128",
                        "vextractf128",
                        "vbroadcastsd",
                        "vinsertps",
                        "vblendps",
                        "vblendpd",
                        "vpblendd",
                        "vpblendw",
                        "vblendvps",
                        "vpblendvb",
                        "vpalignr",
                        "vpermilps",
                        "vmovshdup",
                        "vmovsldup",
                        "vmovddup",
                        "vpshuflw",
                        "vpshufhw",
                        "vshufps",
                        "vshufpd",
                        "vunpcklps",
                        "vunpckhps",
                        "vunpcklpd",
                        "vunpckhpd",
                        "vpunpckldq",
                        "vpunpckhdq",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[
                        Feature::Avx2,
                        Feature::Avx512f,
                        Feature::Avx512bw,
                        Feature::Avx512dq,
                        Feature::Avx512vl,
                        Feature::Avx512vbmi,
                    ],
                    marks: &[
                        "vpermd",
                        "vpermps",
                        "vpermb",
                        "vpermi2d",
                        "vpermi2q",
                        "vpermt2q",
                        "vpermq",
                        "vpermpd",
                        "vpermilps",
                        "vpermilpd",
                        "vshuff32x4",
                        "vshuff64x2",
                        "vshufi32x4",
                        "vshufi64x2",
                        "valignd",
                        "vpalignr",
                        "vpblendmd",
                        "vpblendmq",
                        "vpblendmw",
                        "vblendmps",
                        "vblendmpd",
                        "vmovshdup",
                        "vmovsldup",
                        "vmovddup",
                        "vpshuflw",
                        "vpshufhw",
                        "vshufps",
                        "vshufpd",
                        "vunpcklps",
                        "vunpckhps",
                        "vunpcklpd",
                        "vunpckhpd",
                        "kmovq",
                    ],
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
                marks: &["tbl", "ext", "zip1", "zip2", "uzp1", "uzp2", "trn1", "trn2", "rev64", "mov"],
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
        let keys: [u8; 2] = std::array::from_fn(|_| operands.word() as u8);
        let [first, second] =
            keys.map(|key| -> Set { std::array::from_fn(|k| Line(std::array::from_fn(|b| (64 * k + b) as u8 ^ key))) });
        let mut random =
            || -> Set { std::array::from_fn(|_| Line::from_words(std::array::from_fn(|_| operands.word()))) };
        let sets = [first, second, random(), random()];
        let mut order = || {
            let mut bytes = [0; 16];
            bytes[..8].copy_from_slice(&operands.word().to_le_bytes());
            bytes[8..].copy_from_slice(&operands.word().to_le_bytes());
            Order::new(shuffled(bytes))
        };
        let rounds = (0..ROUNDS).map(|_| std::array::from_fn(|_| order())).collect();
        operands.finish(2 + 2 * 32 + ROUNDS * 4 * 2);
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
        Roles::One(Box::new(Sets { sets, rounds, run }))
    }
}

/// Numbers 0 … 15 in an order made from random bytes (R. Durstenfeld, CACM 7 (1964), algorithm 235).
fn shuffled(random: [u8; 16]) -> [u8; 16] {
    let mut places = std::array::from_fn(|i| i as u8);
    for i in (1..16).rev() {
        places.swap(i, usize::from(random[i]) % (i + 1));
    }
    places
}

struct Sets {
    sets: [Set; SETS],
    rounds: Vec<Round>,
    run: fn(&[Round], &mut [Set; SETS]),
}

impl Ready for Sets {
    fn run(&mut self, out: &mut [u64]) {
        let mut sets = self.sets;
        (self.run)(&self.rounds, &mut sets);
        for (place, line) in out.as_chunks_mut::<8>().0.iter_mut().zip(sets.as_flattened()) {
            *place = line.to_words();
        }
    }
}

macro_rules! wrapped {
    ($name:ident $run:ident $module:ident $features:literal, $arch:literal) => {
        #[cfg(target_arch = $arch)]
        #[inline(never)]
        #[target_feature(enable = $features)]
        fn $name(rounds: &[Round], sets: &mut [Set; SETS]) {
            use crate::vectors::permute::$module::*;
            for set in sets {
                let mut p = [load(&set[0]), load(&set[1]), load(&set[2]), load(&set[3])];
                for _ in 0..PASSES {
                    for round in rounds {
                        crate::permute_round!(p, round);
                    }
                }
                for (line, block) in set.iter_mut().zip(p) {
                    store(line, block);
                }
            }
        }

        #[cfg(target_arch = $arch)]
        fn $run(rounds: &[Round], sets: &mut [Set; SETS]) {
            // SAFETY: chosen only in `prepare`, for a `Proof` of this variant, which `isa` makes only when all of the
            // build's features are present (sse2 and neon are in their targets' baseline)
            unsafe { $name(rounds, sets) }
        }
    };
}

wrapped!(portable run_portable sse2 "sse2", "x86_64");
wrapped!(avx2 run_avx2 avx2 "avx2", "x86_64");
wrapped!(avx512 run_avx512 avx512 "avx2,avx512f,avx512bw,avx512dq,avx512vl", "x86_64");
wrapped!(neon run_neon neon "neon", "aarch64");
