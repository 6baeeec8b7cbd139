//! AES (FIPS 197) once, over the round operations of one instruction set: key expansion and chained blocks.
//!
//! The decryption is the equivalent inverse cipher of FIPS 197 §5.3.5: round keys in reverse order, the middle ones
//! through InvMixColumns. A block is two words, its bytes in memory order.

/// 16 bytes as two little-endian words.
pub type Block = [u64; 2];

/// Round keys of the longest key, AES-256.
const MAX_ROUND_KEYS: usize = 15;

/// The round operations of one instruction set. A value of the type is the evidence that its instructions may run.
pub trait Rounds: Copy {
    /// [`Rounds::WIDTH`] blocks side by side.
    type Blocks: Copy;
    /// Blocks in one [`Rounds::Blocks`].
    const WIDTH: usize;

    /// The first `WIDTH` blocks of `from`.
    fn load(self, from: &[Block]) -> Self::Blocks;
    /// Over the first `WIDTH` blocks of `to`.
    fn store(self, x: Self::Blocks, to: &mut [Block]);
    /// The same block everywhere.
    fn spread(self, block: &Block) -> Self::Blocks;
    /// x ⊕ k.
    fn xor(self, x: Self::Blocks, k: Self::Blocks) -> Self::Blocks;
    /// SubBytes, ShiftRows, MixColumns, AddRoundKey.
    fn encrypt(self, x: Self::Blocks, k: Self::Blocks) -> Self::Blocks;
    /// SubBytes, ShiftRows, AddRoundKey.
    fn encrypt_last(self, x: Self::Blocks, k: Self::Blocks) -> Self::Blocks;
    /// InvSubBytes, InvShiftRows, InvMixColumns, AddRoundKey.
    fn decrypt(self, x: Self::Blocks, k: Self::Blocks) -> Self::Blocks;
    /// InvSubBytes, InvShiftRows, AddRoundKey.
    fn decrypt_last(self, x: Self::Blocks, k: Self::Blocks) -> Self::Blocks;
    /// InvMixColumns of one round key.
    fn inverse_mix(self, k: &Block) -> Block;
    /// SubWord of FIPS 197 §5.2.
    fn sub_word(self, w: u32) -> u32;
}

/// Key expansion of FIPS 197 §5.2 for a key of 4 or 8 little-endian 32-bit words; returns the number of rounds.
#[inline(always)]
fn expand<R: Rounds>(r: R, key: &[u32], keys: &mut [Block; MAX_ROUND_KEYS]) -> usize {
    let rounds = key.len() + 6;
    let mut w = [0u32; 4 * MAX_ROUND_KEYS];
    w[..key.len()].copy_from_slice(key);
    let mut constant = 1u32;
    for i in key.len()..4 * (rounds + 1) {
        let mut t = w[i - 1];
        if i.is_multiple_of(key.len()) {
            // RotWord moves byte 1 to byte 0: a right rotation of the little-endian word
            t = r.sub_word(t.rotate_right(8)) ^ constant;
            constant = constant << 1 ^ if constant & 0x80 == 0 { 0 } else { 0x11b };
        } else if key.len() > 6 && i % key.len() == 4 {
            t = r.sub_word(t);
        }
        w[i] = w[i - key.len()] ^ t;
    }
    for (k, c) in keys.iter_mut().zip(w.chunks_exact(4)) {
        *k = [u64::from(c[0]) | u64::from(c[1]) << 32, u64::from(c[2]) | u64::from(c[3]) << 32];
    }
    rounds
}

/// Which way a chain runs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Way {
    /// x ← E(x ⊕ p)
    Encrypt,
    /// x ← D(x ⊕ p)
    Decrypt,
}

/// Chains over one key: every start block takes all of `plain` in.
#[derive(Clone, Debug)]
pub struct Job {
    /// Direction of every step.
    pub way: Way,
    /// 4 or 8 little-endian words.
    pub key: Vec<u32>,
    /// One block a step, the same for every chain.
    pub plain: Vec<Block>,
    /// One block a chain.
    pub start: Vec<Block>,
}

/// Every element of an array anew. No closure and no `array::map`: whether those are inlined depends on how the crate was
/// cut up, and where they are not they lack the wrapper's features.
macro_rules! each {
    ($x:ident, $change:expr) => {
        for $x in &mut $x {
            *$x = $change;
        }
    };
}

/// The last block of every chain of `job`, `N` registers in flight at a time; `start` and `out` are multiples of that.
#[inline(always)]
pub fn chains<R: Rounds, const N: usize>(r: R, job: &Job, out: &mut [Block]) {
    let mut keys = [[0; 2]; MAX_ROUND_KEYS];
    let rounds = expand(r, &job.key, &mut keys);
    if job.way == Way::Decrypt {
        keys[..=rounds].reverse();
        for k in &mut keys[1..rounds] {
            *k = r.inverse_mix(k);
        }
    }
    for (start, out) in job.start.chunks_exact(N * R::WIDTH).zip(out.chunks_exact_mut(N * R::WIDTH)) {
        let mut x: [R::Blocks; N] = std::array::from_fn(|i| r.load(&start[i * R::WIDTH..]));
        for p in &job.plain {
            let whiten = r.xor(r.spread(p), r.spread(&keys[0]));
            each!(x, r.xor(*x, whiten));
            let last = r.spread(&keys[rounds]);
            match job.way {
                Way::Encrypt => {
                    for k in &keys[1..rounds] {
                        let k = r.spread(k);
                        each!(x, r.encrypt(*x, k));
                    }
                    each!(x, r.encrypt_last(*x, last));
                }
                Way::Decrypt => {
                    for k in &keys[1..rounds] {
                        let k = r.spread(k);
                        each!(x, r.decrypt(*x, k));
                    }
                    each!(x, r.decrypt_last(*x, last));
                }
            }
        }
        for (i, x) in x.into_iter().enumerate() {
            r.store(x, &mut out[i * R::WIDTH..]);
        }
    }
}
