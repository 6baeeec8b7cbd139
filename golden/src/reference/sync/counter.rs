//! `sync.counter`: everything that commutes as a sum over both roles, every own bit in its role's order.

use kernels::Case;

use super::common_words::{chain, cut, mix};
use crate::reference::chacha::Stream;

const ROUNDS: usize = 32;

/// One role's operands of one width, round by round.
type Rounds = Vec<Vec<u64>>;

/// Digests of the bits that a role owns and of its piece.
fn own(role: u32, bits: u32, start: u64, piece: u64, rounds: &Rounds) -> (u64, u64, u64) {
    // one number for each bit, so that ownership is plain
    let mut row: Vec<bool> = (0..bits).map(|i| start >> i & 1 == 1).collect();
    let (mut digest, mut of_piece, mut piece) = (0, 0, piece);
    for x in rounds {
        let mine = |i: &u32| i % 2 == role;
        let mut look = |row: &[bool], old: bool| {
            let seen: u64 = (0..bits).filter(mine).map(|i| u64::from(row[i as usize]) << i).sum();
            // the old bit goes to the topmost bit that is the partner's
            digest = chain(digest, seen | u64::from(old) << (63 - role));
        };
        for i in (0..bits).filter(mine) {
            row[i as usize] |= x[4] >> i & 1 == 1;
        }
        look(&row, false);
        for i in (0..bits).filter(mine) {
            row[i as usize] &= x[5] >> i & 1 == 1;
        }
        look(&row, false);
        for i in (0..bits).filter(mine) {
            row[i as usize] ^= x[6] >> i & 1 == 1;
        }
        look(&row, false);
        for place in 0..3 {
            let i = ((x[7] >> (8 * place) & 0xffff_ffff) % u64::from(bits / 2) * 2 + u64::from(role)) as usize;
            let old = row[i];
            row[i] = match place {
                0 => true,
                1 => false,
                _ => !old,
            };
            look(&row, old);
        }
        let full = cut(u64::MAX, bits);
        piece = full - piece;
        of_piece = chain(of_piece, piece);
        piece = cut(full - piece + 1, bits);
        of_piece = chain(of_piece, piece);
    }
    let end = (0..bits).filter(|i| i % 2 == role).map(|i| u64::from(row[i as usize]) << i).sum();
    (digest, of_piece, end)
}

fn sum(words: impl Iterator<Item = u64>) -> u64 {
    words.fold(0, u64::wrapping_add)
}

/// The output words of role 0, then of role 1.
pub fn words(case: &Case) -> Vec<u64> {
    let mut stream = Stream::new(case);
    let starts = stream.words(44);
    let roles: Vec<Vec<Vec<u64>>> = (0..2).map(|_| (0..ROUNDS).map(|_| stream.words(47)).collect()).collect();
    let (mut digests, mut pieces, mut added) = ([vec![], vec![]], [vec![], vec![]], [vec![], vec![]]);
    let (mut ends, mut sums) = (vec![], vec![]);
    for width in 0..4 {
        let bits = 8u32 << width;
        let start: Vec<u64> = starts[10 * width..10 * width + 10].iter().map(|&w| cut(w, bits)).collect();
        let of: Vec<Rounds> =
            roles.iter().map(|role| role.iter().map(|x| x[11 * width..11 * width + 11].to_vec()).collect()).collect();
        let mut totals = [0u64; 4];
        let mut bits_end = 0;
        for role in 0..2 {
            let (digest, piece, end) = own(role as u32, bits, start[2], start[8 + role], &of[role]);
            digests[role].push(digest);
            pieces[role].push(piece);
            bits_end |= end;
            let mine = [
                sum(of[role].iter().map(|x| x[0].wrapping_add(x[1]).wrapping_add(2))),
                sum(of[role].iter().map(|x| x[2].wrapping_add(x[3]).wrapping_add(2))),
                sum(of[role].iter().map(|x| x[8])),
                sum(of[role].iter().map(|x| x[9])),
            ];
            for (total, x) in totals.iter_mut().zip(mine) {
                *total = total.wrapping_add(x);
                added[role].push(cut(x, bits));
            }
        }
        let taken = cut(start[5].wrapping_add(totals[2]), bits);
        let compared = cut(start[6].wrapping_add(totals[3]), bits);
        // 64 inversions, 64 negations: both values are back
        ends.extend([
            cut(start[0].wrapping_add(totals[0]), bits),
            cut(start[1].wrapping_sub(totals[1]), bits),
            bits_end,
            start[3],
            start[4],
            taken,
            compared,
        ]);
        sums.push(mix(taken).wrapping_sub(mix(start[5])));
        sums.push(mix(compared).wrapping_sub(mix(start[6])));
        let written = of.iter().flatten().map(|x| mix(cut(x[10], bits)));
        sums.push(mix(start[7]).wrapping_add(sum(written)));
    }
    let total = |place: usize| sum(roles.iter().flatten().map(|x| x[place]));
    let end = [
        starts[40].wrapping_add(2 * ROUNDS as u64),
        starts[41].wrapping_add(total(44)),
        starts[42].wrapping_add(total(45)),
        starts[43].wrapping_add(total(46)),
    ];
    let telescoped = |i: usize| mix(end[i]).wrapping_sub(mix(starts[40 + i]));
    let wide = [end[0], telescoped(0), end[1], telescoped(1), end[2], end[3], telescoped(2), telescoped(3)].to_vec();
    (0..2)
        .flat_map(|role| {
            [
                vec![0, 0],
                digests[role].clone(),
                pieces[role].clone(),
                added[role].clone(),
                ends.clone(),
                sums.clone(),
                wide.clone(),
            ]
            .concat()
        })
        .collect()
}
