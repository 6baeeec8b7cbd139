//! Which cpus work together in kernels for two: rounds in which every cpu has one partner.

/// The pairs of round `round` of `n` players: the circle method (Kirkman 1847; from memory). Over the rounds
/// 0 … n − 2 (n − 1 for odd n) everybody meets everybody once; with odd n one rests each round.
pub fn round(n: usize, round: usize) -> Vec<(usize, usize)> {
    if n < 2 {
        return Vec::new();
    }
    // a player who is not there makes the number even
    let even = n + n % 2;
    let circle = even - 1;
    let seat = |k: usize| (round + k) % circle;
    let mut pairs = vec![(circle, seat(0))];
    pairs.extend((1..even / 2).map(|k| (seat(k), seat(circle - k))));
    pairs.retain(|&(a, b)| a < n && b < n);
    pairs
}

/// Number of different rounds.
pub fn rounds(n: usize) -> usize {
    if n < 2 { 0 } else { n + n % 2 - 1 }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use super::*;

    #[test]
    fn everybody_meets_everybody_once() {
        for n in 0..20 {
            let mut met = BTreeSet::new();
            for r in 0..rounds(n) {
                let mut busy = BTreeSet::new();
                for (a, b) in round(n, r) {
                    assert!(a != b && busy.insert(a) && busy.insert(b), "n {n} round {r}");
                    assert!(met.insert((a.min(b), a.max(b))), "n {n}: {a} and {b} meet twice");
                }
            }
            assert_eq!(met.len(), n * n.saturating_sub(1) / 2, "n {n}");
        }
    }
}
