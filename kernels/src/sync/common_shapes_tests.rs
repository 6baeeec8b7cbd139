//! The machine of the x86-TSO paper for two threads: each has a queue of stores that have not reached memory, from which its
//! own loads are served first. Every run of it is gone through, and the outcomes that no run has are compared with the table.

use std::collections::{BTreeSet, HashSet};

use super::*;

#[derive(Clone, PartialEq, Eq, Hash)]
struct Machine {
    next: [usize; 2],
    queues: [Vec<(usize, u8)>; 2],
    memory: [u8; 2],
    seen: [[u8; 2]; 2],
}

/// What the machine makes of fences: with `fences` false they do nothing.
fn steps(threads: &[[Op; 3]; 2], now: &Machine, fences: bool) -> Vec<Machine> {
    let mut after = Vec::new();
    for (role, thread) in threads.iter().enumerate() {
        if let Some(&(place, value)) = now.queues[role].first() {
            let mut then = now.clone();
            then.queues[role].remove(0);
            then.memory[place] = value;
            after.push(then);
        }
        let Some(&op) = thread.get(now.next[role]) else { continue };
        let mut then = now.clone();
        then.next[role] += 1;
        let drained = now.queues[role].is_empty() || !fences;
        match op {
            Write(place, value) | Release(place, value) | Stream(place, value) => {
                then.queues[role].push((place as usize, value));
            }
            Exchange(place, value) if fences && drained => then.memory[place as usize] = value,
            Exchange(place, value) if !fences => then.queues[role].push((place as usize, value)),
            Read(place, register) | Acquire(place, register) => {
                let queued =
                    now.queues[role].iter().rev().find(|(at, _)| *at == place as usize).map(|&(_, value)| value);
                then.seen[role][register as usize] = queued.unwrap_or(now.memory[place as usize]);
            }
            Fence | Locked if drained => {}
            Stores | Nothing => {}
            Fence | Locked | Exchange(..) => continue,
        }
        after.push(then);
    }
    after
}

fn reachable(threads: &[[Op; 3]; 2], fences: bool) -> BTreeSet<Outcome> {
    let start = Machine { next: [0; 2], queues: [vec![], vec![]], memory: [0; 2], seen: [[0; 2]; 2] };
    let (mut known, mut open, mut outcomes) = (HashSet::new(), vec![start], BTreeSet::new());
    while let Some(now) = open.pop() {
        if !known.insert(now.clone()) {
            continue;
        }
        if now.next == [3; 2] && now.queues.iter().all(Vec::is_empty) {
            outcomes.insert(Outcome { seen: now.seen, ends: now.memory });
        }
        open.extend(steps(threads, &now, fences));
    }
    outcomes
}

/// Every outcome whose numbers can be told: registers and places that hold a value somebody writes there, or the start.
fn imaginable(threads: &[[Op; 3]; 2]) -> BTreeSet<Outcome> {
    let written = |at: Place| -> Vec<u8> {
        let values = threads.iter().flatten().filter_map(move |op| match *op {
            Write(place, value) | Release(place, value) | Stream(place, value) | Exchange(place, value) => {
                (place == at).then_some(value)
            }
            _ => None,
        });
        std::iter::once(0).chain(values).collect()
    };
    let loaded = |role: usize, register: u8| -> Vec<u8> {
        let from = threads[role].iter().find_map(|op| match *op {
            Read(place, r) | Acquire(place, r) if r == register => Some(place),
            _ => None,
        });
        from.map_or(vec![0], written)
    };
    let mut all = BTreeSet::new();
    for a in loaded(0, 0) {
        for b in loaded(0, 1) {
            for c in loaded(1, 0) {
                for d in loaded(1, 1) {
                    for x in written(X) {
                        for y in written(Y) {
                            all.insert(Outcome { seen: [[a, b], [c, d]], ends: [x, y] });
                        }
                    }
                }
            }
        }
    }
    all
}

#[test]
fn the_table_forbids_just_what_the_store_buffer_machine_cannot_do() {
    for shape in &SHAPES {
        let possible = reachable(&shape.threads, true);
        for outcome in imaginable(&shape.threads) {
            assert_eq!(shape.forbids(&outcome), !possible.contains(&outcome), "{} {outcome:?}", shape.name);
        }
        assert!(possible.is_subset(&imaginable(&shape.threads)), "{}", shape.name);
    }
}

/// Without its fences a shape of this kind can do more: so the fences matter, and the machine is none that never reorders.
#[test]
fn shapes_that_rest_on_fences_show_more_without_them() {
    for shape in &SHAPES {
        let (with, without) = (reachable(&shape.threads, true), reachable(&shape.threads, false));
        let rests_on_fences =
            shape.name.starts_with("SB, ") && shape.name != "SB, nothing between" || shape.name == "R, full fences";
        assert_eq!(without.iter().any(|outcome| shape.forbids(outcome)), rests_on_fences, "{}", shape.name);
        assert!(with.is_subset(&without), "{}", shape.name);
    }
}

/// The published weak outcomes of x86-TSO: both loads of SB miss both stores, with forwarding as well.
#[test]
fn weak_outcomes_that_are_allowed_are_possible_and_not_forbidden() {
    let weak = [
        ("SB, nothing between", Outcome { seen: [[0, 0], [0, 0]], ends: [1, 1] }),
        ("SB with forwarding", Outcome { seen: [[1, 0], [1, 0]], ends: [1, 1] }),
    ];
    for (name, outcome) in weak {
        let shape = SHAPES.iter().find(|shape| shape.name == name).expect("a shape of the table");
        assert!(reachable(&shape.threads, true).contains(&outcome), "{name}");
        assert!(!shape.forbids(&outcome), "{name}");
    }
}

#[test]
fn foreign_values_are_no_outcome_of_their_own() {
    // what nobody has written is counted apart; only a determined end that holds one is against the table as well
    for shape in &SHAPES {
        let foreign = Outcome { seen: [[FOREIGN; 2]; 2], ends: [FOREIGN; 2] };
        assert_eq!(shape.forbids(&foreign), shape.ends.iter().any(Option::is_some), "{}", shape.name);
    }
}
