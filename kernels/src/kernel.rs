//! The words every kernel is described with: [`Kernel`], [`Case`], [`Variant`], [`Build`], [`Work`].

use std::fmt;

use crate::isa::{Feature, Proof};

/// Fixes, with kernel and size, every operand bit of a case.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Seed(pub u64);

impl fmt::Display for Seed {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{:#x}", self.0)
    }
}

/// Footprint of a case in KiB of operand memory, rounded up. A kernel lists the sizes it knows.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Size(pub u32);

/// Kernel, seed and size: everything that decides the right output.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Case {
    /// Catalogue id, e.g. `fma.chain64`.
    pub kernel: &'static str,
    /// Operand seed.
    pub seed: Seed,
    /// Footprint; one of [`Kernel::sizes`].
    pub size: Size,
}

impl fmt::Display for Case {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} seed {} size {} KiB", self.kernel, self.seed, self.size.0)
    }
}

/// Instruction-set level at which one kernel is built.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Variant {
    /// Baseline instructions of the target (x86-64: SSE2; aarch64: its baseline), no detection needed.
    Portable,
    /// 256-bit x86 vectors and the scalar extensions of the same generation.
    Avx2,
    /// 512-bit x86 vectors.
    Avx512,
    /// aarch64 Advanced SIMD and its optional extensions.
    Neon,
}

impl Variant {
    /// Every variant, in the order in which they are listed.
    pub const ALL: [Variant; 4] = [Variant::Portable, Variant::Avx2, Variant::Avx512, Variant::Neon];

    /// The name used on the command line, in ledgers and as the wrapper function's name.
    pub fn name(self) -> &'static str {
        match self {
            Variant::Portable => "portable",
            Variant::Avx2 => "avx2",
            Variant::Avx512 => "avx512",
            Variant::Neon => "neon",
        }
    }

    /// The variant with this name.
    pub fn parse(name: &str) -> Option<Variant> {
        Variant::ALL.into_iter().find(|v| v.name() == name)
    }
}

impl fmt::Display for Variant {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.name())
    }
}

/// What has executed a build so far; anything less than `Hardware` is said by `survey`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Proven {
    /// Ran on a real processor and gave every golden value.
    Hardware,
    /// Ran under an emulator of that processor only.
    Emulator,
    /// Compiled and disassembled, never executed.
    Unexecuted,
}

/// One variant of one kernel.
#[derive(Clone, Copy, Debug)]
pub struct Build {
    /// Instruction-set level. The wrapper function carries the variant's name: `<family>::<stem>::<variant>`.
    pub variant: Variant,
    /// CPU features that must be present before it may run.
    pub needs: &'static [Feature],
    /// Mnemonic prefixes that the wrapper's machine code must contain (`scripts/check-isa.sh`).
    pub marks: &'static [&'static str],
    /// What has executed it.
    pub proven: Proven,
}

/// Operations in one run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Work {
    /// How many units one run performs.
    pub amount: u64,
    /// What is counted, singular: `flop`, `byte`, `multiply`, `block` …
    pub unit: &'static str,
}

/// A deterministic computation that a core can be made to do.
pub trait Kernel: Sync {
    /// Catalogue id `family.stem`, at most 20 ASCII bytes.
    fn id(&self) -> &'static str;
    /// One line: which part of the core this leans on.
    fn summary(&self) -> &'static str;
    /// Sizes with golden tables, default first.
    fn sizes(&self) -> &'static [Size];
    /// 64-bit words that one run writes. At most [`MAX_OUTPUT_WORDS`].
    fn output_words(&self, size: Size) -> usize;
    /// Operations in one run.
    fn work(&self, size: Size) -> Work;
    /// Every variant this source gives on the architecture that it is compiled for.
    fn builds(&self) -> &'static [Build];
    /// Puts the operands of `case` in memory, for the build that `proof` speaks of.
    ///
    /// # Panics
    /// When `proof` or `case` is for another kernel, or the size is not one of [`Kernel::sizes`]: a programming error.
    fn prepare(&self, case: &Case, proof: Proof) -> Roles;

    /// Cpus that one run takes: 1, or 2 for a kernel about what passes between cores.
    fn cpus(&self) -> usize {
        1
    }

    /// The part of the id before the point.
    fn family(&self) -> &'static str {
        self.id().split('.').next().unwrap_or("")
    }
}

/// Longest output a kernel may have, in words; keeps tables, pipes and logs small.
pub const MAX_OUTPUT_WORDS: usize = 256;

/// Operands in memory, ready to be run any number of times with the same output.
pub trait Ready: Send {
    /// One run: overwrites every word of `out`, whose length is [`Kernel::output_words`] for a kernel of one cpu and
    /// half of that for each role of a pair.
    fn run(&mut self, out: &mut [u64]);
}

/// What [`Kernel::prepare`] hands out, by the number of cpus that a run takes.
pub enum Roles {
    /// One cpu does the run.
    One(Box<dyn Ready>),
    /// Two cpus do the run together. Each role is called once a run, on its own thread, both at the same time; a role
    /// may spin until the other has begun. The first role writes the first half of the output words, the second the
    /// rest. Run n of both has to have returned before either begins run n + 1.
    Two([Box<dyn Ready>; 2]),
}

impl Roles {
    /// The only role of a kernel for one cpu.
    ///
    /// # Panics
    /// When the kernel takes two cpus ([`Kernel::cpus`]): a programming error.
    pub fn alone(self) -> Box<dyn Ready> {
        match self {
            Roles::One(ready) => ready,
            Roles::Two(_) => panic!("a kernel for two cpus was asked to run on one"),
        }
    }

    /// One run of every role, on a thread of its own where there are two: for tests and rechecks, where it does not
    /// matter which cpu does what. `out` is as long as [`Kernel::output_words`].
    pub fn run_anywhere(&mut self, out: &mut [u64]) {
        match self {
            Roles::One(ready) => ready.run(out),
            Roles::Two([first, second]) => {
                let (low, high) = out.split_at_mut(out.len() / 2);
                std::thread::scope(|s| {
                    s.spawn(|| second.run(high));
                    first.run(low);
                });
            }
        }
    }
}
