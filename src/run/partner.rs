//! The second cpu of a kernel for two: a thread of the worker that is held there while one case is run.
//!
//! Rounds are handed over by two counters: the worker sets the round that may begin, the second thread the round that
//! it has ended. Between them each waits in the processor's own waiting instruction and, after a while, lets others
//! have its cpu: where one of the two is not let run, the other is only slow.

use std::sync::atomic::{AtomicU64, Ordering};

use kernels::Ready;

use super::pinning::{self, thread_time};
use super::protocol::PartnerReport;
use crate::host::Cpu;

/// No further round: set by the worker when it is done, by the second thread when it cannot go on.
const OVER: u64 = u64::MAX;
/// Looks before the cpu is offered to others.
const PATIENCE: u32 = 20_000;

fn wait(counter: &AtomicU64, reached: impl Fn(u64) -> bool) -> u64 {
    let mut looks = 0u32;
    loop {
        let value = counter.load(Ordering::Acquire);
        if value == OVER || reached(value) {
            return value;
        }
        looks += 1;
        if looks < PATIENCE {
            std::hint::spin_loop();
        } else {
            std::thread::yield_now();
        }
    }
}

/// Sets a counter to [`OVER`] however its thread ends, so that the other never waits for nobody.
struct Farewell<'a>(&'a AtomicU64);

impl Drop for Farewell<'_> {
    fn drop(&mut self) {
        self.0.store(OVER, Ordering::Release);
    }
}

/// Hands `body` a run of both roles, the first on the calling thread, the second on `cpu`. `words` is the length of the
/// whole output. An error says why the second cpu could not be had; nothing is concluded then.
pub fn together<R>(
    roles: [Box<dyn Ready>; 2],
    cpu: Cpu,
    words: usize,
    body: impl FnOnce(&mut dyn FnMut(&mut [u64])) -> R,
) -> Result<(R, PartnerReport), String> {
    let [mut first, mut second] = roles;
    let middle = words / 2;
    let (may_begin, has_ended) = (AtomicU64::new(0), AtomicU64::new(0));
    let view: Vec<AtomicU64> = (middle..words).map(|_| AtomicU64::new(0)).collect();
    let settled = AtomicU64::new(0);
    std::thread::scope(|scope| {
        let partner = scope.spawn(|| -> Result<PartnerReport, String> {
            let _ended = Farewell(&has_ended);
            let placed = pinning::pin(cpu).and_then(|()| pinning::place());
            settled.store(if placed.is_ok() { 1 } else { OVER }, Ordering::Release);
            let before = placed.map_err(|why| format!("its partner cannot be held on cpu {cpu}: {why}"))?;
            let begun = thread_time();
            let mut words = vec![0; view.len()];
            let mut round = 0;
            loop {
                match wait(&may_begin, |value| value > round) {
                    OVER => break,
                    next => round = next,
                }
                second.run(&mut words);
                for (to, from) in view.iter().zip(&words) {
                    to.store(*from, Ordering::Relaxed);
                }
                has_ended.store(round, Ordering::Release);
            }
            let busy_ns = thread_time().saturating_sub(begun).as_nanos() as u64;
            let after = pinning::place().map_err(|why| why.to_string())?;
            Ok(PartnerReport { places: (before, after), busy_ns })
        });
        let given = (wait(&settled, |value| value > 0) != OVER).then(|| {
            let _done = Farewell(&may_begin);
            let mut round = 0;
            let mut run = |out: &mut [u64]| {
                round += 1;
                may_begin.store(round, Ordering::Release);
                let (low, high) = out.split_at_mut(middle);
                first.run(low);
                wait(&has_ended, |value| value >= round);
                for (to, from) in high.iter_mut().zip(&view) {
                    *to = from.load(Ordering::Relaxed);
                }
            };
            body(&mut run)
        });
        let partner = partner.join().unwrap_or_else(|_| Err("its partner's thread panicked".to_owned()))?;
        given.map(|r| (r, partner)).ok_or_else(|| "its partner could not be started".to_owned())
    })
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::host::affinity;

    /// Each role says how often it was called and how often the other had been when it began.
    struct Role {
        mine: Arc<AtomicU64>,
        other: Arc<AtomicU64>,
    }

    impl Ready for Role {
        fn run(&mut self, out: &mut [u64]) {
            let n = self.mine.fetch_add(1, Ordering::SeqCst) + 1;
            // neither returns before the other has begun the same round
            wait(&self.other, |value| value >= n);
            out.fill(n);
        }
    }

    fn roles() -> [Box<dyn Ready>; 2] {
        let (a, b) = (Arc::new(AtomicU64::new(0)), Arc::new(AtomicU64::new(0)));
        [Box::new(Role { mine: a.clone(), other: b.clone() }), Box::new(Role { mine: b, other: a })]
    }

    #[test]
    fn both_roles_run_every_round_and_the_second_where_it_was_sent() {
        let cpu = affinity::mask().unwrap().iter().last().unwrap();
        let (rounds, report) = together(roles(), cpu, 6, |run| {
            let mut out = [0; 6];
            for round in 1..=100 {
                run(&mut out);
                assert_eq!(out, [round; 6]);
            }
            100
        })
        .unwrap();
        assert_eq!(rounds, 100);
        assert!(report.places.0.is_only(cpu) && report.places.1.is_only(cpu));
    }

    #[test]
    fn a_cpu_that_cannot_be_had_is_no_hang() {
        let why = together(roles(), Cpu(60_000), 6, |_| ()).unwrap_err();
        assert!(why.contains("cpu 60000"), "{why}");
    }
}
