//! `vector.dot8`: dot products of unsigned and signed bytes, added up in 32-bit lanes.
//!
//! Sixteen lanes, each on its own, of twelve numbers x₀ … x₁₁. A step adds to one of them, modulo 2³², the products of
//! four unsigned and four signed bytes: of another number and an operand, of an operand and another number, of two
//! numbers, or of two operands ([`dot8_round!`](crate::dot8_round) is the exact statement). Each step is a bijection of
//! the number that takes the products in, so what went wrong stays there, and with the next steps goes into the others.
//! There is nothing but dot products: no instruction of another kind takes their place in the units.
//!
//! # Reading a mismatch
//! Word w of the output holds the lanes 2·(w mod 8) and 2·(w mod 8) + 1, low half first, of x with the number w div 8.
//! Lanes never mix, so the wrong halves name the lanes. Hardware that is 256 bits wide takes a 512-bit vector in two
//! goes: lane l and lane l + 8 pass through the same eighth of it, so fold lanes modulo 8 before counting them (modulo 4
//! for 128 bits). In a published case, which is a test here, lanes 3 and 11 of one instruction were wrong, both by
//! −1020, with XORs that had nothing in common: it is the difference that tells a lost partial product.
//!
//! Operands, in stream order: x₀ … x₁₁ (8 words each, word i holds lanes 2i and 2i + 1), then for each of 16 rounds 24
//! lines of 8 words in the same order. The rounds are gone through 16 times. Output: x₀ … x₁₁.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;
use crate::vectors::Line;

const NUMBERS: usize = 12;
const LINES: usize = 24;
const ROUNDS: usize = 16;
const PASSES: usize = 16;
/// Dot products of one lane in a round.
const STEPS: usize = 4 * NUMBERS;

type Round = [Line; LINES];

/// See the file's head.
pub struct Dot8;

impl Kernel for Dot8 {
    fn id(&self) -> &'static str {
        "vector.dot8"
    }

    fn summary(&self) -> &'static str {
        "dot products of unsigned and signed bytes, accumulated in 32-bit lanes"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(25)]
    }

    fn output_words(&self, _size: Size) -> usize {
        8 * NUMBERS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (64 * STEPS * ROUNDS * PASSES) as u64, unit: "byte product" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &["pmaddwd", "paddd", "psraw", "psrlw", "psllw", "pand", "punpcklbw", "punpckhbw", "shufps"],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &[
                        "vpmaddwd",
                        "vpmovzxbw",
                        "vpmovsxbw",
                        "vphaddd",
                        "vpermq",
                        "vpaddd",
                        "vpsraw",
                        "vpsrlw",
                        "vpsllw",
                        "vpand",
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
                        Feature::Avx512vnni,
                    ],
                    marks: &["vpdpbusd"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            &[Build {
                variant: Variant::Neon,
                needs: &[Feature::Neon, Feature::ArmDotprod],
                marks: &["udot", "sdot"],
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
        let start = std::array::from_fn(|_| line());
        let rounds = (0..ROUNDS).map(|_| std::array::from_fn(|_| line())).collect();
        operands.finish(8 * (NUMBERS + LINES * ROUNDS));
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
        Roles::One(Box::new(Lanes { start, rounds, run }))
    }
}

struct Lanes {
    start: [Line; NUMBERS],
    rounds: Vec<Round>,
    run: fn(&[Round], &mut [Line; NUMBERS]),
}

impl Ready for Lanes {
    fn run(&mut self, out: &mut [u64]) {
        let mut numbers = self.start;
        (self.run)(&self.rounds, &mut numbers);
        for (place, line) in out.as_chunks_mut::<8>().0.iter_mut().zip(numbers) {
            *place = line.to_words();
        }
    }
}

macro_rules! wrapped {
    ($name:ident $run:ident $once:ident $module:ident $features:literal, $arch:literal) => {
        #[cfg(target_arch = $arch)]
        #[inline(never)]
        #[target_feature(enable = $features)]
        fn $name(rounds: &[Round], numbers: &mut [Line; NUMBERS]) {
            use crate::vectors::{$module::*, dot8::$module::*};
            for at in (0..64).step_by(WIDTH) {
                // known here, so that no load has to check it
                assert!(at <= 64 - WIDTH);
                let [a, b, c, d, e, f, g, h, i, j, k, l] = &*numbers;
                let mut x = [
                    load(a, at), load(b, at), load(c, at), load(d, at), load(e, at), load(f, at), load(g, at),
                    load(h, at), load(i, at), load(j, at), load(k, at), load(l, at),
                ];
                for _ in 0..PASSES {
                    for round in rounds {
                        macro_rules! k {
                            ($i:literal) => {
                                load(&round[$i], at)
                            };
                        }
                        macro_rules! both {
                            ($a:expr, $u:literal, $s:literal) => {
                                dot8_lines($a, &round[$u], &round[$s], at)
                            };
                        }
                        crate::dot8_round!(x, x, k, both);
                    }
                }
                for (line, number) in numbers.iter_mut().zip(x) {
                    store(line, at, number);
                }
            }
        }

        #[cfg(target_arch = $arch)]
        fn $run(rounds: &[Round], numbers: &mut [Line; NUMBERS]) {
            // SAFETY: chosen only in `prepare`, for a `Proof` of this variant, which `isa` makes only when all of the
            // build's features are present (sse2 and neon are in their targets' baseline)
            unsafe { $name(rounds, numbers) }
        }

        /// One dot product of whole lines, from registers and from memory.
        #[cfg(all(test, target_arch = $arch))]
        #[target_feature(enable = $features)]
        fn $once(start: &Line, u: &Line, s: &Line) -> [Line; 2] {
            use crate::vectors::{$module::*, dot8::$module::*};
            let mut out = [*start; 2];
            for at in (0..64).step_by(WIDTH) {
                store(&mut out[0], at, dot8(load(start, at), load(u, at), load(s, at)));
                store(&mut out[1], at, dot8_lines(load(start, at), u, s, at));
            }
            out
        }
    };
}

wrapped!(portable run_portable once_portable sse2 "sse2", "x86_64");
wrapped!(avx2 run_avx2 once_avx2 avx2 "avx2", "x86_64");
wrapped!(avx512 run_avx512 once_avx512 avx512 "avx2,avx512f,avx512bw,avx512dq,avx512vl", "x86_64");
wrapped!(neon run_neon once_neon neon "neon,dotprod", "aarch64");

#[cfg(test)]
mod tests {
    use super::*;
    use crate::isa;

    type Once = Box<dyn Fn(&Line, &Line, &Line) -> [Line; 2]>;

    /// Every build that can run here.
    fn available() -> Vec<(Variant, Once)> {
        let once = |variant| -> Once {
            match variant {
                // SAFETY: called only for variants that `isa` has proven
                #[cfg(target_arch = "x86_64")]
                Variant::Portable => Box::new(|a, u, s| unsafe { once_portable(a, u, s) }),
                // SAFETY: as above
                #[cfg(target_arch = "x86_64")]
                Variant::Avx2 => Box::new(|a, u, s| unsafe { once_avx2(a, u, s) }),
                // SAFETY: as above
                #[cfg(target_arch = "x86_64")]
                Variant::Avx512 => Box::new(|a, u, s| unsafe { once_avx512(a, u, s) }),
                // SAFETY: as above
                #[cfg(target_arch = "aarch64")]
                Variant::Neon => Box::new(|a, u, s| unsafe { once_neon(a, u, s) }),
                other => panic!("{other} is none of this kernel's builds"),
            }
        };
        isa::survey(&Dot8).into_iter().filter(|(_, proof)| proof.is_ok()).map(|(v, _)| (v, once(v))).collect()
    }

    fn halves(line: Line) -> [u32; 16] {
        std::array::from_fn(|l| (line.to_words()[l / 2] >> (32 * (l % 2))) as u32)
    }

    /// The case published in a compression library's public issue thread about a CPU that multiplied wrongly: bytes of
    /// 255 times 68, 67 … 5. That CPU gave 218240 in lane 3 and 263670 in lane 11, both 1020 too little.
    #[test]
    fn published_case_of_a_bad_cpu() {
        let start = Line::from_words([
            304882548649473,
            702957297498669,
            661412078891339,
            271961624295744,
            583329573380896,
            1038265394263940,
            968171528097900,
            898077661810860,
        ]);
        let correct = [
            243447, 134736, 222019, 219260, 260737, 201427, 189078, 102591, 175254, 166927, 155930, 264690, 252450,
            240210, 227970, 215730,
        ];
        let factors = Line(std::array::from_fn(|i| 68 - i as u8));
        let all = available();
        assert!(!all.is_empty());
        for (variant, once) in all {
            for (form, line) in once(&start, &Line([255; 64]), &factors).into_iter().enumerate() {
                assert_eq!(halves(line), correct, "{variant} form {form}");
            }
        }
    }

    /// The greatest and the least products neither saturate nor overflow on the way, and sums wrap around at 32 bits.
    #[test]
    fn extremes_are_exact() {
        for (variant, once) in available() {
            for (signed, start, sum) in
                [(127u8, 0u64, 4 * 255 * 127i32), (128, 0, -4 * 255 * 128), (127, 0x7fff_ffff, i32::MIN + 129539)]
            {
                let lines = once(&Line::from_words([start | start << 32; 8]), &Line([255; 64]), &Line([signed; 64]));
                for (form, line) in lines.into_iter().enumerate() {
                    assert_eq!(halves(line), [sum as u32; 16], "{variant} form {form}");
                }
            }
        }
    }
}
