//! Instruction wrappers by encoding: legacy SSE (the destination is the first source), VEX (256 bits), EVEX (512 bits).
//!
//! With only sixteen registers and no third operand, legacy code suffers where the compiler keeps the result of one
//! operation for another that begins alike, so these wrappers do not tell it that they are pure.

/// Two vectors to one: `name "mnemonic";` in the features' encoding.
macro_rules! binaries {
    (legacy; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {a}, {b}"), a = inlateout(xmm_reg) a => r, b = in(xmm_reg) b,
                    options(nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
    (vex; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}, {b}"), a = in(ymm_reg) a, b = in(ymm_reg) b,
                    r = lateout(ymm_reg) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
    (evex; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V, b: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}, {b}"), a = in(zmm_reg) a, b = in(zmm_reg) b,
                    r = lateout(zmm_reg) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
    // what EVEX lacks, by VEX on each half
    (halves; $($name:ident)*) => {$(
        #[doc = concat!("[`avx2::", stringify!($name), "`](super::avx2) on each half")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V, b: V) -> V {
            let ((a, c), (b, d)) = (halved(a), halved(b));
            joined(super::avx2::$name(a, b), super::avx2::$name(c, d))
        }
    )*};
}

/// One vector to one.
macro_rules! unaries {
    (vex; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $name(a: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}"), a = in(ymm_reg) a, r = lateout(ymm_reg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
    (evex; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name(a: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}"), a = in(zmm_reg) a, r = lateout(zmm_reg) r,
                    options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

/// One vector to one, with a number in the instruction.
macro_rules! immediates {
    (legacy; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`", $mnemonic, "` by N")]
        #[inline]
        #[target_feature(enable = "sse2")]
        pub fn $name<const N: i32>(a: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!($mnemonic, " {a}, {n}"), a = inlateout(xmm_reg) a => r, n = const N,
                    options(nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
    (vex; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "` by N")]
        #[inline]
        #[target_feature(enable = "avx2")]
        pub fn $name<const N: i32>(a: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}, {n}"), a = in(ymm_reg) a, n = const N,
                    r = lateout(ymm_reg) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
    (evex; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "` by N")]
        #[inline]
        #[target_feature(enable = "avx512f,avx512bw,avx512dq,avx512vl")]
        pub fn $name<const N: i32>(a: V) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}, {n}"), a = in(zmm_reg) a, n = const N,
                    r = lateout(zmm_reg) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

/// All elements by one count, which comes in a register of its own.
macro_rules! counted {
    (legacy; $($name:ident $mnemonic:literal;)*) => {
        binaries! { legacy; $($name $mnemonic;)* }
    };
    ($v:ident $features:literal; $($name:ident $mnemonic:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "` by a count in a register")]
        #[inline]
        #[target_feature(enable = $features)]
        pub fn $name(a: V, count: Count) -> V {
            let r;
            // SAFETY: touches the registers named only; the mnemonics listed are in the features enabled
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, {a}, {c}"), a = in($v) a, c = in(xmm_reg) count,
                    r = lateout($v) r, options(pure, nomem, nostack, preserves_flags));
            }
            r
        }
    )*};
}

/// Elements of memory widened to fill a register: `name "mnemonic" K;` reads WIDTH / K bytes.
macro_rules! widenings {
    ($v:ident $features:literal; $($name:ident $mnemonic:literal $k:literal;)*) => {$(
        #[doc = concat!("`v", $mnemonic, "`")]
        #[inline]
        #[target_feature(enable = $features)]
        pub fn $name(line: &super::Line, at: usize) -> V {
            let r;
            let from: &[u8; WIDTH / $k] = line.0[at / $k..].first_chunk().expect("a line has four nets");
            // SAFETY: reads WIDTH / K bytes at the slice's start, which has as many; touches nothing else
            unsafe {
                std::arch::asm!(concat!("v", $mnemonic, " {r}, [{p}]"), p = in(reg) from, r = lateout($v) r,
                    options(pure, readonly, nostack, preserves_flags));
            }
            r
        }
    )*};
}
