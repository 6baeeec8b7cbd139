//! Which records of a ledger are wanted: by cpu, kernel and time.
//!
//! Each record is judged by its own host clock: a slice by its start, a mismatch by the instant at which it was seen.

use crate::event::Event;
use crate::host::Cpu;
use crate::ledger::record::wall_ms;

/// What has to hold of a record; everything passes the empty one.
#[derive(Clone, Debug, Default)]
pub struct Filter {
    /// Only this cpu, alone or with another one.
    pub cpu: Option<Cpu>,
    /// Only kernels whose id matches one of these; any if there is none.
    pub kernels: Vec<glob::Pattern>,
    /// Only from this instant on, Unix milliseconds.
    pub since_ms: Option<u64>,
    /// Only before this instant, Unix milliseconds.
    pub until_ms: Option<u64>,
}

impl Filter {
    /// Whether records of this instant are wanted.
    pub fn time(&self, wall_ms: u64) -> bool {
        self.since_ms.is_none_or(|t| wall_ms >= t) && self.until_ms.is_none_or(|t| wall_ms < t)
    }

    /// Whether records of this kernel are wanted.
    pub fn kernel(&self, id: &str) -> bool {
        self.kernels.is_empty() || self.kernels.iter().any(|p| p.matches(id))
    }

    /// Whether records about this cpu are wanted.
    pub fn cpu(&self, cpu: Cpu) -> bool {
        self.cpu.is_none_or(|c| c == cpu)
    }

    /// Whether the record is wanted. A job's beginning and end always are: the others are understood by them.
    pub fn wants(&self, event: &Event) -> bool {
        let (cpu, partner, kernel) = match event {
            Event::Opened(_) | Event::Closed(_) => return true,
            Event::Intent(_) | Event::Remark(_) => return self.time(wall_ms(event)),
            Event::Slice(s) => (s.cpu, s.partner.map(|p| p.cpu), &s.kernel),
            Event::Mismatch(m) => (m.cpu, m.partner, &m.kernel),
            Event::Lost(l) => (l.cpu, l.partner, &l.kernel),
            Event::Finding(f) => (f.cpu, f.partner, &f.kernel),
        };
        self.time(wall_ms(event)) && (self.cpu(cpu) || partner.is_some_and(|p| self.cpu(p))) && self.kernel(kernel)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn begin_is_included_and_end_is_not() {
        let filter = Filter { since_ms: Some(10), until_ms: Some(20), ..Filter::default() };
        assert_eq!([9, 10, 19, 20].map(|t| filter.time(t)), [false, true, true, false]);
        assert!(Filter::default().time(0) && Filter::default().time(u64::MAX));
    }

    #[test]
    fn any_of_the_patterns_is_enough() {
        let kernels = ["fma.*", "sync.lock"].map(|p| glob::Pattern::new(p).expect("a pattern"));
        let filter = Filter { kernels: kernels.into(), ..Filter::default() };
        assert_eq!(["fma.chain64", "sync.lock", "sync.counter"].map(|k| filter.kernel(k)), [true, true, false]);
    }
}
