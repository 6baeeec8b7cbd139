//! The second opinion: folds checked on a core other than the one that made them.
//!
//! One thread moves itself to the cpu that is to give the opinion. A fold that looks wrong is computed once more on
//! a third core where there is one; only what two computations agree on is held against the suspect.

use std::sync::mpsc::{Receiver, Sender, channel};

use kernels::compare::{Fold, digest};

use super::pinning;
use super::spec::{FoldTask, Opinion};
use crate::host::Cpu;

/// A cpu with the physical core behind it.
pub type Seat = (Cpu, u32);

/// Starts the checking thread; it ends when the sender is dropped.
pub fn start(seats: Vec<Seat>, answer: impl Fn(Opinion) -> bool + Send + 'static) -> Sender<FoldTask> {
    let (give, take) = channel();
    std::thread::spawn(move || check_all(&take, &seats, answer));
    give
}

fn check_all(tasks: &Receiver<FoldTask>, seats: &[Seat], answer: impl Fn(Opinion) -> bool) {
    for (turn, task) in tasks.iter().enumerate() {
        if !answer(check(&task, seats, turn)) {
            return;
        }
    }
}

/// Cpus whose core is neither that of `cpu` nor of its partner, beginning at another place each turn.
pub fn elsewhere(cpu: Cpu, with: Option<Cpu>, seats: &[Seat], turn: usize) -> Vec<Cpu> {
    let core_of = |cpu: Cpu| seats.iter().find(|(c, _)| *c == cpu).map(|(_, core)| *core);
    let own = [core_of(cpu), with.and_then(core_of)];
    let mut others: Vec<Cpu> = seats
        .iter()
        .filter(|(c, core)| *c != cpu && Some(*c) != with && !own.contains(&Some(*core)))
        .map(|(c, _)| *c)
        .collect();
    if !others.is_empty() {
        let middle = turn % others.len();
        others.rotate_left(middle);
    }
    others
}

fn check(task: &FoldTask, seats: &[Seat], turn: usize) -> Opinion {
    let nothing = Opinion { slice: task.slice, of: task.of, on: None, wrong: Vec::new(), remark: None };
    let mut able =
        elsewhere(task.of, task.with, seats, turn).into_iter().filter_map(|cpu| folds_on(cpu, task).map(|f| (cpu, f)));
    let Some((on, first)) = able.next() else { return nothing };
    let differs = |folds: &[u64]| -> Vec<usize> {
        task.cases
            .iter()
            .zip(folds)
            .enumerate()
            .filter(|(_, ((_, _, got), want))| *got != **want)
            .map(|(i, _)| i)
            .collect()
    };
    let wrong = differs(&first);
    if wrong.is_empty() {
        return Opinion { on: Some(on), ..nothing };
    }
    let again = able.next().or_else(|| folds_on(on, task).map(|folds| (on, folds)));
    match again {
        Some((_, second)) if second == first => Opinion { on: Some(on), wrong, ..nothing },
        Some((third, _)) => Opinion {
            remark: Some(format!(
                "cpus {on} and {third} do not agree on the fold of slice {} of cpu {}: one of the two computes wrongly; \
                 nothing is held against cpu {}",
                task.slice, task.of, task.of
            )),
            ..nothing
        },
        None => nothing,
    }
}

/// The folds of the expected outputs, computed on `cpu`; none if the thread could not be held there throughout.
fn folds_on(cpu: Cpu, task: &FoldTask) -> Option<Vec<u64>> {
    pinning::pin(cpu).ok()?;
    let folds = task
        .cases
        .iter()
        .map(|(expected, outputs, _)| {
            let mut fold = Fold::default();
            fold.push_digest(digest(expected), *outputs);
            fold.0
        })
        .collect();
    pinning::place().ok()?.is_only(cpu).then_some(folds)
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;

    #[test]
    fn opinions_come_from_other_cores_in_turn() {
        let seats = [(Cpu(0), 0), (Cpu(1), 0), (Cpu(2), 1), (Cpu(3), 1), (Cpu(6), 2)];
        assert_eq!(elsewhere(Cpu(1), None, &seats, 0), [Cpu(2), Cpu(3), Cpu(6)]);
        assert_eq!(elsewhere(Cpu(1), None, &seats, 2), [Cpu(6), Cpu(2), Cpu(3)]);
        assert_eq!(elsewhere(Cpu(1), Some(Cpu(2)), &seats, 0), [Cpu(6)]);
        assert!(elsewhere(Cpu(0), None, &seats[..2], 5).is_empty());
    }

    #[test]
    fn a_wrong_fold_is_named_by_its_place() {
        let seats: Vec<Seat> = crate::host::affinity::mask().unwrap().iter().map(|c| (c, c.0)).collect();
        if seats.len() < 2 {
            return;
        }
        let words = Arc::new(vec![3, 1, 4]);
        let mut right = Fold::default();
        right.push_digest(digest(&words), 1000);
        let cases = vec![(words.clone(), 1000, right.0), (words.clone(), 1000, right.0 ^ 4), (words, 0, 0)];
        let of = seats[0].0;
        let opinion =
            std::thread::spawn(move || check(&FoldTask { slice: 1, of, with: None, cases }, &seats, 0)).join().unwrap();
        assert_eq!(opinion.wrong, [1]);
        assert_ne!(opinion.on, Some(of));
    }
}
