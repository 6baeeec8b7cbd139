//! `sync.counter` in one width: the counters, one round of one role on them, and what it has seen.

use super::common_atoms::{Locked, Width};
use super::common_meet::{chain, mix};

/// Operand words of one width in a round.
pub const FORMS: usize = 11;
/// Starts of one width.
pub const STARTS: usize = 10;

/// The counters of one width.
#[repr(C, align(64))]
#[derive(Debug)]
pub struct Cells<W: Width> {
    pub up: W::Cell,
    pub down: W::Cell,
    pub bits: W::Cell,
    pub not: W::Cell,
    pub neg: W::Cell,
    pub taken: W::Cell,
    pub compared: W::Cell,
    pub swapped: W::Cell,
    pub pieces: [W::Cell; 2],
}

impl<W: Width> Cells<W> {
    pub fn new() -> Cells<W> {
        let [up, down, bits, not, neg, taken, compared, swapped, a, b] = std::array::from_fn(|_| W::cell(W::cut(0)));
        Cells { up, down, bits, not, neg, taken, compared, swapped, pieces: [a, b] }
    }

    pub fn start(&self, from: &[u64]) {
        let Cells { up, down, bits, not, neg, taken, compared, swapped, pieces: [a, b] } = self;
        for (cell, &word) in [up, down, bits, not, neg, taken, compared, swapped, a, b].into_iter().zip(from) {
            W::store(cell, W::cut(word));
        }
    }
}

/// What one role has seen in one width.
#[derive(Clone, Copy, Default)]
pub struct Seen {
    pub own_bits: u64,
    pub piece: u64,
    /// up, down, taken, compared
    pub added: [u64; 4],
    /// Sums of h: taken, compared, swapped.
    pub sums: [u64; 3],
}

/// One round in one width.
#[inline(always)]
pub fn round<W: Width, A: Locked<W>>(
    a: A,
    cells: &Cells<W>,
    role: usize,
    x: &[u64],
    foreign: &mut u64,
    seen: &mut Seen,
) {
    let own = 0x5555_5555_5555_5555 << role;
    let [add, adc, sub, sbb, or, and, xor, numbers, take, compare, swap] = *x else {
        unreachable!("a round of one width has {FORMS} words");
    };
    a.add(&cells.up, W::cut(add));
    a.inc(&cells.up);
    a.adc(&cells.up, W::cut(adc));

    let bit = |place: u32| (numbers >> (8 * place)) as u32 % (W::BITS / 2) * 2 + role as u32;
    let mut look = |old: bool| {
        seen.own_bits = chain(seen.own_bits, W::load(&cells.bits).word() & own | u64::from(old) << 63 >> role)
    };
    a.or(&cells.bits, W::cut(or & own));
    look(false);
    a.and(&cells.bits, W::cut(and | !own));
    look(false);
    a.xor(&cells.bits, W::cut(xor & own));
    look(false);
    look(a.set(&cells.bits, bit(0)));
    look(a.clear(&cells.bits, bit(1)));
    look(a.toggle(&cells.bits, bit(2)));

    a.sub(&cells.down, W::cut(sub));
    a.dec(&cells.down);
    a.sbb(&cells.down, W::cut(sbb));

    let before = W::load(&cells.not).word();
    a.not(&cells.not);
    let after = W::load(&cells.not).word();
    *foreign += u64::from(after != before && after != W::cut(!before).word());
    let before = W::load(&cells.neg).word();
    a.neg(&cells.neg);
    let after = W::load(&cells.neg).word();
    *foreign += u64::from(after != before && after != W::cut(before.wrapping_neg()).word());

    a.not(&cells.pieces[role]);
    seen.piece = chain(seen.piece, W::load(&cells.pieces[role]).word());
    a.neg(&cells.pieces[role]);
    seen.piece = chain(seen.piece, W::load(&cells.pieces[role]).word());

    let next = |old: W, x: u64| W::cut(old.word().wrapping_add(x)).word();
    let old = a.exchange_add(&cells.taken, W::cut(take));
    seen.sums[0] = seen.sums[0].wrapping_add(mix(next(old, take))).wrapping_sub(mix(old.word()));
    let old = a.compare_add(&cells.compared, W::cut(compare));
    seen.sums[1] = seen.sums[1].wrapping_add(mix(next(old, compare))).wrapping_sub(mix(old.word()));
    let old = a.swap(&cells.swapped, W::cut(swap));
    seen.sums[2] = seen.sums[2].wrapping_add(mix(old.word()));

    let added = [add.wrapping_add(adc).wrapping_add(2), sub.wrapping_add(sbb).wrapping_add(2), take, compare];
    for (sum, x) in seen.added.iter_mut().zip(added) {
        *sum = sum.wrapping_add(x);
    }
}

/// The end values of one width but for `swapped`.
pub fn ends<W: Width>(cells: &Cells<W>) -> [u64; 7] {
    let Cells { up, down, bits, not, neg, taken, compared, .. } = cells;
    [up, down, bits, not, neg, taken, compared].map(|cell| W::load(cell).word())
}
