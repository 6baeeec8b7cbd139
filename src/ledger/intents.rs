//! Promises of work that nothing has answered yet.
//!
//! An assignment of an intent is *open* until a slice or a lost worker of the same job, slice and cpu is on record,
//! or the job's end: a job that wrote its own end was not cut off, so nobody is to be blamed for what it left out.

use std::collections::BTreeMap;

use crate::event::{Assignment, Event, How, Job, Lost};
use crate::host::Cpu;

/// An assignment, with what its intent says.
#[derive(Clone, Debug)]
struct Promise {
    job: Job,
    wall_ms: u64,
    assignment: Assignment,
}

/// Follows the intents of a ledger, event by event.
#[derive(Clone, Debug, Default)]
pub struct OpenIntents {
    open: BTreeMap<(u64, u64, Cpu), Promise>,
    highest_job: u64,
}

impl OpenIntents {
    /// Takes the next event.
    pub fn add(&mut self, event: &Event) {
        match event {
            Event::Opened(opened) => {
                self.highest_job = self.highest_job.max(opened.job_id);
            }
            Event::Intent(intent) => {
                for assignment in &intent.assignments {
                    let key = (intent.job_id, assignment.slice, assignment.cpu);
                    let promise = Promise { job: intent.job, wall_ms: intent.wall_ms, assignment: assignment.clone() };
                    self.open.insert(key, promise);
                }
            }
            Event::Slice(slice) => {
                self.open.remove(&(slice.job_id, slice.slice, slice.cpu));
            }
            Event::Lost(lost) => {
                self.open.remove(&(lost.job_id, lost.slice, lost.cpu));
            }
            Event::Closed(closed) => {
                let of_job = (closed.job_id, 0, Cpu(0))..=(closed.job_id, u64::MAX, Cpu(u32::MAX));
                let answered: Vec<_> = self.open.range(of_job).map(|(key, _)| *key).collect();
                answered.iter().for_each(|key| drop(self.open.remove(key)));
            }
            Event::Mismatch(_) | Event::Finding(_) | Event::Remark(_) => {}
        }
    }

    /// A job number that no job of the ledger has.
    pub fn next_job(&self) -> u64 {
        self.highest_job + 1
    }

    /// What was under way, as records for the next start to append; their host clock is that of the intent, the last
    /// moment that is known to lie before the loss.
    pub fn abandoned(&self) -> Vec<Lost> {
        let lost = self.open.iter().map(|(&(job_id, slice, cpu), Promise { job, wall_ms, assignment: a })| Lost {
            job_id,
            job: *job,
            slice,
            cpu,
            core: a.core,
            kernel: a.kernel.clone(),
            variant: a.variant.clone(),
            condition: a.condition.clone(),
            wall_ms: *wall_ms,
            how: How::Abandoned,
            partner: a.partner,
        });
        lost.collect()
    }
}
