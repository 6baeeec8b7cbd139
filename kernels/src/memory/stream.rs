//! `memory.stream`: stores that go around the caches beside ordinary ones, prefetches and fences, every line read back.
//!
//! Pass p (p = 0, 1, …) writes the whole footprint upwards, lane l of line i as V_p(i) = S_l + p · E + i · D mod 2⁶⁴: each word
//! tells its line and its pass. The lines are written by turns: in even passes the even lines go around the caches and the odd
//! ones through them, in odd passes the other way, each by four different instructions in turn. So every line is written in
//! each manner over what the other manner left.
//!
//! Then everything is read back, upwards in even passes, downwards in odd ones, in which no fence stands before it: the last lines
//! written are the first to be read, out of the write buffers. Even passes have a fence between, of stores (p mod 4 = 0) or of both
//! (p mod 4 = 2); every pass ends with one of loads. The lines to be read are prefetched, pass by pass with another of the four
//! hints; those to be written through the caches are claimed, where the CPU can be asked to.
//!
//! Each pass has the digest of `common_digest`, started at R_l + p, over all lines in the order of reading.
//!
//! Operands, in stream order: R_0…R_7, S_0…S_7, D, E (lowest bits set). Output: for each pass eight words, one a lane.

use std::hint::black_box;

use super::common_digest::Digest;
use super::common_stream::{BYPASS, ORDINARY, Streams};
use crate::aligned::{self, Line};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

/// Lines of one turn of the loop: each kind of store once.
const BLOCK: usize = 8;
/// Bytes by which a line is called for before it is read or written: half of the lines have to come from memory itself.
const AHEAD: usize = 64 * 64;
/// (KiB, passes).
const SHAPES: [(u32, usize); 4] = [(24, 8), (384, 4), (4096, 2), (32_768, 2)];

fn passes(size: Size) -> usize {
    SHAPES.iter().find(|(kib, _)| *kib == size.0).expect("size is one of the kernel's").1
}

/// See the file's head.
pub struct Stream;

impl Kernel for Stream {
    fn id(&self) -> &'static str {
        "memory.stream"
    }

    fn summary(&self) -> &'static str {
        "write buffers, prefetchers, memory: stores around the caches and through them, read back"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(384), Size(24), Size(4096), Size(32_768)]
    }

    fn output_words(&self, size: Size) -> usize {
        8 * passes(size)
    }

    fn work(&self, size: Size) -> Work {
        // bytes written and read
        Work { amount: u64::from(size.0) * 1024 * 2 * passes(size) as u64, unit: "byte" }
    }

    fn builds(&self) -> &'static [Build] {
        use crate::isa::Feature;
        #[cfg(target_arch = "x86_64")]
        {
            &[
                Build {
                    variant: Variant::Portable,
                    needs: &[],
                    marks: &[
                        "movntdq",
                        "movntps",
                        "movntpd",
                        "movnti",
                        "movdqa",
                        "movaps",
                        "movapd",
                        "prefetchnta",
                        "prefetcht0",
                        "prefetcht1",
                        "prefetcht2",
                        "sfence",
                        "lfence",
                        "mfence",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &[
                        "vmovntdq",
                        "vmovntdqa",
                        "vmovntps",
                        "vmovntpd",
                        "movnti",
                        "vmovdqa",
                        "vmovaps",
                        "vmovapd",
                        "prefetchnta",
                        "prefetcht0",
                        "prefetcht1",
                        "prefetcht2",
                        "prefetchw",
                        "sfence",
                        "lfence",
                        "mfence",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx512f],
                    marks: &[
                        "vmovntdq",
                        "vmovntdqa",
                        "vmovntps",
                        "vmovntpd",
                        "movnti",
                        "vmovdqa64",
                        "prefetchw",
                        "sfence",
                    ],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["ld", "st", "dmb"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["stnp", "ldnp", "stp", "ldp", "prfm", "dmb"],
                    proven: Proven::Emulator,
                },
            ]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let passes = passes(case.size);
        let mut operands = Operands::new(case);
        let mut eight = || std::array::from_fn(|_| operands.word());
        let (starts, first) = (eight(), eight());
        let (step, pass_step) = (operands.word() | 1, operands.word() | 1);
        operands.finish(8 + 8 + 2);
        #[cfg(target_arch = "x86_64")]
        let claims = crate::isa::Feature::Prefetchw.present();
        #[cfg(not(target_arch = "x86_64"))]
        let claims = true;
        let plan = Plan { passes, starts, first, step, pass_step, claims };
        let run = runner(proof.variant_for(self.id()));
        Roles::One(Box::new(Footprint { lines: aligned::lines(case.size.0), plan, run }))
    }
}

struct Plan {
    passes: usize,
    starts: [u64; 8],
    first: [u64; 8],
    step: u64,
    pass_step: u64,
    /// Whether lines may be claimed before they are written.
    claims: bool,
}

type Runner = fn(&mut [Line], &Plan, &mut [[u64; 8]]);

struct Footprint {
    lines: Vec<Line>,
    plan: Plan,
    run: Runner,
}

impl Ready for Footprint {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&mut self.lines, &self.plan, out.as_chunks_mut::<8>().0);
    }
}

/// Writes all lines, the first one through the caches if `ODD`, around them otherwise.
#[inline(always)]
fn write<S: Streams, const ODD: bool>(s: S, blocks: &mut [[Line; BLOCK]], mut value: S::V, step: S::V, claims: bool) {
    for block in blocks {
        let base = block.as_mut_ptr().cast::<u8>();
        macro_rules! pair {
            ($pair:literal) => {
                let (around, through) =
                    if ODD { (128 * $pair + 64, 128 * $pair) } else { (128 * $pair, 128 * $pair + 64) };
                if claims {
                    // SAFETY: `Feature::Prefetchw` was found present
                    unsafe { s.claim(base.wrapping_add(through + AHEAD)) };
                }
                let next = s.add(value, step);
                let (a, b) = if ODD { (next, value) } else { (value, next) };
                // SAFETY: both are lines of the block
                unsafe {
                    s.put::<{ BYPASS + $pair }>(a, base.add(around));
                    s.put::<{ ORDINARY + $pair }>(b, base.add(through));
                }
                value = s.add(next, step);
            };
        }
        pair!(0);
        pair!(1);
        pair!(2);
        pair!(3);
    }
}

/// Reads all lines with hint `HINT`.
#[inline(always)]
fn read<S: Streams, const HINT: usize, const DOWN: bool>(
    s: S,
    blocks: &[[Line; BLOCK]],
    mut digest: Digest<S>,
) -> [u64; 8] {
    let mut one = |block: &[Line; BLOCK]| {
        let base = block.as_ptr().cast::<u8>();
        macro_rules! line {
            ($line:literal, $kind:literal) => {
                let at = if DOWN { 64 * (BLOCK - 1 - $line) } else { 64 * $line };
                let ahead = base.wrapping_add(at);
                s.call::<HINT>(if DOWN { ahead.wrapping_sub(AHEAD) } else { ahead.wrapping_add(AHEAD) });
                // SAFETY: a line of the block
                digest.push(unsafe { s.take::<$kind>(base.add(at)) });
            };
        }
        line!(0, 0);
        line!(1, 1);
        line!(2, 2);
        line!(3, 3);
        line!(4, 0);
        line!(5, 1);
        line!(6, 2);
        line!(7, 3);
    };
    if DOWN {
        blocks.iter().rev().for_each(&mut one)
    } else {
        blocks.iter().for_each(&mut one)
    }
    digest.finish()
}

#[inline(always)]
fn stream<S: Streams>(s: S, lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    let blocks = lines.as_chunks_mut::<BLOCK>().0;
    let step = s.of([plan.step; 8]);
    for (pass, out) in out[..plan.passes].iter_mut().enumerate() {
        let later = plan.pass_step.wrapping_mul(pass as u64);
        let value = s.of(plan.first.map(|v| v.wrapping_add(later)));
        let digest = Digest::new(s, plan.starts.map(|r| r.wrapping_add(pass as u64)));
        // no load may be answered from what the compiler knows was stored
        let blocks = black_box(&mut *blocks);
        if pass % 2 == 0 {
            write::<S, false>(s, blocks, value, step, plan.claims);
        } else {
            write::<S, true>(s, blocks, value, step, plan.claims);
        }
        let blocks = black_box(blocks);
        *out = match pass % 4 {
            0 => {
                s.stores();
                read::<S, 0, false>(s, blocks, digest)
            }
            1 => read::<S, 1, true>(s, blocks, digest),
            2 => {
                s.both();
                read::<S, 2, false>(s, blocks, digest)
            }
            _ => read::<S, 3, true>(s, blocks, digest),
        };
        s.loads();
    }
    // stores around the caches are ordered by nothing else, should the next user of the memory be another core
    s.stores();
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    stream(super::common_stream_x86::Sse2, lines, plan, out);
}

#[cfg(not(target_arch = "x86_64"))]
#[inline(never)]
fn portable(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    stream(super::common_lanes::Words, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2")]
fn avx2(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx2
    stream(unsafe { super::common_lanes_x86::Avx2::new() }, lines, plan, out);
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx512f")]
fn avx512(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    // SAFETY: this function is compiled for, and its callers proved, avx512f
    stream(unsafe { super::common_lanes_x86::Avx512::new() }, lines, plan, out);
}

#[cfg(target_arch = "aarch64")]
#[inline(never)]
fn neon(lines: &mut [Line], plan: &Plan, out: &mut [[u64; 8]]) {
    stream(super::common_lanes_arm::Neon, lines, plan, out);
}

/// The runner of a variant whose features a `Proof` has shown.
fn runner(variant: Variant) -> Runner {
    match variant {
        // SAFETY: chosen for a `Proof` of this variant, which `isa` makes only when its build's features are present
        #[cfg(target_arch = "x86_64")]
        Variant::Avx2 => |lines, plan, out| unsafe { avx2(lines, plan, out) },
        // SAFETY: as above
        #[cfg(target_arch = "x86_64")]
        Variant::Avx512 => |lines, plan, out| unsafe { avx512(lines, plan, out) },
        #[cfg(target_arch = "aarch64")]
        Variant::Neon => neon,
        _ => portable,
    }
}
