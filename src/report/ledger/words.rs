//! Bits, lanes and operands of wrong outputs, as a document. What they suggest is said by `sentences`, and `words_text`
//! writes them for people.

use std::collections::BTreeMap;

use serde::Serialize;

use super::analysis::{self, ConditionTest, HeatTest, LaneTest};
use crate::host::Cpu;
use crate::ledger::View;
use crate::ledger::words::{Counted, Parts, Readings, SeatWords, WordStats, Words};
use crate::ledger::wrongs::{Seat, Wrongs};

/// Distinct values, and the commonest one.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Values {
    /// Different ones.
    pub distinct: u64,
    /// XORs in hexadecimal, differences in decimal.
    pub commonest: Option<String>,
    /// How often that one was seen.
    pub times: u64,
    /// All that were looked at.
    pub of: u64,
}

impl Values {
    fn of<T: Copy + Ord + std::hash::Hash>(counted: &Counted<T>, write: impl Fn(T) -> String) -> Values {
        let commonest = counted.commonest();
        Values {
            distinct: counted.distinct(),
            commonest: commonest.map(|(value, _)| write(value)),
            times: commonest.map_or(0, |(_, times)| times),
            of: counted.total(),
        }
    }

    /// Nine of ten are the same.
    pub fn one(&self) -> bool {
        self.of > 0 && self.times * 10 >= self.of * 9
    }
}

/// What is known of some mismatches.
#[derive(Clone, Debug, Serialize)]
pub struct WordFigures {
    pub mismatches: u64,
    pub by_comparison: u64,
    pub by_fold: u64,
    pub one_word: u64,
    pub several_words: u64,
    pub words: u64,
    pub words_not_kept: u64,
    pub distinct_words: u64,
    pub flips: Vec<u64>,
    pub flips_to_one: Vec<u64>,
    pub one_bit: u64,
    pub two_bits: u64,
    pub more_bits: u64,
    /// Bits of the words that masks and differences are of: 32 where all flips of each word lie in one half.
    pub word_bits: u32,
    pub xor: Values,
    pub difference: Values,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub float_parts: Option<Parts>,
    pub lane: Option<LaneTest>,
    pub cases_failed: u64,
    pub cases_failed_again: u64,
    pub even_seeds: u64,
    pub odd_seeds: u64,
    pub first_and_last_run: Option<(u64, u64)>,
    pub in_first_run: u64,
    pub celsius: Readings,
    pub previous_kernels: BTreeMap<String, u64>,
    pub not_looked_at: u64,
}

impl WordFigures {
    fn of(s: &WordStats) -> WordFigures {
        let halves = s.distinct > 0 && s.half_masks.total() == s.distinct;
        let (xor, difference) = if halves {
            (Values::of(&s.half_masks, |m| format!("{m:08x}")), Values::of(&s.half_differences, |d| d.to_string()))
        } else {
            (Values::of(&s.masks, |m| format!("{m:016x}")), Values::of(&s.differences, |d| d.to_string()))
        };
        let (even_seeds, odd_seeds) = s.parity();
        WordFigures {
            mismatches: s.mismatches,
            by_comparison: s.mismatches - s.by_fold,
            by_fold: s.by_fold,
            one_word: s.one_word,
            several_words: s.several_words,
            words: s.words,
            words_not_kept: s.words_not_kept,
            distinct_words: s.distinct,
            flips: s.bits.flips.to_vec(),
            flips_to_one: s.bits.raised.to_vec(),
            one_bit: s.bits.flipped[1],
            two_bits: s.bits.flipped[2],
            more_bits: s.bits.flipped[3..].iter().sum(),
            word_bits: if halves { 32 } else { 64 },
            xor,
            difference,
            float_parts: (s.parts.numbers > 0).then_some(s.parts),
            lane: analysis::lanes(&s.places),
            cases_failed: s.cases.len() as u64,
            cases_failed_again: s.failed_again(),
            even_seeds,
            odd_seeds,
            first_and_last_run: s.runs,
            in_first_run: s.first_runs,
            celsius: s.celsius,
            previous_kernels: s.previous.clone(),
            not_looked_at: s.not_looked_at,
        }
    }

    /// Flips of all bits together, and those from 0 to 1.
    pub fn directions(&self) -> (u64, u64) {
        (self.flips.iter().sum(), self.flips_to_one.iter().sum())
    }
}

/// Wrong outputs of one cpu, or of two together.
#[derive(Clone, Debug, Serialize)]
pub struct WordsLine {
    pub cpu: Cpu,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub partner: Option<Cpu>,
    /// Wrong runs in slices; workers send the first few of a slice in full.
    pub wrong_runs: u64,
    /// Mismatches of repeats for confirmation, in none of the figures.
    pub of_repeats: u64,
    /// Likewise of control legs on this cpu.
    pub of_controls: u64,
    pub all: WordFigures,
    pub kernels: BTreeMap<String, WordFigures>,
    /// Cases that slices ran; one that several slices ran counts in each.
    pub cases_run: u64,
    pub conditions: Vec<ConditionTest>,
    pub heat: Option<HeatTest>,
    /// Runs of repeats on this core for confirmation, and wrong ones among them.
    pub repeats: (u64, u64),
    /// In plain words, what this suggests and what it cannot; `sentences` finds them.
    pub suggests: Vec<String>,
}

/// Of every cpu and pair with mismatches.
pub fn lines(view: &View, words: &Words, wrongs: &Wrongs, only: Option<Cpu>, gap_ms: u64) -> Vec<WordsLine> {
    let wanted = |seat: &Seat| only.is_none_or(|c| c == seat.cpu || Some(c) == seat.partner);
    words.seats.iter().filter(|(seat, _)| wanted(seat)).map(|(seat, s)| line(view, seat, s, wrongs, gap_ms)).collect()
}

fn line(view: &View, seat: &Seat, words: &SeatWords, wrongs: &Wrongs, gap_ms: u64) -> WordsLine {
    let narrow = |n: u128| u64::try_from(n).unwrap_or(u64::MAX);
    let nothing = crate::ledger::wrongs::Work::default();
    let work = wrongs.seats.get(seat).unwrap_or(&nothing);
    let episodes = work.episodes(gap_ms);
    let findings = view.tally.cpus.get(&seat.cpu).map_or(&[][..], |t| &t.findings);
    let legs = findings.iter().filter(|f| f.partner == seat.partner).flat_map(|f| &f.suspect);
    WordsLine {
        cpu: seat.cpu,
        partner: seat.partner,
        wrong_runs: narrow(work.mismatches),
        of_repeats: words.of_repeats,
        of_controls: words.of_controls,
        all: WordFigures::of(&words.all),
        kernels: words.kernels.iter().map(|(id, s)| (id.clone(), WordFigures::of(s))).collect(),
        cases_run: narrow(work.cases),
        conditions: analysis::conditions(wrongs, work, &episodes),
        heat: analysis::heat(work, &episodes),
        repeats: legs.fold((0, 0), |(runs, wrong), l| (runs + l.runs, wrong + l.mismatches)),
        suggests: Vec::new(),
    }
}
