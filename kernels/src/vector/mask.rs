//! `vector.mask`: masks made by comparisons, combined, and used to blend, to load and to store.
//!
//! Four nets, each of eight blocks of 16 bytes. A round ([`mask_round!`](crate::mask_round) is the exact statement) adds,
//! subtracts or xors the results of the operations of [`crate::vectors::mask`] to the blocks, in groups of two; each
//! group takes in functions of operands and of the two groups whose turn is the longest ago. So every update is a
//! bijection of the block that it changes: an element chosen wrongly, a comparison's wrong bit stays, and spreads. Blocks
//! are compared as floats by all sixteen predicates, as the random bits that they are: denormals, infinities and NaNs
//! come with their share, and as the results are masks, no NaN comes out. For equality, a blend is compared with one of
//! the two that it was made of. Under masks, elements are loaded from the operands, and stored over blocks in four
//! places of memory (zero at the start), which are read back a round later, and after the last one (place j is added to
//! block 2j in 64-bit words). Once a round the signs of one vector's bytes, of the elements of two blocks, and the flags of
//! tests against sparse masks go into two words, 16 bits a net each; the words are digested as h ← rotl(h, 29)·c + word,
//! a bijection in both.
//!
//! # Reading a mismatch
//! A word of the output is word (i mod 2) of net (i div 2 mod 4) of block i div 8. Nets never mix: where only one net is
//! wrong, the lane of 16 bytes is known: nets 0 to 3 are bytes 0–15, 16–31, 32–47, 48–63 of a 512-bit register, and
//! alternately the low and the high half of a 256-bit one. Where the blocks are right and the digest is wrong, a move
//! from vector to general register or a test was.
//!
//! Operands, in stream order: the blocks (8 × 8 words, word by word as in the output); then for each of 32 rounds eight
//! lines of 8 words (word i belongs to net i div 2). The rounds are gone through three times. Output: the blocks, then
//! the digest.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;
use crate::vectors::Line;

const NETS: usize = 4;
const BLOCKS: usize = 8;
const ROUNDS: usize = 32;
const PASSES: usize = 3;
/// Operations in [`mask_round!`](crate::mask_round) and after it, with their accumulation.
const OPERATIONS: usize = 152;

type Round = [Line; 8];
/// For each round, the signs of bytes and the other bits.
type Bits = [[[u8; 8]; 2]; PASSES * ROUNDS];

#[cfg(target_arch = "x86_64")]
#[rustfmt::skip] // one a line would be longer than all the rest
const PORTABLE_MARKS: &[&str] = &[
    "andps", "orps", "xorps", "andnps", "andpd", "orpd", "xorpd", "andnpd", "cmpeqps", "cmpltps", "cmpleps",
    "cmpunordps", "cmpneqps", "cmpnltps", "cmpnleps", "cmpordps", "cmpeqpd", "cmpltpd", "cmplepd", "cmpunordpd",
    "cmpneqpd", "cmpnltpd", "cmpnlepd", "cmpordpd", "pcmpgtb", "psraw", "psrad", "pshufd", "pand", "pandn", "por",
    "pxor", "pmovmskb", "movmskps", "movmskpd", "pcmpeqb", "paddb", "psubq",
];

#[cfg(target_arch = "x86_64")]
#[rustfmt::skip] // one a line would be longer than all the rest
const AVX2_MARKS: &[&str] = &[
    "vandps", "vorps", "vxorps", "vandnps", "vandpd", "vorpd", "vxorpd", "vandnpd", "vcmpeqps", "vcmpltps", "vcmpleps",
    "vcmpunordps", "vcmpneqps", "vcmpnltps", "vcmpnleps", "vcmpordps", "vcmpeq_uqps", "vcmpngeps", "vcmpngtps",
    "vcmpfalseps", "vcmpneq_oqps", "vcmpgeps", "vcmpgtps", "vcmptrueps", "vcmpeq_ospd", "vcmplt_oqpd", "vcmple_oqpd",
    "vcmpunord_spd", "vcmpneq_uspd", "vcmpnlt_uqpd", "vcmpnle_uqpd", "vcmpord_spd", "vcmpeq_uspd", "vcmpnge_uqpd",
    "vcmpngt_uqpd", "vcmpfalse_ospd", "vcmpneq_ospd", "vcmpge_oqpd", "vcmpgt_oqpd", "vcmptrue_uspd", "vpblendvb",
    "vblendvps", "vblendvpd", "vpmaskmovd", "vmaskmovps", "vpmaskmovq", "vmaskmovpd", "vpmovmskb", "vmovmskps",
    "vmovmskpd", "vptest", "vtestps", "vtestpd", "sete", "setb", "vpand", "vpandn", "vpxor", "vpor", "vpsraw",
];

#[cfg(target_arch = "x86_64")]
#[rustfmt::skip] // one a line would be longer than all the rest
const AVX512_MARKS: &[&str] = &[
    "vandps", "vorps", "vxorps", "vandnps", "vandpd", "vorpd", "vxorpd", "vandnpd", "vcmpeqps", "vcmpltps", "vcmpleps",
    "vcmpunordps", "vcmpneqps", "vcmpnltps", "vcmpnleps", "vcmpordps", "vcmpeq_uqps", "vcmpngeps", "vcmpngtps",
    "vcmpfalseps", "vcmpneq_oqps", "vcmpgeps", "vcmpgtps", "vcmptrueps", "vcmpeq_ospd", "vcmplt_oqpd", "vcmple_oqpd",
    "vcmpunord_spd", "vcmpneq_uspd", "vcmpnlt_uqpd", "vcmpnle_uqpd", "vcmpord_spd", "vcmpeq_uspd", "vcmpnge_uqpd",
    "vcmpngt_uqpd", "vcmpfalse_ospd", "vcmpneq_ospd", "vcmpge_oqpd", "vcmpgt_oqpd", "vcmptrue_uspd", "vpmovm2d",
    "vpmovm2q", "vpmovb2m", "vpmovw2m", "vpmovd2m", "vpmovq2m", "kandq", "kxorq", "kxnorq", "kord", "kxord", "kandnw",
    "korw", "kmovw", "kmovb", "vpblendmb", "vpblendmw", "vpblendmd", "vblendmps", "vblendmpd", "vmovdqu32",
    "vmovdqu64", "vmovups", "vmovupd", "vptest", "vtestps", "vtestpd",
];

/// See the file's head.
pub struct Mask;

impl Kernel for Mask {
    fn id(&self) -> &'static str {
        "vector.mask"
    }

    fn summary(&self) -> &'static str {
        "vector masks: float comparisons, blends, masked loads and stores, tests"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(17)]
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
                Build { variant: Variant::Portable, needs: &[], marks: PORTABLE_MARKS, proven: Proven::Hardware },
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
                marks: &["fcmeq", "fcmgt", "fcmge", "cmlt", "cmge", "cmtst", "bit", "bif", "bic", "orn", "umaxv"],
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
        let rounds = (0..ROUNDS).map(|_| std::array::from_fn(|_| line())).collect();
        operands.finish(8 * BLOCKS + 8 * 8 * ROUNDS);
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

struct Nets {
    blocks: [Line; BLOCKS],
    rounds: Vec<Round>,
    run: fn(&[Round], &mut [Line; BLOCKS], &mut Bits),
}

impl Ready for Nets {
    fn run(&mut self, out: &mut [u64]) {
        let (mut blocks, mut bits) = (self.blocks, [[[0; 8]; 2]; PASSES * ROUNDS]);
        (self.run)(&self.rounds, &mut blocks, &mut bits);
        let (digest, words) = out.split_last_mut().expect("the output has 65 words");
        for (place, line) in words.as_chunks_mut::<8>().0.iter_mut().zip(blocks) {
            *place = line.to_words();
        }
        *digest = bits.as_flattened().iter().fold(0, |h: u64, word| {
            h.rotate_left(29).wrapping_mul(0x9e37_79b9_7f4a_7c15).wrapping_add(u64::from_le_bytes(*word))
        });
    }
}

macro_rules! wrapped {
    ($name:ident $run:ident $module:ident $features:literal, $arch:literal) => {
        #[cfg(target_arch = $arch)]
        #[inline(never)]
        #[target_feature(enable = $features)]
        fn $name(rounds: &[Round], blocks: &mut [Line; BLOCKS], bits: &mut Bits) {
            use crate::vectors::{$module::*, mask::$module::*};
            for at in (0..64).step_by(WIDTH) {
                // known here, so that no load has to check it
                assert!(at <= 64 - WIDTH);
                let [a, b, c, d, e, f, g, h] = &*blocks;
                let mut x = [
                    load(a, at), load(b, at), load(c, at), load(d, at), load(e, at), load(f, at), load(g, at), load(h, at)
                ];
                let mut place = bits.iter_mut();
                let mut memory = [Line([0; 64]); 4];
                for _ in 0..PASSES {
                    for round in rounds {
                        macro_rules! k {
                            ($i:literal) => {
                                load(&round[$i], at)
                            };
                            ($keep:ident $i:literal, $m:expr) => {
                                $keep(&round[$i], at, $m)
                            };
                            ($j:literal $put:ident, $u:expr, $m:expr, $v:expr) => {{
                                let before = load(&memory[$j], at);
                                $put($u, $m, $v, &mut memory[$j], at);
                                before
                            }};
                        }
                        crate::mask_round!(x, x, k);
                        let m = and(and(k!(0), k!(1)), and(k!(2), k!(3)));
                        let m = and(m, and(k!(4), k!(5)));
                        if let Some([first, second]) = place.next() {
                            signs(sub8(x[0], x[5]), first, at);
                            tests(x[0], x[3], m, and(k!(1), k!(6)), second, at);
                        }
                    }
                }
                for (j, line) in memory.iter().enumerate() {
                    x[2 * j] = add64(x[2 * j], load(line, at));
                }
                for (line, block) in blocks.iter_mut().zip(x) {
                    store(line, at, block);
                }
            }
        }

        #[cfg(target_arch = $arch)]
        fn $run(rounds: &[Round], blocks: &mut [Line; BLOCKS], bits: &mut Bits) {
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
