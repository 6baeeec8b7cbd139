//! Four words across a border, read, added to and written back by vectors.

/// Vector instructions. A value of the type is the evidence that they may run.
pub trait Quad: Copy {
    /// Adds `update` to each of the four words at this address and gives what they were.
    ///
    /// # Safety
    /// 32 bytes must be readable and writable there.
    unsafe fn bump(self, at: *mut u8, update: u64) -> [u64; 4];
}

/// Whatever the compiler makes of it.
#[cfg(not(target_arch = "x86_64"))]
#[derive(Clone, Copy)]
pub struct Plain;

#[cfg(not(target_arch = "x86_64"))]
impl Quad for Plain {
    #[inline(always)]
    unsafe fn bump(self, at: *mut u8, update: u64) -> [u64; 4] {
        let at = at.cast::<[u64; 4]>();
        // SAFETY: the caller gives 32 bytes
        unsafe {
            let was = at.read_unaligned();
            at.write_unaligned(was.map(|w| w.wrapping_add(update)));
            was
        }
    }
}

/// Two vectors of SSE2, which is part of the x86-64 baseline.
#[cfg(target_arch = "x86_64")]
#[derive(Clone, Copy)]
pub struct Sse2;

#[cfg(target_arch = "x86_64")]
impl Quad for Sse2 {
    #[inline(always)]
    unsafe fn bump(self, at: *mut u8, update: u64) -> [u64; 4] {
        use std::arch::x86_64::*;
        // SAFETY: the caller gives 32 bytes; both types are 32 bytes in which any bits are valid
        unsafe {
            let (low, high) = (at.cast::<__m128i>(), at.add(16).cast::<__m128i>());
            let (was, update) = ([_mm_loadu_si128(low), _mm_loadu_si128(high)], _mm_set1_epi64x(update as i64));
            _mm_storeu_si128(low, _mm_add_epi64(was[0], update));
            _mm_storeu_si128(high, _mm_add_epi64(was[1], update));
            std::mem::transmute::<[__m128i; 2], [u64; 4]>(was)
        }
    }
}

#[cfg(target_arch = "x86_64")]
impl Quad for super::common_lanes_x86::Avx2 {
    #[inline(always)]
    unsafe fn bump(self, at: *mut u8, update: u64) -> [u64; 4] {
        use std::arch::x86_64::*;
        // SAFETY: the caller gives 32 bytes, and of `Avx2::new` proved avx2; both types are 32 bytes in which any bits are valid
        unsafe {
            let was = _mm256_loadu_si256(at.cast());
            _mm256_storeu_si256(at.cast(), _mm256_add_epi64(was, _mm256_set1_epi64x(update as i64)));
            std::mem::transmute::<__m256i, [u64; 4]>(was)
        }
    }
}
