//! `vector.gather`: indexed loads, where every element says where it lies.
//!
//! The table has n = 2ᵏ words, seen as 2n elements of 32 bits, of which the j-th holds j + key mod 2¹⁶ in its low half
//! and random bits in its high half. For each of 128 vectors of 16 indices, four times over with another turn t:
//! - a ← a + elements\[(i ⊕ t) mod 2n\], 16 lanes of 32 bits (`vpgatherdd`);
//! - b ← b + words\[(i ⊕ t) mod n\] for the first eight indices, 8 lanes of 64 bits (`vpgatherdq`);
//! - c ← c + words\[(i ⊕ t) mod n\] for the other eight, widened to 64 bits (`vpgatherqq`);
//! - d ← rotl(d, 7) + elements\[d mod 2n\], 16 lanes (`vpgatherdd`), and e ← rotl(e, 13) + words\[e mod n\], 8 lanes
//!   (`vpgatherqq`): each index comes from all that was read before, so the loads wait for one another and an error
//!   leads the lane astray for good.
//!
//! # Reading a mismatch
//! Output words are a (16, zero-extended), b (8), c (8), d (16, zero-extended), e (8). In words 0 to 31 a wrong load
//! shows alone: `difference`, actual less expected (mod 2³² in a), is element read less element due. Its low 16 bits,
//! taken as signed, are the distance from the right place in units of four bytes: times 4 the wrong offset in bytes.
//! Where the high bits fit too, that is where element\[j + distance\] − element\[j\] is the difference for some j, a
//! wrong place was read; in b and c, with 32 random bits, no more than one j does so but for coincidence, in a, with 16,
//! few do. A difference that fits nowhere, a distance outside the table (2n or more) and an odd one in b or c (whole
//! words are two units apart) speak for corrupted data or a misaligned load. Two lanes with opposite differences have
//! exchanged their elements. Words 32 to 55 tell that something was wrong, no longer what.
//!
//! Operands, in stream order: key (low 16 bits of a word); four turns (low 32 bits); starts of d (8 words, low half
//! first) and e (8); the indices (1,024 words, low half first); the table's n words, to be tagged. n follows from the
//! size: 16 KiB or 256 KiB of table, 8 KiB of indices, and the rest below 1 KiB.

use super::common_gather::{Lanes, OneByOne};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const VECTORS: usize = 128;
const PASSES: usize = 4;
/// Elements loaded for one vector of indices.
const LOADS: usize = 16 + 8 + 8 + 16 + 8;
/// KiB of a case's size that are not the table.
const BESIDES: u32 = 9;

/// See the file's head.
pub struct Gather;

impl Kernel for Gather {
    fn id(&self) -> &'static str {
        "vector.gather"
    }

    fn summary(&self) -> &'static str {
        "indexed vector loads from a table whose elements say where they lie"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(16 + BESIDES), Size(256 + BESIDES)]
    }

    fn output_words(&self, _size: Size) -> usize {
        LOADS
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (PASSES * VECTORS * LOADS) as u64, unit: "load" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            const GATHERS: &[&str] = &["vpgatherdd", "vpgatherdq", "vpgatherqq"];
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["mov"], proven: Proven::Hardware },
                Build { variant: Variant::Avx2, needs: &[Feature::Avx2], marks: GATHERS, proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx2, Feature::Avx512f],
                    marks: GATHERS,
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(not(target_arch = "x86_64"))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["ldr"], proven: Proven::Emulator }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let data = Data::draw(case);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            _ => portable,
        };
        Roles::One(Box::new(Loads { data, run }))
    }
}

struct Data {
    turns: [u32; PASSES],
    half: [u32; 16],
    full: [u64; 8],
    indices: Vec<[u32; 16]>,
    table: Vec<u64>,
}

/// Sixteen 32-bit halves of eight words.
fn halves(operands: &mut Operands) -> [u32; 16] {
    let words: [u64; 8] = std::array::from_fn(|_| operands.word());
    std::array::from_fn(|l| (words[l / 2] >> (32 * (l % 2))) as u32)
}

impl Data {
    fn draw(case: &Case) -> Data {
        assert!(Gather.sizes().contains(&case.size), "no size of this kernel");
        let words = 128 * (case.size.0 - BESIDES) as usize;
        let mut operands = Operands::new(case);
        let key = operands.word() as u32;
        let turns = std::array::from_fn(|_| operands.word() as u32);
        let half = halves(&mut operands);
        let full = std::array::from_fn(|_| operands.word());
        let indices = (0..VECTORS).map(|_| halves(&mut operands)).collect();
        let tag = |j: usize| u64::from((j as u32).wrapping_add(key) & 0xffff);
        let table =
            (0..words).map(|i| operands.word() & !0x0000_ffff_0000_ffff | tag(2 * i) | tag(2 * i + 1) << 32).collect();
        operands.finish(1 + PASSES + 16 + 8 * VECTORS + words);
        Data { turns, half, full, indices, table }
    }
}

struct Loads {
    data: Data,
    run: fn(&Data, &mut [u64]),
}

impl Ready for Loads {
    fn run(&mut self, out: &mut [u64]) {
        (self.run)(&self.data, out);
    }
}

/// # Safety
/// The CPU must have the features of `L`.
#[inline(always)]
unsafe fn body<L: Lanes>(data: &Data, out: &mut [u64]) {
    let table = data.table.as_slice();
    assert!(table.len().is_power_of_two() && table.len() < 1 << 30, "indices are masked and signed");
    let last = table.len() as u32 - 1;
    // SAFETY: the caller promises L's features
    let (mut a, mut b, mut c, mut d, mut e, elements, words, words_full) = unsafe {
        (
            L::load_half(&[0; 16]),
            L::load_full(&[0; 8]),
            L::load_full(&[0; 8]),
            L::load_half(&data.half),
            L::load_full(&data.full),
            L::load_half(&[2 * last + 1; 16]),
            L::load_half(&[last; 16]),
            L::load_full(&[u64::from(last); 8]),
        )
    };
    for turn in &data.turns {
        for index in &data.indices {
            // SAFETY: L's features as above; the length is a power of two, so that `i & last` is below it and
            // `i & (2 * last + 1)` is below twice of it, whatever i is
            unsafe {
                let i = L::xor_half(L::load_half(index), L::load_half(&[*turn; 16]));
                a = L::add_half(a, L::gather_half(table, L::and_half(i, elements)));
                let w = L::and_half(i, words);
                b = L::add_full(b, L::gather_mixed(table, w));
                c = L::add_full(c, L::gather_full(table, L::widen_high(w)));
                d = L::add_half(L::turn_half(d), L::gather_half(table, L::and_half(d, elements)));
                e = L::add_full(L::turn_full(e), L::gather_full(table, L::and_full(e, words_full)));
            }
        }
    }
    let (a, d) = (L::store_half(a).map(u64::from), L::store_half(d).map(u64::from));
    let parts = [&a[..], &L::store_full(b), &L::store_full(c), &d, &L::store_full(e)];
    for (place, word) in out.iter_mut().zip(parts.into_iter().flatten()) {
        *place = *word;
    }
}

#[inline(never)]
fn portable(data: &Data, out: &mut [u64]) {
    // SAFETY: `OneByOne` needs no feature
    unsafe { body::<OneByOne>(data, out) }
}

macro_rules! wrapped {
    ($name:ident $run:ident $type:ident $features:literal) => {
        #[cfg(target_arch = "x86_64")]
        #[inline(never)]
        #[target_feature(enable = $features)]
        fn $name(data: &Data, out: &mut [u64]) {
            // SAFETY: this function has the features of its lanes enabled, so its caller knows them present
            unsafe { body::<super::common_gather::$type>(data, out) }
        }

        #[cfg(target_arch = "x86_64")]
        fn $run(data: &Data, out: &mut [u64]) {
            // SAFETY: chosen only in `prepare`, for a `Proof` of this variant, which `isa` makes only when all of the
            // build's features are present
            unsafe { $name(data, out) }
        }
    };
}

wrapped!(avx2 run_avx2 TwoYmm "avx2");
wrapped!(avx512 run_avx512 OneZmm "avx2,avx512f");

#[cfg(test)]
mod tests {
    use super::*;
    use crate::kernel::Seed;

    /// What the head says of reading a mismatch, on every place of the small table read wrongly by some distance.
    #[test]
    fn a_difference_tells_the_distance() {
        let data = Data::draw(&Case { kernel: "vector.gather", seed: Seed(5), size: Size(16 + BESIDES) });
        let element = |j: usize| (data.table[j / 2] >> (32 * (j % 2))) as u32;
        let (count, words) = (2 * data.table.len(), &data.table);
        for due in 0..count {
            let read = (due * 769 + 331) % count;
            let difference = element(read).wrapping_sub(element(due));
            assert_eq!(isize::from(difference as u16 as i16), read as isize - due as isize);
        }
        for due in 0..words.len() {
            let read = (due * 769 + 331) % words.len();
            let difference = words[read].wrapping_sub(words[due]);
            let distance = isize::from(difference as u16 as i16);
            assert_eq!(distance, 2 * (read as isize - due as isize));
            let fits = |&j: &usize| {
                let other = j.checked_add_signed(distance / 2).and_then(|o| words.get(o));
                other.is_some_and(|o| o.wrapping_sub(words[j]) == difference)
            };
            assert_eq!((0..words.len()).filter(fits).collect::<Vec<_>>(), [due]);
        }
    }
}
