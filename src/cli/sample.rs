//! At start: a sample of the golden tables recomputed by the reference on two cores. They must agree with each other
//! and with the tables; a core that does not is named before it has judged anything.

use std::time::{Duration, Instant};

use kernels::{Case, catalogue};

use crate::host::Cpu;
use crate::run::checker::Seat;
use crate::run::pinning;

/// What the sample showed.
#[derive(Debug, Default)]
pub struct Sampled {
    /// Cores on which they were.
    pub on: Vec<Cpu>,
    /// Cores that gave other words than table and other core agree on, with the first such case.
    pub apart: Vec<(Cpu, Case)>,
    /// Cases on which both cores agree against the table.
    pub against_table: Vec<Case>,
}

/// Computes the reference's words of `case` on `cpu`, in a thread that is held there.
pub fn words_on(cpu: Cpu, case: &Case) -> Result<Vec<u64>, String> {
    let case = *case;
    let work = move || {
        pinning::pin(cpu).map_err(|why| format!("cannot be held there: {why}"))?;
        let words = golden::reference::words(&case).ok_or("no reference for it")?;
        let place = pinning::place().map_err(|why| why.to_string())?;
        if place.is_only(cpu) { Ok(words) } else { Err(format!("it was moved to cpu {}", place.cpu)) }
    };
    std::thread::spawn(work).join().unwrap_or_else(|_| Err("the reference panicked".to_owned()))
}

/// The sample ends after this time, whichever kernels it has come to; which come first changes with the seed.
const SAMPLE_FOR: Duration = Duration::from_millis(150);

/// Recomputes cases of different kernels, chosen by `seed`, on the first cpus of two cores: one at least.
pub fn sample(seats: &[Seat], seed: u64) -> Sampled {
    let Some(&(first, core)) = seats.first() else { return Sampled::default() };
    let second = seats.iter().find(|(_, other)| *other != core).map(|(cpu, _)| *cpu);
    let count = catalogue::KERNELS.len();
    let cases: Vec<Case> = (0..count)
        // the same row on both cpus, beginning elsewhere each time
        .map(|k| catalogue::KERNELS[(k + seed as usize % count) % count])
        .filter_map(|k| {
            let all = golden::table::cases(k.id(), k.sizes()[0]);
            let index = seed as usize % all.len().max(1);
            all.into_iter().nth(index)
        })
        .collect();
    let on: Vec<Cpu> = [Some(first), second].into_iter().flatten().collect();
    let answers: Vec<Vec<Option<Vec<u64>>>> = std::thread::scope(|scope| {
        let cases = &cases;
        let compute = |&cpu: &Cpu| {
            scope.spawn(move || {
                let begun = Instant::now();
                let in_time = |index: usize| index == 0 || begun.elapsed() < SAMPLE_FOR;
                cases.iter().enumerate().map(|(i, c)| in_time(i).then(|| words_on(cpu, c).ok()).flatten()).collect()
            })
        };
        let threads: Vec<_> = on.iter().map(compute).collect();
        threads.into_iter().map(|t| t.join().unwrap_or_default()).collect()
    });
    let mut sampled = Sampled { on: on.clone(), ..Sampled::default() };
    for (i, case) in cases.iter().enumerate() {
        let given: Vec<(Cpu, Option<&Vec<u64>>)> =
            on.iter().zip(&answers).map(|(cpu, a)| (*cpu, a.get(i).and_then(Option::as_ref))).collect();
        let table = golden::table::expected(case);
        let wrong: Vec<Cpu> =
            given.iter().filter(|(_, w)| w.is_some_and(|w| Some(w.as_slice()) != table)).map(|(c, _)| *c).collect();
        if wrong.len() == on.len() {
            sampled.against_table.push(*case);
        } else {
            sampled.apart.extend(wrong.into_iter().map(|cpu| (cpu, *case)));
        }
    }
    sampled
}
