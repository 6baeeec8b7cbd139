//! All feature detection. A [`Proof`] is the only way into a kernel's special code, and only this file makes one.

use std::fmt;

use crate::kernel::{Build, Kernel, Variant};

/// A CPU feature that some build needs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[expect(missing_docs, reason = "the names are the vendors' own feature names")]
pub enum Feature {
    Sse41,
    Ssse3,
    Sse42,
    Popcnt,
    Avx,
    Avx2,
    Fma,
    F16c,
    Bmi1,
    Bmi2,
    Adx,
    Aes,
    Sha,
    Pclmulqdq,
    Vaes,
    Vpclmulqdq,
    Avx512f,
    Avx512bw,
    Avx512dq,
    Avx512vl,
    Lzcnt,
    Movbe,
    Cmpxchg16b,
    Gfni,
    Prefetchw,
    Avx512cd,
    Avx512vnni,
    Avx512bf16,
    Avx512ifma,
    Avx512vbmi,
    Avx512vbmi2,
    Avx512bitalg,
    Avx512vpopcntdq,
    Avx512fp16,
    Neon,
    ArmAes,
    ArmSha2,
    ArmCrc,
    ArmFp16,
    ArmDotprod,
    ArmLse,
}

impl Feature {
    /// The feature's name as the host's own tools print it.
    pub fn name(self) -> &'static str {
        match self {
            Feature::Sse41 => "sse4.1",
            Feature::Ssse3 => "ssse3",
            Feature::Sse42 => "sse4.2",
            Feature::Popcnt => "popcnt",
            Feature::Avx => "avx",
            Feature::Avx2 => "avx2",
            Feature::Fma => "fma",
            Feature::F16c => "f16c",
            Feature::Bmi1 => "bmi1",
            Feature::Bmi2 => "bmi2",
            Feature::Adx => "adx",
            Feature::Aes => "aes",
            Feature::Sha => "sha",
            Feature::Pclmulqdq => "pclmulqdq",
            Feature::Vaes => "vaes",
            Feature::Vpclmulqdq => "vpclmulqdq",
            Feature::Avx512f => "avx512f",
            Feature::Avx512bw => "avx512bw",
            Feature::Avx512dq => "avx512dq",
            Feature::Avx512vl => "avx512vl",
            Feature::Lzcnt => "lzcnt",
            Feature::Movbe => "movbe",
            Feature::Cmpxchg16b => "cx16",
            Feature::Gfni => "gfni",
            Feature::Prefetchw => "3dnowprefetch",
            Feature::Avx512cd => "avx512cd",
            Feature::Avx512vnni => "avx512vnni",
            Feature::Avx512bf16 => "avx512bf16",
            Feature::Avx512ifma => "avx512ifma",
            Feature::Avx512vbmi => "avx512vbmi",
            Feature::Avx512vbmi2 => "avx512vbmi2",
            Feature::Avx512bitalg => "avx512bitalg",
            Feature::Avx512vpopcntdq => "avx512vpopcntdq",
            Feature::Avx512fp16 => "avx512fp16",
            Feature::Neon => "neon",
            Feature::ArmAes => "aes",
            Feature::ArmSha2 => "sha2",
            Feature::ArmCrc => "crc",
            Feature::ArmFp16 => "fp16",
            Feature::ArmDotprod => "dotprod",
            Feature::ArmLse => "lse",
        }
    }

    /// Whether this CPU (and the operating system) offers the feature.
    #[cfg(target_arch = "x86_64")]
    pub fn present(self) -> bool {
        use std::arch::is_x86_feature_detected as has;
        match self {
            Feature::Sse41 => has!("sse4.1"),
            Feature::Ssse3 => has!("ssse3"),
            Feature::Sse42 => has!("sse4.2"),
            Feature::Popcnt => has!("popcnt"),
            Feature::Avx => has!("avx"),
            Feature::Avx2 => has!("avx2"),
            Feature::Fma => has!("fma"),
            Feature::F16c => has!("f16c"),
            Feature::Bmi1 => has!("bmi1"),
            Feature::Bmi2 => has!("bmi2"),
            Feature::Adx => has!("adx"),
            Feature::Aes => has!("aes"),
            Feature::Sha => has!("sha"),
            Feature::Pclmulqdq => has!("pclmulqdq"),
            Feature::Vaes => has!("vaes"),
            Feature::Vpclmulqdq => has!("vpclmulqdq"),
            Feature::Avx512f => has!("avx512f"),
            Feature::Avx512bw => has!("avx512bw"),
            Feature::Avx512dq => has!("avx512dq"),
            Feature::Avx512vl => has!("avx512vl"),
            Feature::Lzcnt => has!("lzcnt"),
            Feature::Movbe => has!("movbe"),
            Feature::Cmpxchg16b => has!("cmpxchg16b"),
            Feature::Gfni => has!("gfni"),
            // not among the names that the standard library knows: leaf 8000_0001h, ECX bit 8
            Feature::Prefetchw => {
                std::arch::x86_64::__cpuid(0x8000_0000).eax >= 0x8000_0001
                    && std::arch::x86_64::__cpuid(0x8000_0001).ecx >> 8 & 1 == 1
            }
            Feature::Avx512cd => has!("avx512cd"),
            Feature::Avx512vnni => has!("avx512vnni"),
            Feature::Avx512bf16 => has!("avx512bf16"),
            Feature::Avx512ifma => has!("avx512ifma"),
            Feature::Avx512vbmi => has!("avx512vbmi"),
            Feature::Avx512vbmi2 => has!("avx512vbmi2"),
            Feature::Avx512bitalg => has!("avx512bitalg"),
            Feature::Avx512vpopcntdq => has!("avx512vpopcntdq"),
            Feature::Avx512fp16 => has!("avx512fp16"),
            Feature::Neon
            | Feature::ArmAes
            | Feature::ArmSha2
            | Feature::ArmCrc
            | Feature::ArmFp16
            | Feature::ArmDotprod
            | Feature::ArmLse => false,
        }
    }

    /// Whether this CPU (and the operating system) offers the feature.
    #[cfg(target_arch = "aarch64")]
    pub fn present(self) -> bool {
        use std::arch::is_aarch64_feature_detected as has;
        match self {
            Feature::Neon => has!("neon"),
            Feature::ArmAes => has!("aes"),
            Feature::ArmSha2 => has!("sha2"),
            Feature::ArmCrc => has!("crc"),
            Feature::ArmFp16 => has!("fp16"),
            Feature::ArmDotprod => has!("dotprod"),
            Feature::ArmLse => has!("lse"),
            _ => false,
        }
    }

    /// No optional feature is known for this architecture.
    #[cfg(not(any(target_arch = "x86_64", target_arch = "aarch64")))]
    pub fn present(self) -> bool {
        false
    }
}

/// Evidence that this CPU has every feature that one build of one kernel needs.
#[derive(Clone, Copy, Debug)]
pub struct Proof {
    kernel: &'static str,
    variant: Variant,
}

impl Proof {
    /// The proven variant, after checking that the proof is for this kernel.
    ///
    /// # Panics
    /// When the proof was made for another kernel: mixing proofs is a programming error that must not reach `unsafe`.
    pub fn variant_for(self, kernel: &'static str) -> Variant {
        assert_eq!(self.kernel, kernel, "proof of features belongs to another kernel");
        self.variant
    }

    /// The kernel that the proof was made for.
    pub fn kernel(self) -> &'static str {
        self.kernel
    }

    /// The variant that the proof was made for.
    pub fn variant(self) -> Variant {
        self.variant
    }
}

/// Why a variant cannot run here.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Missing {
    /// The kernel has no such variant on this architecture.
    NotBuilt,
    /// The CPU lacks features.
    Features(Vec<Feature>),
}

impl fmt::Display for Missing {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Missing::NotBuilt => write!(f, "not built for {}", std::env::consts::ARCH),
            Missing::Features(list) => {
                let names: Vec<&str> = list.iter().map(|x| x.name()).collect();
                write!(f, "cpu lacks {}", names.join(", "))
            }
        }
    }
}

/// Proves that `variant` of `kernel` may run on this CPU.
pub fn prove(kernel: &dyn Kernel, variant: Variant) -> Result<Proof, Missing> {
    let build = kernel.builds().iter().find(|b| b.variant == variant).ok_or(Missing::NotBuilt)?;
    prove_build(kernel, build)
}

/// Proves that `build` of `kernel` may run on this CPU.
pub fn prove_build(kernel: &dyn Kernel, build: &Build) -> Result<Proof, Missing> {
    let lacking: Vec<Feature> = build.needs.iter().copied().filter(|x| !x.present()).collect();
    if lacking.is_empty() {
        Ok(Proof { kernel: kernel.id(), variant: build.variant })
    } else {
        Err(Missing::Features(lacking))
    }
}

/// Every build of `kernel` with the proof that it may run, or why it may not.
pub fn survey(kernel: &dyn Kernel) -> Vec<(Variant, Result<Proof, Missing>)> {
    Variant::ALL.into_iter().map(|v| (v, prove(kernel, v))).collect()
}
