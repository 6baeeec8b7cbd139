//! Whatever the order, one output; and a third party that takes a lock and spoils the record shows.

use super::super::common_meet::tests::{case, disturbed, every_variant_agrees};
use super::*;

#[test]
fn variants_and_runs_agree_whatever_the_order() {
    let out = every_variant_agrees(&Locks);
    let (rows, _) = out.as_chunks::<SHOWN>();
    for lock in 0..LOCKS {
        let (first, second) = (rows[lock], rows[LOCKS + lock]);
        assert_eq!((first[0], first[2]), (0, 2 * ROUNDS as u64), "lock {lock}");
        assert_eq!(first[2..], second[2..], "both see the same end");
        assert_ne!(first[1], second[1], "each role has operands of its own");
    }
}

/// A third party that takes the lock as role 0 would, and leaves the record as `spoil` makes it. Possible without a data
/// race only for the lock that does not care who takes it.
fn spoilt(spoil: impl Fn(&mut Record) + Sync) -> (Vec<u64>, Vec<u64>) {
    let right = every_variant_agrees(&Locks);
    let (shared, roles) = roles(&case(&Locks), Variant::Portable);
    let roles = roles.map(|role| Box::new(role) as Box<dyn Ready>);
    #[cfg(target_arch = "x86_64")]
    let a = super::super::common_atoms_x86::X86::baseline();
    #[cfg(target_arch = "aarch64")]
    let a = super::super::common_atoms_arm::Exclusive;
    let stray = || shared.swap.hold(a, 0, |_, record| spoil(record));
    let wrong = disturbed(roles, &right, &shared.meeting, 2000, stray).expect("a spoilt record shows");
    (right, wrong)
}

#[test]
fn one_flipped_bit_of_a_record_is_a_torn_record() {
    let (right, wrong) = spoilt(|record| record.words[17] ^= 1 << 63);
    let (right, wrong) = (right.as_chunks::<SHOWN>().0, wrong.as_chunks::<SHOWN>().0);
    let digests = (wrong[0][4], wrong[LOCKS][4]) != (right[0][4], right[LOCKS][4]);
    assert!(wrong[0][0] + wrong[LOCKS][0] > 0 || digests, "torn, or spoilt after the last update");
    assert_eq!((wrong[0][3], wrong[LOCKS][3]), (right[0][3], right[LOCKS][3]), "the sum was left alone");
    for lock in (1..LOCKS).chain(LOCKS + 1..2 * LOCKS) {
        assert_eq!(wrong[lock], right[lock], "other records were left alone");
    }
}

#[test]
fn a_whole_record_that_somebody_else_has_updated_shows_in_sum_and_chain() {
    let (right, wrong) = spoilt(|record| {
        record.words.iter_mut().for_each(|w| *w = w.wrapping_add(3));
        record.sum = record.sum.wrapping_add(3);
    });
    let (right, wrong) = (right.as_chunks::<SHOWN>().0, wrong.as_chunks::<SHOWN>().0);
    assert_eq!((wrong[0][0], wrong[LOCKS][0]), (0, 0), "no word is torn");
    assert!((wrong[0][3], wrong[LOCKS][3]) != (right[0][3], right[LOCKS][3]), "the sum, as one of them saw it");
}

#[test]
fn every_torn_word_is_counted() {
    let setup = Setup::draw(&mut Operands::new(&case(&Locks)));
    let mut record = setup.record();
    assert_eq!(setup.torn(&record), 0);
    record.count = 1;
    assert_eq!(setup.torn(&record), WORDS as u64, "a count that ran ahead");
    record.count = 0;
    record.sum ^= 1 << 40;
    assert_eq!(setup.torn(&record), WORDS as u64, "a sum that ran ahead");
    record.sum ^= 1 << 40;
    for i in 0..WORDS {
        for bit in 0..64 {
            record.words[i] ^= 1 << bit;
            assert_eq!(setup.torn(&record), 1, "word {i} bit {bit}");
            record.words[i] ^= 1 << bit;
        }
    }
}
