//! Fisher's noncentral hypergeometric law: the first cell of a two-by-two table with all margins fixed and a given
//! odds ratio; at odds ratio 1 the plain hypergeometric law. Source: A. Agresti, Categorical Data Analysis, ch. 3.

use super::{Binomial, CountLaw};

#[derive(Debug, Clone, Copy)]
pub struct Hypergeometric {
    /// Row totals and the total of the first column.
    rows: [f64; 2],
    column: f64,
    ln_odds: f64,
    /// The most probable value and the sum of all weights over the weight there.
    mode: f64,
    total: f64,
    mean: f64,
}

impl Hypergeometric {
    pub fn new(rows: [f64; 2], column: f64, ln_odds: f64) -> Self {
        let mut law = Self { rows, column, ln_odds, mode: 0.0, total: 1.0, mean: 0.0 };
        let (mut low, mut high) = law.support();
        // the weights rise while the ratio of neighbours exceeds 1, and the ratio only falls
        while low < high {
            let middle = (0.5 * (low + high)).floor();
            if law.ratio_up(middle) > 1.0 { low = middle + 1.0 } else { high = middle }
        }
        law.mode = low;
        let (up, up_moment) = law.walk(low, 1.0);
        let (down, down_moment) = law.walk(low, -1.0);
        law.total = up + down - 1.0;
        law.mean = low + (up_moment - down_moment) / law.total;
        law
    }

    /// Least and most possible count.
    pub fn support(&self) -> (f64, f64) {
        ((self.column - self.rows[1]).max(0.0), self.rows[0].min(self.column))
    }

    /// weight(k + 1) / weight(k).
    fn ratio_up(&self, k: f64) -> f64 {
        let spare = self.rows[1] - self.column;
        ((self.rows[0] - k) / (k + 1.0)) * ((self.column - k) / (spare + k + 1.0)) * self.ln_odds.exp()
    }

    /// Sum of weights from k outwards over the weight of k, and its first moment about k. No cap on the terms: there
    /// are at most some nine standard deviations of them.
    fn walk(&self, k: f64, direction: f64) -> (f64, f64) {
        let (least, most) = self.support();
        let (mut sum, mut moment, mut term, mut j) = (1.0, 0.0, 1.0, k);
        loop {
            let next = j + direction;
            if next < least || next > most {
                return (sum, moment);
            }
            term *= if direction > 0.0 { self.ratio_up(j) } else { 1.0 / self.ratio_up(next) };
            if term <= 1e-20 * sum {
                return (sum, moment);
            }
            (sum, moment, j) = (sum + term, moment + term * (next - k).abs(), next);
        }
    }

    /// ln of the weight up to a constant: three binomials of one and the same probability (Loader 2000, section 5).
    fn ln_weight(&self, k: f64) -> f64 {
        let all = self.rows[0] + self.rows[1];
        let (p, q) = (self.column / all, (all - self.column) / all);
        let part = |n: f64, k: f64| Binomial { n, p, q }.ln_point(k);
        part(self.rows[0], k) + part(self.rows[1], self.column - k) + k * self.ln_odds
    }
}

impl CountLaw for Hypergeometric {
    fn mean(&self) -> f64 {
        self.mean
    }

    fn ln_point(&self, k: f64) -> f64 {
        let (least, most) = self.support();
        if least == most {
            return 0.0;
        }
        self.ln_weight(k) - self.ln_weight(self.mode) - self.total.ln()
    }

    fn above(&self, k: f64) -> f64 {
        self.walk(k, 1.0).0
    }

    fn below(&self, k: f64) -> f64 {
        self.walk(k, -1.0).0
    }
}
