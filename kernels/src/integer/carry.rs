//! `integer.carry`: additions and subtractions of 1,024-bit numbers with carries that run far.
//!
//! Two pairs (P, Q) of numbers of 16 limbs, each pair with one carry bit c. Every operation reads c as carry or borrow,
//! sets it to the carry or borrow out, and stores its limb j at place (j + 5) mod 16. With the masks M and N and the
//! operands B and C of the step:
//! 1. T ← Q + ¬(Q ⊕ M): wherever M has a 0, exactly one of the two addends has a 1 and a carry runs on; where M has a 1
//!    the bit of Q generates or kills one. M has one to sixteen ones, so carries run over hundreds of bits.
//! 2. P ← P − T; 3. U ← (P ⊕ N) − P: the same for borrows; 4. P ← P + B; 5. Q ← Q + U; 6. Q ← Q − C.
//!
//! P and Q are only ever added to or subtracted from: each update is a bijection (a Feistel network), so that a wrong
//! limb or a lost carry stays. The limbs' rotation keeps equal errors of one limb from meeting again.
//!
//! A run takes the steps' operands in order, four times over.
//!
//! Operands, in stream order: P and Q of the first pair, of the second pair, 16 limbs each; then for each of 48 steps
//! four words for M, four for N, 16 limbs for B, 16 for C. A mask of words v₀ … v₃ has ones at 1 + (v₀ mod 16) places,
//! the k-th being the 10-bit field k mod 6 (from the lowest bit) of word v at 1 + k div 6; places may
//! coincide. Output: the four numbers,
//! then one word with the first pair's carry in bit 0 and the second's in bit 1.

use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const LIMBS: usize = 16;
const STEPS: usize = 48;
/// How often a run goes through the operands; keeps the output's comparison a small part of it.
const PASSES: usize = 4;
const OPERATIONS: usize = 6;
/// How many places on a result's limbs are stored.
const TURN: usize = 5;

type Number = [u64; LIMBS];
/// One number of each pair.
type Both = [Number; 2];

/// See the file's head.
pub struct Carry;

impl Kernel for Carry {
    fn id(&self) -> &'static str {
        "integer.carry"
    }

    fn summary(&self) -> &'static str {
        "adder: 1024-bit additions and subtractions whose carries run over hundreds of bits"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(25)]
    }

    fn output_words(&self, _size: Size) -> usize {
        4 * LIMBS + 1
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (PASSES * STEPS * OPERATIONS * 2 * LIMBS) as u64, unit: "limb" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["adc", "sbb"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2, Feature::Adx],
                    marks: &["adcx", "adox", "sbb"],
                    proven: Proven::Hardware,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["adcs"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let mut number = || std::array::from_fn(|_| operands.word());
        let start = [number(), number(), number(), number()];
        let steps = (0..STEPS).map(|_| Step::draw(&mut operands)).collect();
        operands.finish(4 * LIMBS + STEPS * (8 + 2 * LIMBS));
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            _ => portable,
        };
        Roles::One(Box::new(Numbers { start, steps, run }))
    }
}

struct Step {
    carries: Number,
    borrows: Number,
    add: Number,
    subtract: Number,
}

impl Step {
    fn draw(operands: &mut Operands) -> Step {
        let mut mask = || {
            let v: [u64; 4] = std::array::from_fn(|_| operands.word());
            let mut number = [0; LIMBS];
            for k in 0..=(v[0] as usize & 15) {
                let place = (v[1 + k / 6] >> (10 * (k % 6))) as usize & 1023;
                number[place / 64] |= 1 << (place % 64);
            }
            number
        };
        let (carries, borrows) = (mask(), mask());
        let mut number = || std::array::from_fn(|_| operands.word());
        Step { carries, borrows, add: number(), subtract: number() }
    }
}

struct Numbers {
    start: [Number; 4],
    steps: Vec<Step>,
    run: fn(&[Step], &[Number; 4], &mut [u64]),
}

impl Ready for Numbers {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.steps, &self.start, out);
    }
}

/// Additions and subtractions of one number of each pair: `out` gets the sum's limb j at place j + [`TURN`].
trait Adder {
    fn add(x: &Both, y: &Both, out: &mut Both, carry: &mut [bool; 2]);
    fn subtract(x: &Both, y: &Both, out: &mut Both, borrow: &mut [bool; 2]);
}

#[inline(always)]
fn body<A: Adder>(steps: &[Step], start: &[Number; 4], out: &mut [u64]) {
    let mut p = [start[0], start[2]];
    let mut q = [start[1], start[3]];
    let mut carry = [false; 2];
    let (mut other, mut t, mut made) = ([[0; LIMBS]; 2], [[0; LIMBS]; 2], [[0; LIMBS]; 2]);
    for step in (0..PASSES).flat_map(|_| steps) {
        for (made, q) in made.iter_mut().zip(&q) {
            *made = std::array::from_fn(|j| !(q[j] ^ step.carries[j]));
        }
        A::add(&q, &made, &mut t, &mut carry);
        A::subtract(&p, &t, &mut other, &mut carry);
        for (made, p) in made.iter_mut().zip(&other) {
            *made = std::array::from_fn(|j| p[j] ^ step.borrows[j]);
        }
        A::subtract(&made, &other, &mut t, &mut carry);
        A::add(&other, &[step.add; 2], &mut p, &mut carry);
        A::add(&q, &t, &mut other, &mut carry);
        A::subtract(&other, &[step.subtract; 2], &mut q, &mut carry);
    }
    for (place, number) in out.chunks_exact_mut(LIMBS).zip([&p[0], &q[0], &p[1], &q[1]]) {
        place.copy_from_slice(number);
    }
    out[4 * LIMBS] = u64::from(carry[0]) | u64::from(carry[1]) << 1;
}

/// One limb after another through the language's own carrying operations, which compile to the flag instructions.
struct ByLimb;

impl Adder for ByLimb {
    #[inline(always)]
    fn add(x: &Both, y: &Both, out: &mut Both, carry: &mut [bool; 2]) {
        for i in 0..2 {
            for j in 0..LIMBS {
                (out[i][(j + TURN) % LIMBS], carry[i]) = x[i][j].carrying_add(y[i][j], carry[i]);
            }
        }
    }

    #[inline(always)]
    fn subtract(x: &Both, y: &Both, out: &mut Both, borrow: &mut [bool; 2]) {
        for i in 0..2 {
            for j in 0..LIMBS {
                (out[i][(j + TURN) % LIMBS], borrow[i]) = x[i][j].borrowing_sub(y[i][j], borrow[i]);
            }
        }
    }
}

#[inline(never)]
fn portable(steps: &[Step], start: &[Number; 4], out: &mut [u64]) {
    body::<ByLimb>(steps, start, out);
}

/// The two pairs' additions interleaved, one carry in the carry flag and one in the overflow flag.
#[cfg(target_arch = "x86_64")]
struct TwoFlags;

#[cfg(target_arch = "x86_64")]
macro_rules! limbs {
    ($($from:literal => $to:literal),*) => {
        concat!($(
            "mov {s}, qword ptr [{x} + ", $from, "]\n",
            "adcx {s}, qword ptr [{y} + ", $from, "]\n",
            "mov qword ptr [{out} + ", $to, "], {s}\n",
            "mov {t}, qword ptr [{x} + 128 + ", $from, "]\n",
            "adox {t}, qword ptr [{y} + 128 + ", $from, "]\n",
            "mov qword ptr [{out} + 128 + ", $to, "], {t}\n",
        )*)
    };
}

#[cfg(target_arch = "x86_64")]
impl Adder for TwoFlags {
    #[inline(always)]
    fn add(x: &Both, y: &Both, out: &mut Both, carry: &mut [bool; 2]) {
        let (mut first, mut second) = (u64::from(carry[0]), u64::from(carry[1]));
        // SAFETY: implementor of a private trait used by `avx2` alone, for which adx was proven; reads the 256 bytes of
        // each of x and y and writes the 256 bytes of `out`, which the types say are there; no stack, no other memory
        unsafe {
            std::arch::asm!(
                // 0x7f + second overflows an i8 for a 1 and clears the carry flag; all ones + first carries for a 1
                "add {second:l}, 0x7f",
                "mov {s}, -1",
                "adcx {first}, {s}",
                limbs!(
                    0 => 40, 8 => 48, 16 => 56, 24 => 64, 32 => 72, 40 => 80, 48 => 88, 56 => 96,
                    64 => 104, 72 => 112, 80 => 120, 88 => 0, 96 => 8, 104 => 16, 112 => 24, 120 => 32
                ),
                "setc {first:l}",
                "seto {second:l}",
                x = in(reg) x, y = in(reg) y, out = in(reg) out,
                first = inout(reg) first, second = inout(reg) second,
                s = out(reg) _, t = out(reg) _,
                options(nostack),
            );
        }
        // the instructions above set the low byte only, to 0 or 1
        *carry = [first as u8 != 0, second as u8 != 0];
    }

    #[inline(always)]
    fn subtract(x: &Both, y: &Both, out: &mut Both, borrow: &mut [bool; 2]) {
        ByLimb::subtract(x, y, out, borrow);
    }
}

#[cfg(target_arch = "x86_64")]
#[inline(never)]
#[target_feature(enable = "avx2,adx")]
fn avx2(steps: &[Step], start: &[Number; 4], out: &mut [u64]) {
    body::<TwoFlags>(steps, start, out);
}

#[cfg(target_arch = "x86_64")]
fn run_avx2(steps: &[Step], start: &[Number; 4], out: &mut [u64]) {
    // SAFETY: chosen only in `prepare`, for a `Proof` of `Avx2`, which `isa` makes only when avx2 and adx are present
    unsafe { avx2(steps, start, out) }
}
