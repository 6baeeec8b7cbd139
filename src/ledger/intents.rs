//! Promises of work that nothing has answered yet.
//!
//! An assignment of an intent is *open* until a slice or a lost worker of the same job, slice and cpu is on record,
//! or the job's end: a job that wrote its own end was not cut off, so nobody is to be blamed for what it left out.

use std::collections::{BTreeMap, HashMap};

use crate::event::{Assignment, Event, How, Job, Lost};
use crate::host::Cpu;

/// Follows the intents of a ledger, event by event.
#[derive(Clone, Debug, Default)]
pub struct OpenIntents {
    open: BTreeMap<(u64, u64, Cpu), (u64, Assignment)>,
    jobs: HashMap<u64, Job>,
    highest_job: u64,
}

impl OpenIntents {
    /// Takes the next event.
    pub fn add(&mut self, event: &Event) {
        match event {
            Event::Opened(opened) => {
                self.jobs.insert(opened.job_id, opened.job);
                self.highest_job = self.highest_job.max(opened.job_id);
            }
            Event::Intent(intent) => {
                for assignment in &intent.assignments {
                    let key = (intent.job_id, assignment.slice, assignment.cpu);
                    self.open.insert(key, (intent.wall_ms, assignment.clone()));
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
    /// moment that is known to lie before the loss. A job that never said what it is counts as a window: a loss
    /// must not hide.
    pub fn abandoned(&self) -> Vec<Lost> {
        let lost = self.open.iter().map(|(&(job_id, slice, cpu), (wall_ms, a))| Lost {
            job_id,
            job: self.jobs.get(&job_id).copied().unwrap_or(Job::Window),
            slice,
            cpu,
            core: a.core,
            kernel: a.kernel.clone(),
            variant: a.variant.clone(),
            condition: a.condition.clone(),
            wall_ms: *wall_ms,
            how: How::Abandoned,
        });
        lost.collect()
    }
}
