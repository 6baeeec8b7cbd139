//! The records that the supervisor makes of a slice: the same facts about it in each.

use super::lane::Flight;
use super::protocol::{SliceReport, WrongOutput};
use super::spec::{FRESH_FROM, Opinion, Setup};
use crate::event::{
    Assignment, FoldCheck, How, Intent, Lost, Mismatch, NoticedBy, Partner, Slice, Surroundings, WrongWord,
};
use crate::host::Cpu;

/// A slice and where it was ordered.
pub(super) struct About<'a> {
    pub setup: &'a Setup,
    pub cpu: Cpu,
    pub core: u32,
    pub flight: &'a Flight,
}

impl About<'_> {
    /// What is promised before the order goes out.
    pub fn intent(&self, wall_ms: u64) -> Intent {
        let f = self.flight;
        let assignment = Assignment {
            cpu: self.cpu,
            core: self.core,
            slice: f.slice,
            purpose: f.spec.purpose,
            kernel: f.spec.kernel.to_owned(),
            variant: f.spec.variant.to_string(),
            condition: f.condition.clone(),
            partner: f.spec.partner,
        };
        Intent { job_id: self.setup.job_id, job: self.setup.job, wall_ms, assignments: vec![assignment] }
    }

    /// A wrong output that the worker's own comparison saw.
    pub fn mismatch(
        &self,
        wrong: &WrongOutput,
        previous_kernel: Option<&str>,
        neighbours: Vec<(Cpu, String)>,
        surroundings: Surroundings,
    ) -> Mismatch {
        Mismatch {
            seed: Some(wrong.seed),
            wall_ms: wrong.wall_ms,
            run: wrong.run,
            noticed_by: NoticedBy::Comparison,
            wrong_words: wrong.wrong_words,
            words: wrong.first.iter().map(|&(i, e, a)| WrongWord::new(i as usize, e, a)).collect(),
            previous_kernel: previous_kernel.map(str::to_owned),
            surroundings,
            ..self.folded_mismatch(Some(wrong.seed), neighbours)
        }
    }

    /// A wrong output of which only the fold of a case is known.
    pub fn folded_mismatch(&self, seed: Option<u64>, neighbours: Vec<(Cpu, String)>) -> Mismatch {
        let f = self.flight;
        Mismatch {
            job_id: self.setup.job_id,
            job: self.setup.job,
            slice: f.slice,
            purpose: f.spec.purpose,
            cpu: self.cpu,
            core: self.core,
            kernel: f.spec.kernel.to_owned(),
            variant: f.spec.variant.to_string(),
            seed,
            size: f.spec.size.0,
            condition: f.condition.clone(),
            wall_ms: f.wall_ms,
            run: 0,
            noticed_by: NoticedBy::Fold,
            wrong_words: 0,
            words: Vec::new(),
            partner: f.spec.partner,
            previous_kernel: None,
            neighbours,
            surroundings: f.surroundings,
        }
    }

    /// A slice from which nothing can be concluded; this also settles its intent.
    pub fn void(&self, wall_ms: u64, surroundings: Surroundings, why: String) -> Slice {
        let f = self.flight;
        Slice {
            job_id: self.setup.job_id,
            slice: f.slice,
            job: self.setup.job,
            purpose: f.spec.purpose,
            cpu: self.cpu,
            core: self.core,
            kernel: f.spec.kernel.to_owned(),
            variant: f.spec.variant.to_string(),
            condition: f.condition.clone(),
            wall_ms,
            span_ns: 0,
            busy_ns: 0,
            cases: 0,
            runs: 0,
            operations: 0,
            unit: f.work.unit.to_owned(),
            mismatches: 0,
            mismatch_ms: None,
            fold: FoldCheck::NotChecked,
            checked_on: None,
            void: Some(why),
            surroundings,
            partner: None,
            next_seed: None,
            steps: None,
            counters: Vec::new(),
        }
    }

    /// A slice that ended, with the second opinion on it.
    pub fn slice(&self, report: &SliceReport, opinion: &Opinion, void: Option<String>) -> Slice {
        let f = self.flight;
        let runs: u64 = report.cases.iter().map(|c| c.runs).sum();
        let wrong: u64 = report.cases.iter().map(|c| c.wrong).sum();
        // a wrong fold is at least one wrong output
        let unseen = opinion.wrong.len() as u64;
        let late = (unseen > 0).then_some((f.wall_ms, f.wall_ms));
        Slice {
            span_ns: report.span_ns,
            busy_ns: report.busy_ns,
            cases: report.cases.len() as u64,
            runs,
            operations: runs.saturating_mul(f.work.amount),
            mismatches: wrong + unseen,
            mismatch_ms: report.wrong_ms.or(late),
            fold: match opinion.on {
                None => FoldCheck::NotChecked,
                Some(_) if unseen > 0 => FoldCheck::Wrong,
                Some(_) => FoldCheck::Right,
            },
            checked_on: opinion.on,
            void,
            partner: f.spec.partner.map(|cpu| Partner {
                cpu,
                core: self.setup.posts.iter().find(|p| p.cpu == cpu).map_or(cpu.0, |p| p.core),
                busy_ns: report.partner.as_ref().map_or(0, |p| p.busy_ns),
            }),
            // a slice that ended early leaves the seeds that it did not come to for the next one
            next_seed: f.spec.next_seed.map(|next| {
                let tables = f.spec.seeds.iter().filter(|s| **s < FRESH_FROM).count() as u64;
                let came_to = (report.cases.len() as u64).min(tables);
                next.saturating_sub(tables - came_to)
            }),
            steps: report.steps,
            ..self.void(f.wall_ms, f.surroundings, String::new())
        }
    }

    /// The loss of the worker.
    pub fn lost(&self, wall_ms: u64, how: How) -> Lost {
        let f = self.flight;
        Lost {
            job_id: self.setup.job_id,
            job: self.setup.job,
            slice: f.slice,
            cpu: self.cpu,
            core: self.core,
            kernel: f.spec.kernel.to_owned(),
            variant: f.spec.variant.to_string(),
            condition: f.condition.clone(),
            wall_ms,
            how,
            partner: f.spec.partner,
        }
    }
}
