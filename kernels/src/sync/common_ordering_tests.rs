//! Whatever the order, one output; stray stores show; and outcomes put in by hand are judged by the table.

use super::super::common_meet::tests::{case, disturbed, every_variant_agrees};
use super::*;

#[test]
fn variants_and_runs_agree_whatever_the_order() {
    let out = every_variant_agrees(&MemoryOrder);
    for (i, row) in out.as_chunks::<SHOWN>().0.iter().enumerate() {
        assert_eq!(row[..2], [0, 0], "{}", SHAPES[i % COUNT].name);
    }
}

#[test]
fn a_stray_store_shows_as_foreign_or_in_the_digest() {
    let right = every_variant_agrees(&MemoryOrder);
    let (shared, roles) = roles(&case(&MemoryOrder), Variant::Portable);
    let roles = roles.map(|role| Box::new(role) as Box<dyn Ready>);
    let stray = || {
        for arena in &shared.arenas {
            for places in &arena.places {
                places[0].value.fetch_xor(1 << 63, Ordering::Relaxed);
            }
        }
    };
    let wrong = disturbed(roles, &right, &shared.meeting, 2000, stray).expect("a stray store shows");
    let (right, wrong) = (right.as_chunks::<SHOWN>().0, wrong.as_chunks::<SHOWN>().0);
    let shapes: Vec<usize> = (0..2 * COUNT).filter(|&i| right[i] != wrong[i]).collect();
    assert!(shapes.iter().any(|&i| wrong[i][1] > 0 && wrong[i][2] != right[i][2]), "{wrong:?}");
}

/// Outcomes put into an arena by hand, as the roles would leave them.
fn judged(name: &str, role: usize, seen: [[u8; 2]; 2], ends: [u8; 2]) -> [u64; 2] {
    let (shared, _) = roles(&case(&MemoryOrder), Variant::Portable);
    let (number, shape) = SHAPES.iter().enumerate().find(|(_, s)| s.name == name).expect("a shape of the table");
    let (arena, bases) = (&shared.arenas[0], &shared.bases[number]);
    for (i, base) in bases.iter().enumerate() {
        for place in 0..2 {
            arena.places[i][place].value.store(base[place] ^ MARKS[ends[place] as usize], Ordering::Relaxed);
        }
        for who in 0..2 {
            for (register, place) in sources(&shape.threads[who]).into_iter().enumerate() {
                let base = place.map_or(0, |place| base[place as usize]);
                let word = base ^ MARKS[seen[who][register] as usize];
                arena.told[who].0[i][register].store(word, Ordering::Relaxed);
            }
        }
    }
    let [forbidden, foreign, _] = judge(shape, role, arena, bases);
    [forbidden, foreign]
}

#[test]
fn allowed_weak_outcomes_are_not_counted_and_forbidden_ones_are() {
    let all = TIMES as u64;
    for role in 0..2 {
        assert_eq!(judged("SB, nothing between", role, [[0, 0], [0, 0]], [1, 1]), [0, 0]);
        assert_eq!(judged("SB with forwarding", role, [[1, 0], [1, 0]], [1, 1]), [0, 0]);
        assert_eq!(judged("SB, full fences", role, [[0, 0], [0, 0]], [1, 1]), [all, 0]);
        assert_eq!(judged("MP, release and acquire", role, [[0, 0], [1, 0]], [1, 1]), [all, 0]);
        assert_eq!(judged("MP, release and acquire", role, [[0, 0], [0, 1]], [1, 1]), [0, 0]);
        assert_eq!(judged("LB, acquire", role, [[1, 0], [1, 0]], [1, 1]), [all, 0]);
        assert_eq!(judged("2+2W, releases", role, [[0, 0], [0, 0]], [1, 1]), [all, 0]);
        assert_eq!(judged("CoRR", role, [[0, 0], [1, 0]], [1, 0]), [all, 0]);
        // a write that got lost
        assert_eq!(judged("MP, release and acquire", role, [[0, 0], [1, 1]], [0, 1]), [all, 0]);
    }
}

#[test]
fn values_of_a_place_are_told_apart_and_others_are_foreign() {
    for base in [0, u64::MAX, MARKS[1], MARKS[2], MARKS[1] ^ MARKS[2], 0x0123_4567_89ab_cdef] {
        for (n, mark) in MARKS.iter().enumerate() {
            assert_eq!(number(base ^ mark, base), (n as u8, 0));
            for bit in 0..64 {
                let (foreign, odd) = number(base ^ mark ^ 1 << bit, base);
                assert_eq!((foreign, odd), (FOREIGN, mark ^ 1 << bit));
            }
        }
    }
}
