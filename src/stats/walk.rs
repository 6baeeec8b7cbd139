//! Counts of a Poisson process that wander between two boundaries: how likely each open count is, and what has left.
//!
//! Over a stretch without a change of the boundaries the open counts move on by the Poisson law, the same for all of
//! them; so a stretch takes its points and tails once, and one product of the two lists.

use super::law::{CountLaw, Poisson, Tail, WHOLE};

#[derive(Debug, Clone)]
pub struct Walk {
    rate: f64,
    now: f64,
    /// The least open count, and the probability of each from it on.
    first: usize,
    open: Vec<f64>,
    /// What has been accepted and rejected so far, and the mean exposure spent.
    pub accept: f64,
    pub reject: f64,
    pub exposure: f64,
}

impl Walk {
    /// No events yet, at the start.
    pub fn new(rate: f64) -> Self {
        Self { rate, now: 0.0, first: 0, open: vec![1.0], accept: 0.0, reject: 0.0, exposure: 0.0 }
    }

    /// The exposure that has been reached.
    pub fn now(&self) -> f64 {
        self.now
    }

    /// The least count that is open.
    pub fn first(&self) -> usize {
        self.first
    }

    /// On to an exposure of `to`, where event number `rejecting` and later ones reject.
    pub fn forward(&mut self, to: f64, rejecting: usize) {
        // counts that are already at the boundary leave at once
        let width = rejecting.saturating_sub(self.first);
        self.reject += self.open.drain(width.min(self.open.len())..).sum::<f64>();
        let Stretch { points, tails, waits } = Stretch::of(self.rate * (to - self.now), width);
        let mut next = vec![0.0; width];
        for (from, &share) in self.open.iter().enumerate() {
            for (slot, point) in next[from..].iter_mut().zip(&points) {
                *slot += share * point;
            }
            let escape = width - from;
            self.reject += share * tails[escape];
            self.exposure += share * waits[escape] / self.rate;
        }
        (self.open, self.now) = (next, to);
    }

    /// Accepts what has fewer than `accepting` events.
    pub fn accept_below(&mut self, accepting: usize) {
        let gone = accepting.saturating_sub(self.first).min(self.open.len());
        self.accept += self.open.drain(..gone).sum::<f64>();
        self.first = self.first.max(accepting);
    }

    /// Probabilities of acceptance and rejection if the plan ends at `end`, with event number `rejecting` as the last
    /// that rejects and all that is open then accepted.
    pub fn ended_at(&self, end: f64, rejecting: usize) -> (f64, f64) {
        let mut last = self.clone();
        last.forward(end, rejecting);
        last.accept_below(rejecting);
        (last.accept, last.reject)
    }
}

/// P(X = j) for j below a width, P(X ≥ j) up to it, and the sums of the latter from 1 on, over one stretch.
/// The mean time with j further events is P(more than j come) / rate.
struct Stretch {
    points: Vec<f64>,
    tails: Vec<f64>,
    waits: Vec<f64>,
}

impl Stretch {
    fn of(mean: f64, width: usize) -> Self {
        let (law, mut points, mut tails) = (Poisson { mean }, vec![0.0; width], vec![0.0; width + 1]);
        tails[0] = 1.0;
        if mean <= 0.0 {
            points.iter_mut().take(1).for_each(|point| *point = 1.0);
        } else if width > 0 {
            // from the most probable count outwards, where the terms only fall
            let mode = (mean.floor() as usize).min(width - 1);
            points[mode] = law.ln_point(mode as f64).exp();
            for j in mode + 1..width {
                points[j] = points[j - 1] * (mean / j as f64);
            }
            for j in (0..mode).rev() {
                points[j] = points[j + 1] * ((j + 1) as f64 / mean);
            }
            tails[width] = law.ln_tail(Tail::Upper, width as f64, WHOLE).exp();
            for j in (1..width).rev() {
                tails[j] = tails[j + 1] + points[j];
            }
        }
        let mut sum = 0.0;
        let waits = tails
            .iter()
            .enumerate()
            .map(|(j, tail)| {
                sum += if j > 0 { *tail } else { 0.0 };
                sum
            })
            .collect();
        Self { points, tails, waits }
    }
}
