//! `vector.shuffle`: bytes moved within and across lanes, by controls in memory and by fixed patterns.
//!
//! Two nets, each with two states of eight 32-byte blocks; all operations are those of [`crate::blocks::Blocks`].
//!
//! *Tags*: byte p of the state starts as p ⊕ key and is only ever moved: every layer of a round is a permutation of the
//! 256 bytes. So each output byte of this part says where it came from, and one that is wrong says which byte was taken
//! instead: output byte ⊕ key is its place at the start. A byte that was moved wrongly stands twice in the state and
//! another is lost; a value that no neighbouring step could have brought there speaks for corrupted data.
//! Layers of a round, on blocks 0 … 7 (a pair (a, b) becomes both results):
//! 1. each block k: shuffle_bytes by s[k mod 4]; 2. zip low, high of (0,1) in bytes, (2,3) in 16, (4,5) in 32, (6,7) in
//!    64 bits; 3. each block k: permute_elements by e[k mod 4]; 4. each block k: permute_words by [`ORDERS`]\[k\];
//! 5. (0,2), (1,3) by m₀ and (4,6), (5,7) by m₁: blend(a, b), blend(b, a); 6. (0,4) align by 5, (1,5) by 11: align(a, b),
//!    align(b, a); (2,6) and (3,7): low lanes, high lanes. Fixed patterns never follow one another, as a compiler would
//!    make one of two.
//!
//! *Sums*: high-entropy blocks in a Feistel network: blocks 0 … 3 get moved copies of blocks 4 … 7 added as 64-bit words,
//! then the other way round ([`sums`] is the exact statement). Every update adds to a block what is a function of other
//! blocks, and so is a bijection: whatever a shuffle there does wrong stays, even where it drops or zeroes bytes.
//!
//! A run takes the 24 rounds' controls in order, twelve times over, for tags and then for sums.
//!
//! Operands, in stream order: two keys (the low byte of a word, one a net); 32 words for each net's sums; then for each
//! round: tags' s (4 × 4 words), e (4 × 1), m (2 × 4), sums' s (2 × 4), e (2 × 1), m (2 × 4). A tags' s holds a
//! permutation for each lane, from the 16 bytes of two words: start with 0 … 15, for i = 15 … 1 swap places i and
//! (byte i mod (i + 1)). A tags' e is made so from the 8 bytes of its word. In a sums' s, a byte becomes 0x80 plus its
//! low four bits where bits 4 to 6 are all ones, else just its low four bits; in a sums' e, the low three bits count.
//! Masks are taken as they are. Output: tags of net 0, net 1, sums of net 0, net 1, 32 words each.

use crate::blocks::{Block, Blocks, Elements, portable::Bytes};
use crate::isa::Proof;
use crate::kernel::{Build, Case, Kernel, Proven, Ready, Roles, Size, Variant, Work};
use crate::operands::Operands;

const NETS: usize = 2;
const ROUNDS: usize = 24;
const PASSES: usize = 12;
const MOVES: usize = 48 + 16;
/// Patterns of layer 4: each a permutation of the four words.
const ORDERS: [i32; 8] = [0x93, 0x4e, 0x39, 0x1b, 0xb1, 0xd2, 0x2d, 0x87];

type Net = [Block; 8];

/// See the file's head.
pub struct Shuffle;

impl Kernel for Shuffle {
    fn id(&self) -> &'static str {
        "vector.shuffle"
    }

    fn summary(&self) -> &'static str {
        "byte moves within and across vector lanes: shuffles, permutes, zips, blends on tagged and random data"
    }

    fn sizes(&self) -> &'static [Size] {
        &[Size(13)]
    }

    fn output_words(&self, _size: Size) -> usize {
        2 * NETS * 32
    }

    fn work(&self, _size: Size) -> Work {
        Work { amount: (NETS * PASSES * ROUNDS * MOVES) as u64, unit: "block move" }
    }

    fn builds(&self) -> &'static [Build] {
        #[cfg(target_arch = "x86_64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["movz"], proven: Proven::Hardware },
                Build {
                    variant: Variant::Avx2,
                    needs: &[Feature::Avx2],
                    marks: &[
                        "vpshufb",
                        "vpermd",
                        "vpermq",
                        "vpalignr",
                        "vpblendvb",
                        "vpunpcklbw",
                        "vpunpckhwd",
                        "vpunpckldq",
                        "vpunpckhqdq",
                        "vperm2i128",
                        "vpackuswb",
                    ],
                    proven: Proven::Hardware,
                },
                Build {
                    variant: Variant::Avx512,
                    needs: &[Feature::Avx2, Feature::Avx512f, Feature::Avx512bw],
                    marks: &["vpshufb", "vpermd", "vpermq", "vpalignr", "vpblendmb", "vpunpcklbw", "vpackuswb"],
                    proven: Proven::Unexecuted,
                },
            ]
        }
        #[cfg(target_arch = "aarch64")]
        {
            use crate::isa::Feature;
            &[
                Build { variant: Variant::Portable, needs: &[], marks: &["ldrb"], proven: Proven::Emulator },
                Build {
                    variant: Variant::Neon,
                    needs: &[Feature::Neon],
                    marks: &["tbl", "ext", "zip1", "zip2", "sqxtun"],
                    proven: Proven::Emulator,
                },
            ]
        }
        #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
        {
            &[Build { variant: Variant::Portable, needs: &[], marks: &["l"], proven: Proven::Unexecuted }]
        }
    }

    fn prepare(&self, case: &Case, proof: Proof) -> Roles {
        let mut operands = Operands::new(case);
        let keys: [u8; NETS] = std::array::from_fn(|_| operands.word() as u8);
        let tags = keys.map(|key| std::array::from_fn(|k| Block(std::array::from_fn(|b| (32 * k + b) as u8 ^ key))));
        let mut block = || Block::from_words(std::array::from_fn(|_| operands.word()));
        let sums = std::array::from_fn(|_| std::array::from_fn(|_| block()));
        let rounds = (0..ROUNDS).map(|_| Round::draw(&mut operands)).collect();
        operands.finish(NETS + NETS * 32 + ROUNDS * 46);
        let run = match proof.variant_for(self.id()) {
            #[cfg(target_arch = "x86_64")]
            Variant::Avx2 => run_avx2,
            #[cfg(target_arch = "x86_64")]
            Variant::Avx512 => run_avx512,
            #[cfg(target_arch = "aarch64")]
            Variant::Neon => run_neon,
            _ => portable,
        };
        Roles::One(Box::new(Nets { tags, sums, rounds, run }))
    }
}

/// The controls of one round.
struct Round {
    tag_bytes: [Block; 4],
    tag_masks: [Block; 2],
    sum_bytes: [Block; 2],
    sum_masks: [Block; 2],
    tag_elements: [Elements; 4],
    sum_elements: [Elements; 2],
}

/// Numbers 0 … N − 1 in an order made from N random bytes (R. Durstenfeld, CACM 7 (1964), algorithm 235).
fn order<const N: usize>(random: [u8; N]) -> [u8; N] {
    let mut places = std::array::from_fn(|i| i as u8);
    for i in (1..N).rev() {
        places.swap(i, usize::from(random[i]) % (i + 1));
    }
    places
}

impl Round {
    fn draw(operands: &mut Operands) -> Round {
        let mut lane = [0; 16];
        let tag_bytes = std::array::from_fn(|_| {
            let mut control = [0; 32];
            for place in control.chunks_exact_mut(16) {
                lane[..8].copy_from_slice(&operands.word().to_le_bytes());
                lane[8..].copy_from_slice(&operands.word().to_le_bytes());
                place.copy_from_slice(&order(lane));
            }
            Block(control)
        });
        let tag_elements = std::array::from_fn(|_| Elements::new(order(operands.word().to_le_bytes())));
        let mut block = || Block::from_words(std::array::from_fn(|_| operands.word()));
        let tag_masks = std::array::from_fn(|_| block());
        let zeroing = |b: u8| if b >> 4 & 7 == 7 { 0x80 | b & 15 } else { b & 15 };
        let sum_bytes = std::array::from_fn(|_| Block(block().0.map(zeroing)));
        let sum_elements = std::array::from_fn(|_| Elements::new(operands.word().to_le_bytes()));
        let mut block = || Block::from_words(std::array::from_fn(|_| operands.word()));
        let sum_masks = std::array::from_fn(|_| block());
        Round { tag_bytes, tag_masks, sum_bytes, sum_masks, tag_elements, sum_elements }
    }
}

struct Nets {
    tags: [Net; NETS],
    sums: [Net; NETS],
    rounds: Vec<Round>,
    run: fn(&[Round], &mut [Net; NETS], &mut [Net; NETS]),
}

impl Ready for Nets {
    fn run(&mut self, out: &mut [u64]) {
        let (mut tags, mut sums) = (self.tags, self.sums);
        (self.run)(&self.rounds, &mut tags, &mut sums);
        for (place, block) in out.chunks_exact_mut(4).zip(tags.as_flattened().iter().chain(sums.as_flattened())) {
            place.copy_from_slice(&block.to_words());
        }
    }
}

/// One round on the tags of as many nets as a register holds.
///
/// # Safety
/// The CPU must have the features of `B`.
#[inline(always)]
unsafe fn tags<B: Blocks>(x: &mut [B; 8], round: &Round) {
    let (s, m) = (&round.tag_bytes, &round.tag_masks);
    // SAFETY: the caller promises B's features
    let (s, m) = unsafe {
        ([B::splat(&s[0]), B::splat(&s[1]), B::splat(&s[2]), B::splat(&s[3])], [B::splat(&m[0]), B::splat(&m[1])])
    };
    let e = &round.tag_elements;
    for k in 0..8 {
        x[k] = x[k].shuffle_bytes(s[k % 4]);
    }
    (x[0], x[1]) = (x[0].zip8_low(x[1]), x[0].zip8_high(x[1]));
    (x[2], x[3]) = (x[2].zip16_low(x[3]), x[2].zip16_high(x[3]));
    (x[4], x[5]) = (x[4].zip32_low(x[5]), x[4].zip32_high(x[5]));
    (x[6], x[7]) = (x[6].zip64_low(x[7]), x[6].zip64_high(x[7]));
    for k in 0..8 {
        x[k] = x[k].permute_elements(&e[k % 4]);
    }
    x[0] = x[0].permute_words::<{ ORDERS[0] }>();
    x[1] = x[1].permute_words::<{ ORDERS[1] }>();
    x[2] = x[2].permute_words::<{ ORDERS[2] }>();
    x[3] = x[3].permute_words::<{ ORDERS[3] }>();
    x[4] = x[4].permute_words::<{ ORDERS[4] }>();
    x[5] = x[5].permute_words::<{ ORDERS[5] }>();
    x[6] = x[6].permute_words::<{ ORDERS[6] }>();
    x[7] = x[7].permute_words::<{ ORDERS[7] }>();
    for (a, b) in [(0, 2), (1, 3), (4, 6), (5, 7)] {
        (x[a], x[b]) = (x[a].blend(x[b], m[a / 4]), x[b].blend(x[a], m[a / 4]));
    }
    (x[0], x[4]) = (x[0].align::<5>(x[4]), x[4].align::<5>(x[0]));
    (x[1], x[5]) = (x[1].align::<11>(x[5]), x[5].align::<11>(x[1]));
    (x[2], x[6]) = (x[2].low_lanes(x[6]), x[2].high_lanes(x[6]));
    (x[3], x[7]) = (x[3].low_lanes(x[7]), x[3].high_lanes(x[7]));
}

/// 16-bit numbers up to 511: as likely within a byte as saturating when packed.
const NEAR_A_BYTE: Block = Block({
    let mut bytes = [0xff; 32];
    let mut i = 1;
    while i < 32 {
        bytes[i] = 1;
        i += 2;
    }
    bytes
});

/// One round on the sums of as many nets as a register holds.
///
/// # Safety
/// The CPU must have the features of `B`.
#[inline(always)]
unsafe fn sums<B: Blocks>(x: &mut [B; 8], round: &Round) {
    let (s, m) = (&round.sum_bytes, &round.sum_masks);
    // SAFETY: the caller promises B's features
    let (s, m, near) =
        unsafe { ([B::splat(&s[0]), B::splat(&s[1])], [B::splat(&m[0]), B::splat(&m[1])], B::splat(&NEAR_A_BYTE)) };
    let e = &round.sum_elements;
    x[0] = x[0].add(x[4].shuffle_bytes(s[0])).add(x[5].align::<7>(x[6]));
    x[1] = x[1].add(x[5].permute_elements(&e[0])).add(x[7].zip16_high(x[4]));
    x[2] = x[2].add(x[6].zip8_low(x[7])).add(x[4].permute_words::<0x1e>());
    x[3] = x[3].add(x[4].blend(x[6], m[0])).add(x[5].and(near).pack(x[7].and(near)));
    x[4] = x[4].add(x[0].shuffle_bytes(s[1])).add(x[2].align::<9>(x[1]));
    x[5] = x[5].add(x[1].permute_elements(&e[1])).add(x[3].zip32_low(x[0]));
    x[6] = x[6].add(x[2].zip8_high(x[3])).add(x[0].permute_words::<0xb1>());
    x[7] = x[7].add(x[1].blend(x[3], m[1])).add(x[1].low_lanes(x[2]));
}

/// All passes over the nets of one register, of tags or of sums. No closures: they would not be inlined into the
/// function that has the features.
///
/// # Safety
/// The CPU must have the features of `B`.
#[inline(always)]
unsafe fn repeat<B: Blocks, const TAGS: bool>(rounds: &[Round], nets: &mut [Net]) {
    // SAFETY: the caller promises B's features
    let mut x = unsafe {
        [
            B::load(nets, 0),
            B::load(nets, 1),
            B::load(nets, 2),
            B::load(nets, 3),
            B::load(nets, 4),
            B::load(nets, 5),
            B::load(nets, 6),
            B::load(nets, 7),
        ]
    };
    for _ in 0..PASSES {
        for round in rounds {
            // SAFETY: the caller promises B's features
            unsafe { if TAGS { tags(&mut x, round) } else { sums(&mut x, round) } }
        }
    }
    for (k, block) in x.into_iter().enumerate() {
        block.store(nets, k);
    }
}

/// # Safety
/// The CPU must have the features of `B`.
#[inline(always)]
unsafe fn body<B: Blocks>(rounds: &[Round], all_tags: &mut [Net; NETS], all_sums: &mut [Net; NETS]) {
    // SAFETY: the caller promises B's features
    unsafe {
        for nets in all_tags.chunks_exact_mut(B::WIDTH) {
            repeat::<B, true>(rounds, nets);
        }
        for nets in all_sums.chunks_exact_mut(B::WIDTH) {
            repeat::<B, false>(rounds, nets);
        }
    }
}

#[inline(never)]
fn portable(rounds: &[Round], tags: &mut [Net; NETS], sums: &mut [Net; NETS]) {
    // SAFETY: `Bytes` needs no feature
    unsafe { body::<Bytes>(rounds, tags, sums) }
}

macro_rules! wrapped {
    ($name:ident $run:ident $type:path, $features:literal, $arch:literal) => {
        #[cfg(target_arch = $arch)]
        #[inline(never)]
        #[target_feature(enable = $features)]
        fn $name(rounds: &[Round], tags: &mut [Net; NETS], sums: &mut [Net; NETS]) {
            // SAFETY: this function has the features of its block type enabled, so its caller knows them present
            unsafe { body::<$type>(rounds, tags, sums) }
        }

        #[cfg(target_arch = $arch)]
        fn $run(rounds: &[Round], tags: &mut [Net; NETS], sums: &mut [Net; NETS]) {
            // SAFETY: chosen only in `prepare`, for a `Proof` of this variant, which `isa` makes only when all of the
            // build's features are present
            unsafe { $name(rounds, tags, sums) }
        }
    };
}

wrapped!(avx2 run_avx2 crate::blocks::avx2::Ymm, "avx2", "x86_64");
wrapped!(avx512 run_avx512 crate::blocks::avx512::Zmm, "avx2,avx512f,avx512bw", "x86_64");
wrapped!(neon run_neon crate::blocks::neon::Lanes, "neon", "aarch64");
