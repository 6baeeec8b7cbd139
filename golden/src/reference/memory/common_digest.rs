//! The lane digest that the memory kernels share, one lane at a time.

/// a ← a + (v ⊕ ⌊v / 2³²⌋), b ← b + a; closed by a + F · b.
#[derive(Clone, Copy)]
pub struct Lane {
    a: u64,
    b: u64,
}

impl Lane {
    /// Starts with this a, and b zero.
    pub fn new(a: u64) -> Lane {
        Lane { a, b: 0 }
    }

    /// Takes one word in.
    pub fn push(&mut self, v: u64) {
        self.a = self.a.wrapping_add(v ^ (v / (1 << 32)));
        self.b = self.b.wrapping_add(self.a);
    }

    /// The digest's word.
    pub fn finish(self) -> u64 {
        self.a.wrapping_add(self.b.wrapping_mul(0xa24b_aed4_963e_e407))
    }
}
