//! The lane trait of the FMA kernels: a register of floating-point lanes with fused multiply-add, and an integer sum of
//! the lanes' bit patterns.

/// A register of `WIDTH` lanes of `Scalar`.
pub trait FmaLanes: Copy {
    /// What one lane holds.
    type Scalar: Copy;
    /// Lanes in a register.
    const WIDTH: usize;

    /// Reads `WIDTH` lanes, aligned or not.
    ///
    /// # Safety
    /// `from` is valid for reading `WIDTH` scalars, and the CPU has the instructions of the register.
    unsafe fn load(from: *const Self::Scalar) -> Self;

    /// One scalar in every lane.
    ///
    /// # Safety
    /// `from` is valid for reading one scalar, and the CPU has the instructions of the register.
    unsafe fn broadcast(from: *const Self::Scalar) -> Self;

    /// Writes `WIDTH` lanes, aligned or not.
    ///
    /// # Safety
    /// `to` is valid for writing `WIDTH` scalars, and the CPU has the instructions of the register.
    unsafe fn store(self, to: *mut Self::Scalar);

    /// self · factor + addend in every lane, rounded once (IEEE 754-2019 §5.4.1 fusedMultiplyAdd).
    ///
    /// # Safety
    /// The CPU has the instructions of the register.
    unsafe fn mul_add(self, factor: Self, addend: Self) -> Self;

    /// Zero bits in every lane.
    ///
    /// # Safety
    /// The CPU has the instructions of the register.
    unsafe fn no_bits() -> Self;

    /// The lanes' bit patterns added as integers, modulo 2^width. A sum, so that equal errors do not cancel.
    ///
    /// # Safety
    /// The CPU has the instructions of the register.
    unsafe fn add_bits(self, other: Self) -> Self;
}

/// Implements [`FmaLanes`] for a vector type by its intrinsics.
macro_rules! fma_lanes {
    (
        $register:ty, $scalar:ty, $width:literal, $load:path, $broadcast:path, $store:path,
        |$x:ident, $factor:ident, $addend:ident| $fma:expr,
        $zero:expr, |$a:ident, $b:ident| $add:expr
    ) => {
        impl $crate::lanes::fma::FmaLanes for $register {
            type Scalar = $scalar;
            const WIDTH: usize = $width;

            #[inline(always)]
            unsafe fn load(from: *const $scalar) -> Self {
                // SAFETY: the caller vouches for the pointer and for the instruction
                unsafe { $load(from) }
            }

            #[inline(always)]
            unsafe fn broadcast(from: *const $scalar) -> Self {
                // SAFETY: the caller vouches for the pointer and for the instruction
                unsafe { $broadcast(from.read()) }
            }

            #[inline(always)]
            unsafe fn store(self, to: *mut $scalar) {
                // SAFETY: the caller vouches for the pointer and for the instruction
                unsafe { $store(to, self) }
            }

            #[inline(always)]
            unsafe fn mul_add(self, factor: Self, addend: Self) -> Self {
                let ($x, $factor, $addend) = (self, factor, addend);
                // SAFETY: the caller vouches for the instruction
                unsafe { $fma }
            }

            #[inline(always)]
            unsafe fn no_bits() -> Self {
                // SAFETY: the caller vouches for the instruction
                unsafe { $zero }
            }

            #[inline(always)]
            unsafe fn add_bits(self, other: Self) -> Self {
                let ($a, $b) = (self, other);
                // SAFETY: the caller vouches for the instruction
                unsafe { $add }
            }
        }
    };
}
pub(super) use fma_lanes;

/// Implements [`FmaLanes`] for one scalar, where the target's baseline has the instruction, given as text: from
/// `mul_add` the compiler would make vector instructions again.
#[cfg(target_arch = "aarch64")]
macro_rules! fma_scalar {
    ($scalar:ty, $instruction:literal) => {
        impl $crate::lanes::fma::FmaLanes for $scalar {
            type Scalar = $scalar;
            const WIDTH: usize = 1;

            #[inline(always)]
            unsafe fn load(from: *const $scalar) -> Self {
                // SAFETY: the caller vouches for the pointer
                unsafe { from.read() }
            }

            #[inline(always)]
            unsafe fn broadcast(from: *const $scalar) -> Self {
                // SAFETY: the caller vouches for the pointer
                unsafe { from.read() }
            }

            #[inline(always)]
            unsafe fn store(self, to: *mut $scalar) {
                // SAFETY: the caller vouches for the pointer
                unsafe { to.write(self) }
            }

            #[inline(always)]
            unsafe fn mul_add(self, factor: Self, addend: Self) -> Self {
                let end: $scalar;
                // SAFETY: the instruction reads and writes the named registers only and is in the baseline
                unsafe {
                    std::arch::asm!(
                        $instruction,
                        end = lateout(vreg) end, x = in(vreg) self, factor = in(vreg) factor, addend = in(vreg) addend,
                        options(pure, nomem, nostack, preserves_flags),
                    );
                }
                end
            }

            #[inline(always)]
            unsafe fn no_bits() -> Self {
                0.0
            }

            #[inline(always)]
            unsafe fn add_bits(self, other: Self) -> Self {
                <$scalar>::from_bits(self.to_bits().wrapping_add(other.to_bits()))
            }
        }
    };
}
#[cfg(target_arch = "aarch64")]
pub(super) use fma_scalar;
