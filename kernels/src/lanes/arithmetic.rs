//! The IEEE operations that every level has: add, subtract, multiply, divide, square root.

/// A register of one or more floating-point lanes.
///
/// # Safety
/// Every method may execute instructions of the implementing register's level. The caller proves that the CPU has them
/// and, for `load` and `store`, that [`Arithmetic::WIDTH`] scalars lie at the pointer; no alignment is needed beyond a
/// scalar's own.
#[expect(clippy::missing_safety_doc, reason = "one contract for all methods, stated on the trait")]
pub trait Arithmetic: Copy {
    /// One lane's type.
    type Scalar: Copy;
    /// Lanes per register.
    const WIDTH: usize;
    /// Reads a register.
    unsafe fn load(from: *const Self::Scalar) -> Self;
    /// Writes a register.
    unsafe fn store(self, to: *mut Self::Scalar);
    /// self + other.
    unsafe fn add(self, other: Self) -> Self;
    /// self − other.
    unsafe fn sub(self, other: Self) -> Self;
    /// self · other.
    unsafe fn mul(self, other: Self) -> Self;
    /// self / other.
    unsafe fn div(self, other: Self) -> Self;
    /// Square root, correctly rounded.
    unsafe fn sqrt(self) -> Self;
    /// Sign bit cleared.
    unsafe fn abs(self) -> Self;
}

/// Implements [`Arithmetic`] for an x86 register by the names of its intrinsics.
#[cfg(target_arch = "x86_64")]
macro_rules! x86 {
    ($register:ident, $scalar:ty, $width:literal, $load:ident, $store:ident, $add:ident, $sub:ident, $mul:ident,
     $div:ident, $sqrt:ident, |$x:ident| $abs:expr) => {
        impl crate::lanes::Arithmetic for std::arch::x86_64::$register {
            type Scalar = $scalar;
            const WIDTH: usize = $width;
            #[inline(always)]
            unsafe fn load(from: *const $scalar) -> Self {
                // SAFETY: the trait's contract: the level's features, and WIDTH readable scalars
                unsafe { std::arch::x86_64::$load(from) }
            }
            #[inline(always)]
            unsafe fn store(self, to: *mut $scalar) {
                // SAFETY: the trait's contract: the level's features, and WIDTH writable scalars
                unsafe { std::arch::x86_64::$store(to, self) }
            }
            #[inline(always)]
            unsafe fn add(self, other: Self) -> Self {
                // SAFETY: the trait's contract: the level's features
                unsafe { std::arch::x86_64::$add(self, other) }
            }
            #[inline(always)]
            unsafe fn sub(self, other: Self) -> Self {
                // SAFETY: the trait's contract: the level's features
                unsafe { std::arch::x86_64::$sub(self, other) }
            }
            #[inline(always)]
            unsafe fn mul(self, other: Self) -> Self {
                // SAFETY: the trait's contract: the level's features
                unsafe { std::arch::x86_64::$mul(self, other) }
            }
            #[inline(always)]
            unsafe fn div(self, other: Self) -> Self {
                // SAFETY: the trait's contract: the level's features
                unsafe { std::arch::x86_64::$div(self, other) }
            }
            #[inline(always)]
            unsafe fn sqrt(self) -> Self {
                // SAFETY: the trait's contract: the level's features
                unsafe { std::arch::x86_64::$sqrt(self) }
            }
            #[inline(always)]
            unsafe fn abs(self) -> Self {
                let $x = self;
                // SAFETY: the trait's contract: the level's features
                unsafe { $abs }
            }
        }
    };
}
#[cfg(target_arch = "x86_64")]
pub(crate) use x86;

/// Implements [`Arithmetic`] for an aarch64 register by the names of its intrinsics.
#[cfg(target_arch = "aarch64")]
macro_rules! neon {
    ($register:ident, $scalar:ty, $width:literal, $load:ident, $store:ident, $add:ident, $sub:ident, $mul:ident,
     $div:ident, $sqrt:ident, $abs:ident) => {
        impl crate::lanes::Arithmetic for std::arch::aarch64::$register {
            type Scalar = $scalar;
            const WIDTH: usize = $width;
            #[inline(always)]
            unsafe fn load(from: *const $scalar) -> Self {
                // SAFETY: the trait's contract: WIDTH readable scalars; NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$load(from) }
            }
            #[inline(always)]
            unsafe fn store(self, to: *mut $scalar) {
                // SAFETY: the trait's contract: WIDTH writable scalars; NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$store(to, self) }
            }
            #[inline(always)]
            unsafe fn add(self, other: Self) -> Self {
                // SAFETY: NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$add(self, other) }
            }
            #[inline(always)]
            unsafe fn sub(self, other: Self) -> Self {
                // SAFETY: NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$sub(self, other) }
            }
            #[inline(always)]
            unsafe fn mul(self, other: Self) -> Self {
                // SAFETY: NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$mul(self, other) }
            }
            #[inline(always)]
            unsafe fn div(self, other: Self) -> Self {
                // SAFETY: NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$div(self, other) }
            }
            #[inline(always)]
            unsafe fn sqrt(self) -> Self {
                // SAFETY: NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$sqrt(self) }
            }
            #[inline(always)]
            unsafe fn abs(self) -> Self {
                // SAFETY: NEON is aarch64's baseline
                unsafe { std::arch::aarch64::$abs(self) }
            }
        }
    };
}
#[cfg(target_arch = "aarch64")]
pub(crate) use neon;

/// Implements [`Arithmetic`] for a scalar by Rust's own operators.
macro_rules! scalar {
    ($scalar:ident) => {
        impl crate::lanes::Arithmetic for $scalar {
            type Scalar = $scalar;
            const WIDTH: usize = 1;
            #[inline(always)]
            unsafe fn load(from: *const $scalar) -> Self {
                // SAFETY: the trait's contract: one readable scalar
                unsafe { *from }
            }
            #[inline(always)]
            unsafe fn store(self, to: *mut $scalar) {
                // SAFETY: the trait's contract: one writable scalar
                unsafe { *to = self }
            }
            #[inline(always)]
            unsafe fn add(self, other: Self) -> Self {
                self + other
            }
            #[inline(always)]
            unsafe fn sub(self, other: Self) -> Self {
                self - other
            }
            #[inline(always)]
            unsafe fn mul(self, other: Self) -> Self {
                self * other
            }
            #[inline(always)]
            unsafe fn div(self, other: Self) -> Self {
                self / other
            }
            #[inline(always)]
            unsafe fn sqrt(self) -> Self {
                $scalar::sqrt(self)
            }
            #[inline(always)]
            unsafe fn abs(self) -> Self {
                $scalar::abs(self)
            }
        }
    };
}
pub(crate) use scalar;
