//! What the words of wrong outputs suggest, and what they cannot, in a few plain sentences.
//!
//! A fixed amount added or lost gives one difference and many XORs: an adder, a carry, a partial product. A line or a latch
//! that is stuck or flips gives one XOR and many differences. Source of the distinction: the published dot product whose two
//! wrong words were both off by −1020 with different XORs (a test of this project holds it); that single flipped bits
//! are what a stuck line makes is common practice, no source.

use super::analysis::{SMALL, p_text};
use super::words::{WordFigures, WordsLine};
use crate::report::figures::short;

/// Fewer mismatches with words on record than this say nothing about bits, lanes and conditions.
const FEW: u64 = 5;

/// The sentences, at most five.
pub fn of(line: &WordsLine) -> Vec<String> {
    let a = &line.all;
    let mut said: Vec<String> = Vec::new();
    let with_words = a.one_word + a.several_words;
    said.extend(arithmetic(a));
    if with_words < FEW {
        said.push(format!(
            "{with_words} mismatch{} with words on record {} too few to say anything about bits, lanes or conditions.",
            if with_words == 1 { "" } else { "es" },
            if with_words == 1 { "is" } else { "are" }
        ));
        return said;
    }
    said.extend(lane(a));
    said.extend(surroundings(line));
    said.extend(repetition(a));
    said.push(limits(line));
    said
}

fn arithmetic(a: &WordFigures) -> Option<String> {
    if a.distinct_words == 0 {
        return None;
    }
    let (Some(mask), Some(difference)) = (&a.xor.commonest, &a.difference.commonest) else { return None };
    if a.distinct_words == 1 {
        return Some(format!(
            "One wrong word is on record (XOR {mask}, difference {difference}): it cannot tell an arithmetic error from a \
             flipped line."
        ));
    }
    let said = match (a.difference.one(), a.xor.one()) {
        (true, false) => format!(
            "The difference is {difference} in {} of {} wrong words while their XORs vary ({} of them): that suggests a fixed \
             amount added or lost, as by an adder, a carry or a multiplier's partial product, and not one stuck line.",
            a.difference.times, a.difference.of, a.xor.distinct
        ),
        (false, true) => format!(
            "The XOR is {mask} in {} of {} wrong words while their differences vary ({} of them): that suggests a stuck or flipped \
             data line, register or latch bit, and not a wrong sum.",
            a.xor.times, a.xor.of, a.difference.distinct
        ),
        (true, true) => format!(
            "XOR ({mask}) and difference ({difference}) are the same in nearly all of {} wrong words: bits stuck at one value \
             and a fixed amount added look alike here.",
            a.distinct_words
        ),
        (false, false) => format!(
            "Neither the XOR ({} different ones) nor the difference ({}) is the same in most of {} wrong words: they suggest \
             neither a stuck line nor a fixed amount added or lost.",
            a.xor.distinct, a.difference.distinct, a.distinct_words
        ),
    };
    Some(said)
}

fn lane(a: &WordFigures) -> Option<String> {
    let l = a.lane.as_ref().filter(|l| l.p <= SMALL)?;
    Some(format!(
        "Lane {} of {} bits, counted in a datapath of {} bits, was wrong in {} of {} failing cases with one wrong lane ({}, \
         corrected for {} lanes looked at): that suggests one slice of that datapath, or of a register file or port of its \
         width.",
        l.lane,
        l.lane_bits,
        l.width_bits,
        l.cases,
        l.of,
        p_text(l.p),
        l.looked_at
    ))
}

fn surroundings(line: &WordsLine) -> Vec<String> {
    let mut said = Vec::new();
    if let Some(c) = line.conditions.first().filter(|c| c.p <= SMALL) {
        said.push(format!(
            "Episodes began more often under {} than its share of the busy time explains ({} of {} in {} %; {}, looked at {} \
             conditions); kernels are not spread evenly over conditions, so it may be the kernel.",
            c.condition,
            c.episodes,
            c.of,
            short(c.busy_share * 100.0),
            p_text(c.p),
            c.looked_at
        ));
    }
    if let Some(h) = line.heat.as_ref().filter(|h| h.p <= SMALL) {
        let warmer = u128::from(h.episodes) * u128::from(h.of_clean) > u128::from(h.clean) * u128::from(h.of);
        said.push(format!(
            "Episodes began in {} slices than the clean ones ({}); hot work is other work too, so it may be that.",
            if warmer { "warmer" } else { "cooler" },
            p_text(h.p)
        ));
    }
    said
}

fn repetition(a: &WordFigures) -> Option<String> {
    match (a.cases_failed, a.cases_failed_again) {
        (0, _) => None,
        (failed, 0) => Some(format!(
            "No case failed in two slices ({failed} failed in one each): time or surroundings decide, or each case was run in \
             one slice only."
        )),
        (failed, again) => Some(format!(
            "{again} of {failed} failing cases failed in more than one slice: the operands have a part in it."
        )),
    }
}

fn limits(line: &WordsLine) -> String {
    let plain = line.all.float_parts.is_some_and(|p| p.numbers >= line.all.distinct_words);
    if plain {
        "None of this proves a cause: an error early in a chain of operations has been through the later ones before it \
         came out."
            .to_owned()
    } else {
        "None of this proves a cause, and an output word is often a sum or digest over many lanes and steps: then the bit or \
         lane of the word is not that of the faulty unit."
            .to_owned()
    }
}
