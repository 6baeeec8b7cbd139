//! Bits, lanes and operands of wrong outputs for people.

use std::collections::BTreeMap;
use std::fmt::Write;

use super::analysis::{ConditionTest, SMALL, p_text};
use super::words::{Values, WordFigures, WordsLine};
use crate::report::text::{Table, folded, printable};

/// Bits, conditions and earlier kernels that a line names.
const NAMED: usize = 4;

/// For people.
pub fn text(lines: &[WordsLine]) -> String {
    if lines.is_empty() {
        return "\nNo mismatch is on record.\n".to_owned();
    }
    lines.iter().map(one).collect()
}

fn one(line: &WordsLine) -> String {
    let a = &line.all;
    let seat = match line.partner {
        None => format!("Cpu {}", line.cpu),
        Some(partner) => format!("Cpus {} and {partner} together, told apart nowhere here", line.cpu),
    };
    let mut out = format!(
        "\n{}\n",
        folded(&format!(
            "{seat}: {} mismatches of the plan with a record of their own, of {} wrong runs. {} of repeats and {} of control \
             legs are left out.",
            a.mismatches, line.wrong_runs, line.of_repeats, line.of_controls
        ))
    );
    let mut say = |key: &str, text: String| {
        let options = textwrap::Options::new(100).subsequent_indent("                ").break_words(false);
        let _ = writeln!(out, "{}", textwrap::fill(&format!("  {key:<14}{}", printable(&text)), options));
    };
    say("noticed", format!("{} by the worker's comparison, {} by the fold alone", a.by_comparison, a.by_fold));
    if a.words > 0 {
        let not_kept =
            if a.words_not_kept > 0 { format!("; {} more not on record", a.words_not_kept) } else { String::new() };
        say(
            "wrong words",
            format!(
                "one in {} outputs, several in {}; {} on record, {} distinct{not_kept}",
                a.one_word, a.several_words, a.words, a.distinct_words
            ),
        );
        say("bits", bits(a));
        say("bits a word", format!("one in {}, two in {}, more in {}", a.one_bit, a.two_bits, a.more_bits));
        let halves = if a.word_bits == 32 { " (halves of 32 bits)" } else { "" };
        say("XOR", format!("{}{halves}", values(&a.xor)));
        say("difference", format!("{}{halves}", values(&a.difference)));
    }
    if let Some(p) = &a.float_parts {
        let text = format!(
            "of {} wrong floating-point numbers the fraction in {}, the exponent in {}, the sign in {}",
            p.numbers, p.fraction, p.exponent, p.sign
        );
        say("parts", text);
    }
    if let Some(l) = &a.lane {
        let text = format!(
            "one in {} cases, several in {} ({} of them adjacent); most in lane {} of {} bits in {} bits: {} of {}, {} corrected \
             for {} lanes looked at",
            l.of,
            l.adjacent + l.scattered,
            l.adjacent,
            l.lane,
            l.lane_bits,
            l.width_bits,
            l.cases,
            l.of,
            p_text(l.p),
            l.looked_at
        );
        say("lanes", text);
    }
    if a.cases_failed > 0 {
        say(
            "cases",
            format!(
                "{} failed ({} with an even seed, {} with an odd one), {} of them in more than one slice; {} were run",
                a.cases_failed, a.even_seeds, a.odd_seeds, a.cases_failed_again, line.cases_run
            ),
        );
    }
    if line.repeats.0 > 0 {
        say("repeats", format!("wrong again in {} of {} runs for confirmation", line.repeats.1, line.repeats.0));
    }
    if let Some((first, last)) = a.first_and_last_run {
        let text = format!("number {first} to {last} within its case; the first of its case in {}", a.in_first_run);
        say("runs", text);
    }
    say("temperature", temperature(line));
    if !a.previous_kernels.is_empty() {
        let mut before: Vec<(&String, &u64)> = a.previous_kernels.iter().collect();
        before.sort_by(|x, y| y.1.cmp(x.1));
        let named: Vec<String> = before.iter().take(NAMED).map(|(k, n)| format!("{k} {n}")).collect();
        say("run before", format!("{}{}", named.join(", "), if before.len() > NAMED { ", …" } else { "" }));
    }
    say("conditions", conditions(&line.conditions));
    if a.not_looked_at > 0 {
        say("left", format!("{} words and cases more than are remembered of one cpu", a.not_looked_at));
    }
    if line.kernels.len() > 1 {
        out.push_str(&by_kernel(&line.kernels));
    }
    for sentence in &line.suggests {
        let _ = writeln!(out, "{}", folded(sentence));
    }
    out
}

fn temperature(line: &WordsLine) -> String {
    let c = &line.all.celsius;
    if c.number == 0 {
        return "not on record".to_owned();
    }
    let mut text =
        format!("{:.1} to {:.1} °C at {} mismatches, {:.1} on average", c.lowest, c.highest, c.number, c.mean);
    if let Some(h) = &line.heat {
        let _ = write!(
            text,
            "; {} of {} episodes began at {} °C or more, {} of {} clean slices ended there: {}",
            h.episodes,
            h.of,
            h.from_celsius,
            h.clean,
            h.of_clean,
            p_text(h.p)
        );
    }
    text
}

fn conditions(tests: &[ConditionTest]) -> String {
    let Some(first) = tests.first() else {
        return "one only, so there is nothing to hold it against".to_owned();
    };
    let said = |t: &ConditionTest| {
        format!(
            "{}: {} of {} episodes in {:.1} % of the busy time, {}",
            t.condition,
            t.episodes,
            t.of,
            t.busy_share * 100.0,
            p_text(t.p)
        )
    };
    let shown: Vec<String> = tests.iter().take(NAMED).filter(|t| t.p <= SMALL || t.episodes > 0).map(said).collect();
    format!("looked at {}, corrected for that number; {}", first.looked_at, shown.join("; "))
}

fn by_kernel(kernels: &BTreeMap<String, WordFigures>) -> String {
    let mut table = Table::new(&["kernel", "records", "words", "XORs", "differences", "most flipped", "most hit lane"]);
    for (id, k) in kernels {
        let bit = k.flips.iter().enumerate().max_by(|a, b| a.1.cmp(b.1).then(b.0.cmp(&a.0))).filter(|b| *b.1 > 0);
        table.row([
            printable(id),
            k.mismatches.to_string(),
            k.distinct_words.to_string(),
            k.xor.distinct.to_string(),
            k.difference.distinct.to_string(),
            bit.map_or("none".to_owned(), |(bit, n)| format!("bit {bit} in {n}")),
            k.lane.as_ref().map_or("unknown".to_owned(), |l| {
                format!("{} of {} × {}: {} of {}", l.lane, l.width_bits / l.lane_bits, l.lane_bits, l.cases, l.of)
            }),
        ]);
    }
    table.text()
}

fn values(v: &Values) -> String {
    match &v.commonest {
        None => "none".to_owned(),
        Some(value) => format!("{} distinct; commonest {value}, {} of {}", v.distinct, v.times, v.of),
    }
}

fn bits(a: &WordFigures) -> String {
    let (all, raised) = a.directions();
    let mut by_count: Vec<(u64, usize)> = a.flips.iter().enumerate().map(|(b, n)| (*n, b)).collect();
    by_count.retain(|(n, _)| *n > 0);
    let (lowest, highest) = (by_count.first().map_or(0, |b| b.1), by_count.last().map_or(0, |b| b.1));
    by_count.sort_by(|a, b| b.0.cmp(&a.0).then(a.1.cmp(&b.1)));
    let named: Vec<String> = by_count.iter().take(NAMED).map(|(n, bit)| format!("bit {bit} in {n}")).collect();
    format!(
        "{} different bits from {lowest} to {highest}: {}{}; {raised} flips 0 to 1, {} flips 1 to 0",
        by_count.len(),
        named.join(", "),
        if by_count.len() > NAMED { ", …" } else { "" },
        all - raised
    )
}
