//! Do the intervals and the verdict rules keep what they promise? Plays them over made-up cores and counts.
//! Run by `scripts/simulate-statistics`; seeded, so a run can be repeated.

mod exact;
mod host;
mod intervals;
mod process;
mod verdicts;

use std::process::ExitCode;

fn main() -> ExitCode {
    let mut words = std::env::args().skip(1);
    let topic = words.next().unwrap_or_default();
    let number = |words: &mut dyn Iterator<Item = String>, otherwise: u64| {
        words.next().map_or(Some(otherwise), |w| w.parse().ok().filter(|n| *n > 0))
    };
    let (Some(replicates), Some(seed)) = (number(&mut words, 10_000), number(&mut words, 1)) else {
        eprintln!("simulate: the number of replicates and the seed are positive whole numbers");
        return ExitCode::from(2);
    };
    let kept = match topic.as_str() {
        "exact" => exact::run(replicates, seed),
        "intervals" => intervals::run(replicates, seed, &words.next().unwrap_or_default()),
        "verdicts" => verdicts::run(replicates, seed),
        _ => {
            eprintln!("simulate: say what: exact, intervals or verdicts; then the replicates and the seed");
            return ExitCode::from(2);
        }
    };
    if kept { ExitCode::SUCCESS } else { ExitCode::FAILURE }
}
