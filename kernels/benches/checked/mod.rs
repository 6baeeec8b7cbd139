//! A run with the checks on, as a worker makes it: the kernel, the comparison of every word, the fold of every output.

use kernels::compare::{Fold, first_difference};
use kernels::isa::Proof;
use kernels::{Case, Kernel, Ready, Seed, Size};

/// One case made ready, with the words to expect.
pub struct Checked {
    ready: Box<dyn Ready>,
    expected: Vec<u64>,
    out: Vec<u64>,
    fold: Fold,
}

impl Checked {
    /// Seed 0. The output of a first run stands in for the expected words: truth is not what is measured here.
    pub fn new(kernel: &dyn Kernel, size: Size, proof: Proof) -> Checked {
        let mut ready = kernel.prepare(&Case { kernel: kernel.id(), seed: Seed(0), size }, proof).alone();
        let mut expected = vec![0; kernel.output_words(size)];
        ready.run(&mut expected);
        Checked { ready, out: vec![0; expected.len()], expected, fold: Fold::default() }
    }

    /// One run, compared and folded.
    ///
    /// # Panics
    /// When a word differs from the first run's.
    #[inline]
    pub fn run(&mut self) -> Fold {
        self.ready.run(&mut self.out);
        assert_eq!(first_difference(&self.out, &self.expected), None, "the same case gave another output");
        self.fold.push(&self.out);
        self.fold
    }
}
