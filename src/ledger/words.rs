//! Bits, lanes and operands of wrong outputs, gathered by the cpu, or the two together, that gave them, and by kernel.
//!
//! Mismatches of the plan are counted; those of repeats for confirmation were chosen because the case had failed, so they
//! are only numbered. A wrong word that comes out of the same case at the same place in the same way again is one word:
//! bits, XORs and differences are of *distinct* wrong words. Memory is bounded: once [`ROOM`] different things of a
//! cpu are remembered, new ones are numbered and not looked at.

use std::collections::BTreeMap;
use std::hash::{BuildHasher, BuildHasherDefault, Hash};

use rustc_hash::{FxHashMap, FxHashSet, FxHasher};

use crate::event::{Mismatch, NoticedBy, Purpose};
use crate::ledger::places::{Places, half};
use crate::ledger::wrongs::Seat;

/// Different words, masks, differences and cases that are remembered of one cpu.
pub const ROOM: usize = 100_000;

/// What a kernel's output words hold.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Element {
    /// Sums, digests, counters, mixtures: bits without a meaning of their own.
    #[default]
    Unknown,
    /// One binary64 number a word.
    Binary64,
    /// Two binary32 numbers a word.
    TwoBinary32,
}

/// How a kernel lays out its output.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Layout {
    /// Words of one output; `None` for a kernel that this program does not know.
    pub words: Option<u64>,
    /// What they hold.
    pub element: Element,
}

/// The layout of a kernel's output at a footprint in KiB.
pub type LayoutOf = fn(kernel: &str, size: u32) -> Layout;

/// How often each of several things was seen.
#[derive(Clone, Debug, Default)]
pub struct Counted<T> {
    counts: FxHashMap<T, u64>,
}

impl<T: Copy + Ord + Hash> Counted<T> {
    fn add(&mut self, thing: T, room: &mut usize) {
        if let Some(count) = self.counts.get_mut(&thing) {
            *count += 1;
        } else if take(room) {
            self.counts.insert(thing, 1);
        }
    }

    /// Different ones.
    pub fn distinct(&self) -> u64 {
        self.counts.len() as u64
    }

    /// The one seen most often, the smallest of several, and how often.
    pub fn commonest(&self) -> Option<(T, u64)> {
        self.counts.iter().map(|(t, n)| (*t, *n)).max_by(|a, b| a.1.cmp(&b.1).then(b.0.cmp(&a.0)))
    }

    /// How often anything was seen.
    pub fn total(&self) -> u64 {
        self.counts.values().sum()
    }
}

fn take(room: &mut usize) -> bool {
    let free = *room > 0;
    *room -= usize::from(free);
    free
}

/// Flips by bit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Bits {
    /// Flips of each bit, the lowest first.
    pub flips: [u64; 64],
    /// Of these, from 0 to 1.
    pub raised: [u64; 64],
    /// Words by the number of their flipped bits.
    pub flipped: [u64; 65],
}

impl Default for Bits {
    fn default() -> Bits {
        Bits { flips: [0; 64], raised: [0; 64], flipped: [0; 65] }
    }
}

/// Which parts of floating-point numbers were hit; a number may count in several.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, serde::Serialize)]
pub struct Parts {
    /// Wrong numbers whose layout is known.
    pub numbers: u64,
    /// Sign.
    pub sign: u64,
    /// Exponent.
    pub exponent: u64,
    /// Fraction.
    pub fraction: u64,
}

impl Parts {
    fn add(&mut self, xor: u64, fraction: u32, exponent: u32) {
        if xor == 0 {
            return;
        }
        let hit = |low: u32, bits: u32| u64::from((xor >> low) & ((1 << bits) - 1) != 0);
        self.numbers += 1;
        self.fraction += hit(0, fraction);
        self.exponent += hit(fraction, exponent);
        self.sign += hit(fraction + exponent, 1);
    }
}

/// Readings in °C.
#[derive(Clone, Copy, Debug, Default, PartialEq, serde::Serialize)]
pub struct Readings {
    /// How many.
    pub number: u64,
    /// Their mean.
    pub mean: f64,
    /// The lowest.
    pub lowest: f64,
    /// The highest.
    pub highest: f64,
}

impl Readings {
    fn add(&mut self, value: f64) {
        if !value.is_finite() {
            return;
        }
        (self.lowest, self.highest) =
            if self.number == 0 { (value, value) } else { (self.lowest.min(value), self.highest.max(value)) };
        self.number += 1;
        self.mean += (value - self.mean) / self.number as f64;
    }
}

/// A case that failed.
#[derive(Clone, Copy, Debug, Default)]
pub struct FailedCase {
    /// Mismatches.
    pub mismatches: u64,
    /// Slices in which it failed.
    pub slices: u64,
    last: (u64, u64),
    placed: bool,
    odd: bool,
}

/// What is known of some mismatches.
#[derive(Clone, Debug, Default)]
pub struct WordStats {
    /// Mismatches of the plan with a record of their own.
    pub mismatches: u64,
    /// Noticed by the fold alone: the worker's comparison had let them pass, and no word is on record.
    pub by_fold: u64,
    /// With one wrong word.
    pub one_word: u64,
    /// With several.
    pub several_words: u64,
    /// Wrong words on record.
    pub words: u64,
    /// Wrong words that were counted by the worker and are not on record.
    pub words_not_kept: u64,
    /// Distinct wrong words on record.
    pub distinct: u64,
    /// Their bits.
    pub bits: Bits,
    /// Their XORs.
    pub masks: Counted<u64>,
    /// Their differences, actual − expected, modulo 2⁶⁴ with the sign that makes them small: sums wrap.
    pub differences: Counted<i64>,
    /// Those of words whose flips lie in one half, taken as words of 32 bits.
    pub half_masks: Counted<u64>,
    /// Likewise, modulo 2³².
    pub half_differences: Counted<i32>,
    /// Floating-point numbers among them.
    pub parts: Parts,
    /// Lanes of failing cases.
    pub places: Places,
    /// Failing cases.
    pub cases: FxHashMap<u64, FailedCase>,
    /// First and last number of a wrong run within its case.
    pub runs: Option<(u64, u64)>,
    /// Wrong in the first run of the case.
    pub first_runs: u64,
    /// At mismatches.
    pub celsius: Readings,
    /// Kernels that had run before.
    pub previous: BTreeMap<String, u64>,
    /// Words and cases that there was no room for.
    pub not_looked_at: u64,
    seen: FxHashSet<u64>,
}

fn hash(thing: impl Hash) -> u64 {
    BuildHasherDefault::<FxHasher>::default().hash_one(thing)
}

impl WordStats {
    /// Cases that failed in more than one slice.
    pub fn failed_again(&self) -> u64 {
        self.cases.values().filter(|c| c.slices > 1).count() as u64
    }

    /// Failing cases with an even seed, and with an odd one.
    pub fn parity(&self) -> (u64, u64) {
        let odd = self.cases.values().filter(|c| c.odd).count() as u64;
        (self.cases.len() as u64 - odd, odd)
    }

    fn add(&mut self, m: &Mismatch, layout: Layout, room: &mut usize) {
        self.mismatches += 1;
        self.by_fold += u64::from(m.noticed_by == NoticedBy::Fold);
        self.one_word += u64::from(m.wrong_words == 1);
        self.several_words += u64::from(m.wrong_words > 1);
        self.words_not_kept += m.wrong_words.saturating_sub(m.words.len() as u64);
        if m.noticed_by == NoticedBy::Comparison {
            let (least, most) = self.runs.unwrap_or((m.run, m.run));
            self.runs = Some((least.min(m.run), most.max(m.run)));
            self.first_runs += u64::from(m.run == 0);
        }
        m.surroundings.celsius.iter().for_each(|c| self.celsius.add(*c));
        if let Some(before) = &m.previous_kernel {
            if let Some(count) = self.previous.get_mut(before) {
                *count += 1;
            } else if take(room) {
                self.previous.insert(before.clone(), 1);
            }
        }
        let mut words = Vec::with_capacity(m.words.len());
        for word in &m.words {
            let parse = |text: &str| u64::from_str_radix(text, 16).ok();
            if let (Some(expected), Some(actual)) = (parse(&word.expected), parse(&word.actual))
                && expected != actual
            {
                self.words += 1;
                self.word(m, word.index, expected, actual, layout.element, room);
                words.push((word.index, expected ^ actual));
            }
        }
        self.case(m, &words, layout, room);
    }

    fn word(&mut self, m: &Mismatch, index: u64, expected: u64, actual: u64, element: Element, room: &mut usize) {
        let key = hash((&m.kernel, m.size, m.seed, index, expected, actual));
        if self.seen.contains(&key) {
            return;
        }
        if !take(room) {
            self.not_looked_at += 1;
            return;
        }
        self.seen.insert(key);
        self.distinct += 1;
        let xor = expected ^ actual;
        for bit in (0..64).filter(|bit| xor >> bit & 1 == 1) {
            self.bits.flips[bit] += 1;
            self.bits.raised[bit] += actual >> bit & 1;
        }
        self.bits.flipped[xor.count_ones() as usize] += 1;
        self.masks.add(xor, room);
        self.differences.add(actual.wrapping_sub(expected).cast_signed(), room);
        if let Some(half) = half(xor) {
            let narrow = |word: u64| (word >> (32 * half)) as u32;
            self.half_masks.add(xor >> (32 * half), room);
            self.half_differences.add(narrow(actual).wrapping_sub(narrow(expected)).cast_signed(), room);
        }
        match element {
            Element::Unknown => {}
            Element::Binary64 => self.parts.add(xor, 52, 11),
            Element::TwoBinary32 => [xor & 0xffff_ffff, xor >> 32].iter().for_each(|x| self.parts.add(*x, 23, 8)),
        }
    }

    fn case(&mut self, m: &Mismatch, words: &[(u64, u64)], layout: Layout, room: &mut usize) {
        let Some(seed) = m.seed else { return };
        let key = hash((&m.kernel, m.size, seed));
        if !self.cases.contains_key(&key) && !take(room) {
            self.not_looked_at += 1;
            return;
        }
        let case = self.cases.entry(key).or_default();
        let slice = (m.job_id, m.slice);
        case.slices += u64::from(case.mismatches == 0 || case.last != slice);
        case.mismatches += 1;
        case.last = slice;
        case.odd = seed % 2 == 1;
        if let (false, Some(output)) = (case.placed, layout.words)
            && m.wrong_words == words.len() as u64
            && !words.is_empty()
        {
            case.placed = true;
            self.places.add(words, output);
        }
    }
}

/// What one cpu, or two together, gave.
#[derive(Clone, Debug)]
pub struct SeatWords {
    /// All kernels together.
    pub all: WordStats,
    /// By kernel.
    pub kernels: BTreeMap<String, WordStats>,
    /// Mismatches of repeats on the suspect, which are in none of these.
    pub of_repeats: u64,
    /// Mismatches of control legs, which are in none of these.
    pub of_controls: u64,
    room: usize,
}

impl Default for SeatWords {
    fn default() -> SeatWords {
        SeatWords { all: WordStats::default(), kernels: BTreeMap::new(), of_repeats: 0, of_controls: 0, room: ROOM }
    }
}

/// By cpu or pair.
#[derive(Clone, Debug)]
pub struct Words {
    layout: LayoutOf,
    /// Who gave wrong words.
    pub seats: BTreeMap<Seat, SeatWords>,
}

impl Words {
    /// Nothing yet.
    pub fn new(layout: LayoutOf) -> Words {
        Words { layout, seats: BTreeMap::new() }
    }

    /// Takes a mismatch of a job that counts.
    pub(super) fn add(&mut self, m: &Mismatch) {
        let seat = self.seats.entry(Seat { cpu: m.cpu, partner: m.partner }).or_default();
        match m.purpose {
            Purpose::Suspect => seat.of_repeats += 1,
            Purpose::Control => seat.of_controls += 1,
            Purpose::Plan => {
                let layout = (self.layout)(&m.kernel, m.size);
                seat.all.add(m, layout, &mut seat.room);
                if !seat.kernels.contains_key(&m.kernel) && take(&mut seat.room) {
                    seat.kernels.insert(m.kernel.clone(), WordStats::default());
                }
                if let Some(stats) = seat.kernels.get_mut(&m.kernel) {
                    stats.add(m, layout, &mut seat.room);
                }
            }
        }
    }
}

#[cfg(test)]
#[path = "words_tests.rs"]
mod tests;
