//! Whatever the order, one output; and stray writes of a third thread show where the file's head says.

use super::super::common_meet::tests::{case, disturbed, every_variant_agrees};
use super::*;

#[test]
fn variants_and_runs_agree_whatever_the_order() {
    let out = every_variant_agrees(&Counter);
    let (first, second) = out.split_at(HALF);
    assert_eq!(first[..2], [0, 0]);
    // what both see of the shared counters is the same
    assert_eq!(first[26..], second[26..]);
    assert!((2..26).all(|i| first[i] != second[i]), "each role has operands of its own");
}

fn stray(at: impl Fn(&Shared) + Sync) -> (Vec<u64>, Vec<u64>) {
    let right = every_variant_agrees(&Counter);
    let (shared, roles) = roles(&case(&Counter), Variant::Portable);
    let roles = roles.map(|role| Box::new(role) as Box<dyn Ready>);
    let wrong = disturbed(roles, &right, &shared.meeting, 2000, || at(&shared)).expect("a stray write shows");
    (right, wrong)
}

/// Words of the half that differ, without regard to whose.
fn differing(right: &[u64], wrong: &[u64]) -> Vec<usize> {
    let mut words: Vec<usize> = (0..2 * HALF).filter(|&i| right[i] != wrong[i]).map(|i| i % HALF).collect();
    words.sort_unstable();
    words.dedup();
    words
}

#[test]
fn a_stray_addition_shows_in_the_end_value() {
    let (right, wrong) = stray(|shared| {
        shared.quads.up.fetch_add(1 << 40, Ordering::Relaxed);
    });
    assert_eq!(differing(&right, &wrong), [47], "up in 64 bits");
}

#[test]
fn a_stray_exchange_shows_in_the_sum_over_both_roles() {
    let (right, wrong) = stray(|shared| {
        shared.doubles.swapped.store(7, Ordering::Relaxed);
    });
    assert_eq!(differing(&right, &wrong), [62], "swapped in 32 bits");
}

#[test]
fn a_stray_bit_shows_in_the_digest_of_its_owner_alone() {
    let (right, wrong) = stray(|shared| {
        // odd bits belong to role 1
        shared.words.bits.fetch_xor(0xaaaa, Ordering::Relaxed);
    });
    assert_eq!(right[3], wrong[3], "digest of role 0 in 16 bits");
    assert!(
        right[HALF + 3] != wrong[HALF + 3] || differing(&right, &wrong) == [35],
        "digest of role 1 or the end value"
    );
}

#[test]
fn a_ticket_handed_out_twice_shows() {
    let (right, wrong) = stray(|shared| {
        shared.ticket.0.fetch_sub(1, Ordering::Relaxed);
    });
    assert!(differing(&right, &wrong).contains(&66), "end of the ticket");
}
