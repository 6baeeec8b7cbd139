//! Wrong words by hand: what counts once, what is left out, what a wrap is.

use super::*;
use crate::event::{Job, Surroundings, WrongWord};
use crate::host::Cpu;

fn mismatch(slice: u64, seed: u64, words: &[(usize, u64, u64)]) -> Mismatch {
    Mismatch {
        job_id: 1,
        job: Job::Window,
        slice,
        purpose: Purpose::Plan,
        cpu: Cpu(3),
        core: 1,
        kernel: "fma.chain64".into(),
        variant: "avx2".into(),
        seed: Some(seed),
        size: 22,
        condition: "solo".into(),
        wall_ms: 1,
        run: slice,
        noticed_by: NoticedBy::Comparison,
        wrong_words: words.len() as u64,
        words: words.iter().map(|&(i, e, a)| WrongWord::new(i, e, a)).collect(),
        previous_kernel: Some("cipher.aes".into()),
        neighbours: vec![],
        surroundings: Surroundings { celsius: Some(60.0 + slice as f64), khz: None },
        partner: None,
    }
}

fn layout(_: &str, _: u32) -> Layout {
    Layout { words: Some(8), element: Element::Binary64 }
}

fn gathered(mismatches: &[Mismatch]) -> SeatWords {
    let mut words = Words::new(layout);
    mismatches.iter().for_each(|m| words.add(m));
    words.seats.into_values().next().unwrap()
}

#[test]
fn the_same_wrong_word_counts_once_and_repeats_for_confirmation_never() {
    let seat = gathered(&[
        mismatch(1, 7, &[(2, 0b0101, 0b0111)]),
        mismatch(1, 7, &[(2, 0b0101, 0b0111)]),
        mismatch(2, 7, &[(2, 0b0101, 0b0001), (3, 1, 0)]),
        Mismatch { purpose: Purpose::Suspect, ..mismatch(3, 7, &[(0, 0, 9)]) },
        Mismatch { purpose: Purpose::Control, ..mismatch(4, 7, &[(0, 0, 9)]) },
        Mismatch { noticed_by: NoticedBy::Fold, seed: None, words: vec![], wrong_words: 0, ..mismatch(5, 0, &[]) },
    ]);
    assert_eq!((seat.of_repeats, seat.of_controls), (1, 1));
    let all = &seat.all;
    assert_eq!((all.mismatches, all.by_fold, all.one_word, all.several_words), (4, 1, 2, 1));
    assert_eq!((all.words, all.distinct), (4, 3));
    assert_eq!((all.bits.flips[..4].to_vec(), all.bits.raised[..4].to_vec()), (vec![1, 1, 1, 0], vec![0, 1, 0, 0]));
    assert_eq!(all.bits.flipped[1], 3);
    assert_eq!((all.masks.distinct(), all.differences.commonest()), (3, Some((-4, 1))));
    assert_eq!((all.cases.len(), all.failed_again(), all.parity()), (1, 1, (0, 1)));
    assert_eq!((all.runs, all.first_runs), (Some((1, 2)), 0));
    assert_eq!((all.celsius.number, all.celsius.lowest, all.celsius.highest), (4, 61.0, 65.0));
    assert_eq!(all.previous["cipher.aes"], 4);
    // one case, placed by its first mismatch
    assert_eq!(all.places.cases, 1);
    assert_eq!(seat.kernels["fma.chain64"].mismatches, 4);
}

#[test]
fn differences_wrap_as_sums_do_and_halves_stand_alone() {
    let seat = gathered(&[mismatch(1, 1, &[(0, 0, u64::MAX), (1, 5, 4)])]);
    assert_eq!(seat.all.differences.commonest(), Some((-1, 2)));
    assert_eq!(seat.all.half_masks.total(), 1, "the other one flips in both halves");
    let seat = gathered(&[mismatch(1, 1, &[(0, 1 << 32, 0xffff_ffff << 32), (1, 2, 0)])]);
    assert_eq!((seat.all.half_differences.distinct(), seat.all.half_differences.commonest()), (1, Some((-2, 2))));
    assert_eq!(seat.all.masks.distinct(), 2);
}

/// Bits of binary64 by IEEE 754-2019, table 3.5: 52 of trailing significand, 11 of exponent, one sign; binary32: 23, 8, 1.
#[test]
fn parts_of_numbers_are_told_apart() {
    let mut parts = Parts::default();
    [1, 1 << 51, 1 << 52, 1 << 62, 1 << 63, 1 << 63 | 1, 0].iter().for_each(|x| parts.add(*x, 52, 11));
    assert_eq!(parts, Parts { numbers: 6, sign: 2, exponent: 2, fraction: 3 });
    let mut parts = Parts::default();
    [1 << 22, 1 << 23, 1 << 30, 1 << 31].iter().for_each(|x| parts.add(*x, 23, 8));
    assert_eq!(parts, Parts { numbers: 4, sign: 1, exponent: 2, fraction: 1 });
}

#[test]
fn memory_is_bounded_and_the_rest_is_numbered() {
    let mut words = Words::new(layout);
    for seed in 0..ROOM as u64 {
        words.add(&mismatch(1, seed, &[(0, seed, seed ^ 1 << (seed % 60))]));
    }
    let seat = words.seats.into_values().next().unwrap();
    let all = &seat.all;
    assert_eq!((seat.room, all.mismatches), (0, ROOM as u64));
    assert!(all.not_looked_at > 0 && all.distinct + all.not_looked_at >= ROOM as u64);
    assert!(all.cases.len() + all.seen.len() + seat.kernels["fma.chain64"].cases.len() <= ROOM);
}

#[test]
fn words_that_are_no_numbers_are_passed_over() {
    let mut bad = mismatch(1, 1, &[(0, 1, 2)]);
    bad.words[0].actual = "no number".into();
    let seat = gathered(&[bad]);
    assert_eq!((seat.all.mismatches, seat.all.words, seat.all.places.cases), (1, 0, 0));
}
