//! Confirmation: what has to be done before a mismatch becomes a finding. A state machine without IO.
//!
//! The expected words are recomputed by the reference on two other cores; the same case is run again on the suspect
//! and, in turns (ABAB), on control cores; counters of machine checks and memory errors are read before and after.
//! Whatever cannot be done is said in the finding.
//!
//! Where two cpus failed together, each is run with a third one in its turn: what fails again whenever one of them is
//! there, and not with the other, names it. Without a third core the finding speaks of one of two, and convicts nobody.

use std::time::Duration;

use kernels::{Case, Seed, Size, Variant, catalogue};

use crate::event::{Confirmation, Event, FRESH_FROM, Finding, Job, Leg, Mismatch, NoticedBy, Purpose, Slice};
use crate::host::Cpu;

/// Lengths of the suspect's legs; a control's leg of the same length follows each. The later ones are only run while
/// the case has not failed again.
const LEGS: [Duration; 4] =
    [Duration::from_millis(200), Duration::from_millis(400), Duration::from_secs(1), Duration::from_secs(2)];
/// Legs that are run in any case: ABAB.
const LEGS_ALWAYS: usize = 2;
/// Cells of one cpu that are confirmed in one job; one confirmed cell convicts, the others are its picture.
const CELLS_A_CPU: usize = 3;

/// Something the judge wants done.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Want {
    /// Run this case for this long.
    Leg {
        /// Where.
        cpu: Cpu,
        /// And with whom, for a kernel of two cpus.
        partner: Option<Cpu>,
        /// Suspect or control.
        purpose: Purpose,
        /// Kernel, seed, size.
        case: Case,
        /// Variant.
        variant: Variant,
        /// How long.
        span: Duration,
    },
    /// Recompute the expected words by the reference on these cpus.
    Recompute {
        /// Which confirmation.
        ticket: usize,
        /// The case.
        case: Case,
        /// Where.
        cpus: Vec<Cpu>,
    },
}

/// Reads the counters of machine checks and memory errors that rose since it was made.
pub trait Counters {
    /// One line a counter that rose.
    fn risen(&self) -> Vec<String>;
}

struct Open {
    mismatch: Mismatch,
    case: Case,
    variant: Variant,
    /// Golden words at the time, to hold the recomputed ones against.
    expected: Vec<u64>,
    mismatches: u64,
    counters: Box<dyn Counters>,
    recompute_on: Vec<Cpu>,
    recomputed: Vec<(Cpu, Result<Vec<u64>, String>)>,
    suspect: Vec<Leg>,
    controls: Vec<Leg>,
    control_cpus: Vec<Cpu>,
    legs_begun: usize,
    waiting: Option<(Cpu, Purpose)>,
    lacking: Vec<String>,
    closed: bool,
}

/// All confirmations of one job.
pub struct Confirmer {
    job_id: u64,
    job: Job,
    /// Every allowed cpu with its physical core.
    seats: Vec<(Cpu, u32)>,
    /// Cpus that have workers and can therefore run legs.
    workers: Vec<Cpu>,
    open: Vec<Open>,
}

impl Confirmer {
    /// For one job. `seats` may recompute, `workers` may run legs.
    pub fn new(job_id: u64, job: Job, seats: Vec<(Cpu, u32)>, workers: Vec<Cpu>) -> Confirmer {
        Confirmer { job_id, job, seats, workers, open: Vec::new() }
    }

    /// Cpus on other cores than these.
    fn elsewhere(&self, cpu: Cpu, partner: Option<Cpu>) -> Vec<Cpu> {
        let core_of = |cpu: Cpu| self.seats.iter().find(|(c, _)| *c == cpu).map(|(_, core)| *core);
        let own = [core_of(cpu), partner.and_then(core_of)];
        let other = |c: Cpu, core: u32| c != cpu && Some(c) != partner && !own.contains(&Some(core));
        self.seats.iter().filter(|(c, core)| other(*c, *core)).map(|(c, _)| *c).collect()
    }

    /// A leg that was asked for cannot be run.
    pub fn cannot_run(&mut self, cpu: Cpu, kernel: &str, why: &str) -> Vec<Want> {
        self.leg_failed(cpu, kernel, why)
    }

    /// Takes an event in; answers with what is to be done next. `golden` gives the golden words of a case and
    /// `counters` starts watching the machine's counters.
    pub fn consider(
        &mut self,
        event: &Event,
        golden: impl Fn(&Case) -> Option<Vec<u64>>,
        counters: impl Fn() -> Box<dyn Counters>,
    ) -> Vec<Want> {
        match event {
            Event::Mismatch(m) if m.purpose == Purpose::Plan => self.open_for(m, golden, counters),
            Event::Slice(s) if s.purpose != Purpose::Plan => self.leg_ended(s),
            Event::Lost(lost) => {
                let why = format!("a leg on cpu {} was not finished: its worker {}", lost.cpu, lost.how);
                self.leg_failed(lost.cpu, &lost.kernel, &why)
            }
            _ => Vec::new(),
        }
    }

    fn open_for(
        &mut self,
        mismatch: &Mismatch,
        golden: impl Fn(&Case) -> Option<Vec<u64>>,
        counters: impl Fn() -> Box<dyn Counters>,
    ) -> Vec<Want> {
        let mine = |o: &&mut Open| o.mismatch.cpu == mismatch.cpu;
        let same = |o: &&mut Open| {
            o.mismatch.kernel == mismatch.kernel
                && o.mismatch.variant == mismatch.variant
                && o.mismatch.partner == mismatch.partner
        };
        if let Some(open) = self.open.iter_mut().filter(mine).find(same) {
            open.mismatches += 1;
            return Vec::new();
        }
        if self.open.iter_mut().filter(mine).count() >= CELLS_A_CPU {
            return Vec::new();
        }
        let (Some(kernel), Some(variant), Some(seed)) =
            (catalogue::find(&mismatch.kernel), Variant::parse(&mismatch.variant), mismatch.seed)
        else {
            return Vec::new();
        };
        let case = Case { kernel: kernel.id(), seed: Seed(seed), size: Size(mismatch.size) };
        let Some(expected) = golden(&case) else { return Vec::new() };
        let others = self.elsewhere(mismatch.cpu, mismatch.partner);
        let mut lacking = Vec::new();
        if others.len() < 2 {
            lacking.push(match others.len() {
                0 => "no other core may be used, so the expected words were not recomputed elsewhere".to_owned(),
                _ => format!(
                    "only one other core may be used (cpu {}), so the expected words were recomputed on it alone",
                    others[0]
                ),
            });
        }
        let control_cpus: Vec<Cpu> = others.iter().copied().filter(|c| self.workers.contains(c)).take(2).collect();
        if control_cpus.is_empty() {
            lacking.push(match mismatch.partner {
                None => "no other core is under test, so there was no control".to_owned(),
                Some(_) => "no third core is under test, so the two cannot be told apart".to_owned(),
            });
        }
        let recompute_on: Vec<Cpu> = others.into_iter().take(2).collect();
        let ticket = self.open.len();
        let mut wants = Vec::new();
        if !recompute_on.is_empty() {
            wants.push(Want::Recompute { ticket, case, cpus: recompute_on.clone() });
        }
        self.open.push(Open {
            mismatch: mismatch.clone(),
            case,
            variant,
            expected,
            mismatches: 1,
            counters: counters(),
            recompute_on,
            recomputed: Vec::new(),
            suspect: Vec::new(),
            controls: Vec::new(),
            control_cpus,
            legs_begun: 0,
            waiting: None,
            lacking,
            closed: false,
        });
        wants.extend(self.open[ticket].next_leg());
        wants
    }

    fn leg_ended(&mut self, slice: &Slice) -> Vec<Want> {
        if let Some(why) = &slice.void {
            return self.leg_failed(slice.cpu, &slice.kernel, &format!("a leg on cpu {} is void: {why}", slice.cpu));
        }
        let Some(open) = self.waiting_for(slice.cpu, &slice.kernel) else { return Vec::new() };
        let partner = slice.partner.map(|p| p.cpu);
        let leg = Leg { cpu: slice.cpu, partner, runs: slice.runs, mismatches: slice.mismatches };
        match slice.purpose {
            Purpose::Suspect => open.suspect.push(leg),
            _ => open.controls.push(leg),
        }
        open.waiting = None;
        open.next_leg().into_iter().collect()
    }

    fn leg_failed(&mut self, cpu: Cpu, kernel: &str, why: &str) -> Vec<Want> {
        let Some(open) = self.waiting_for(cpu, kernel) else { return Vec::new() };
        open.lacking.push(why.to_owned());
        open.waiting = None;
        open.next_leg().into_iter().collect()
    }

    fn waiting_for(&mut self, cpu: Cpu, kernel: &str) -> Option<&mut Open> {
        self.open.iter_mut().find(|o| !o.closed && o.case.kernel == kernel && o.waiting.is_some_and(|(c, _)| c == cpu))
    }

    /// Takes recomputed words in.
    pub fn recomputed(&mut self, ticket: usize, cpu: Cpu, words: Result<Vec<u64>, String>) {
        if let Some(open) = self.open.get_mut(ticket) {
            open.recomputed.push((cpu, words));
        }
    }

    /// Findings that have become complete since the last call.
    pub fn completed(&mut self, wall_ms: u64) -> Vec<Finding> {
        let (job_id, job) = (self.job_id, self.job);
        let seats = &self.seats;
        let core_of = |cpu: Cpu| seats.iter().find(|(c, _)| *c == cpu).map(|(_, core)| *core);
        let ready = self.open.iter_mut().filter(|o| !o.closed && o.complete());
        ready.map(|o| o.close(job_id, job, wall_ms, &core_of)).collect()
    }

    /// Findings for everything still under way at the end, incomplete as they are.
    pub fn close(&mut self, why: &str, wall_ms: u64) -> Vec<Finding> {
        let (job_id, job) = (self.job_id, self.job);
        let seats = &self.seats;
        let core_of = |cpu: Cpu| seats.iter().find(|(c, _)| *c == cpu).map(|(_, core)| *core);
        let mut findings = Vec::new();
        for open in self.open.iter_mut().filter(|o| !o.closed) {
            if !open.complete() {
                open.lacking.push(format!("{why} before the confirmation was finished"));
            }
            findings.push(open.close(job_id, job, wall_ms, &core_of));
        }
        findings
    }
}

impl Open {
    fn failed_again(&self) -> bool {
        self.suspect.iter().any(|l| l.mismatches > 0)
    }

    /// Legs come in pairs: 2k on the suspect, 2k + 1 on a control.
    fn next_leg(&mut self) -> Option<Want> {
        loop {
            let index = self.legs_begun;
            let pair = index / 2;
            let enough = pair >= LEGS_ALWAYS && index.is_multiple_of(2) && self.failed_again();
            if pair >= LEGS.len() || enough {
                return None;
            }
            self.legs_begun += 1;
            let (first, second) = (self.mismatch.cpu, self.mismatch.partner);
            let (cpu, partner, purpose) = if index.is_multiple_of(2) {
                (first, second, Purpose::Suspect)
            } else if self.control_cpus.is_empty() {
                continue;
            } else {
                let third = self.control_cpus[pair / 2 % self.control_cpus.len()];
                match second {
                    None => (self.control_cpus[pair % self.control_cpus.len()], None, Purpose::Control),
                    // by turns the first and the second of the pair with a third, each in its own role
                    Some(_) if pair.is_multiple_of(2) => (first, Some(third), Purpose::Control),
                    Some(second) => (third, Some(second), Purpose::Control),
                }
            };
            self.waiting = Some((cpu, purpose));
            return Some(Want::Leg { cpu, partner, purpose, case: self.case, variant: self.variant, span: LEGS[pair] });
        }
    }

    fn complete(&self) -> bool {
        self.waiting.is_none() && self.recomputed.len() >= self.recompute_on.len()
    }

    /// Where two cpus failed together: which of them is named, and how far that goes. Nothing for a kernel of one cpu.
    fn told_apart(&self) -> (Option<Cpu>, Option<Confirmation>) {
        let (first, Some(second)) = (self.mismatch.cpu, self.mismatch.partner) else { return (None, None) };
        let sum = |keep: &dyn Fn(&&Leg) -> bool| {
            self.controls.iter().filter(keep).fold((0, 0), |(r, w), l| (r + l.runs, w + l.mismatches))
        };
        let (first_runs, first_wrong) = sum(&|l| l.cpu == first);
        let (second_runs, second_wrong) = sum(&|l| l.partner == Some(second));
        let both_ran = first_runs > 0 && second_runs > 0;
        match (first_wrong > 0, second_wrong > 0) {
            (true, true) => (None, Some(Confirmation::Shared)),
            (true, false) if both_ran => (Some(first), Some(Confirmation::Repeated)),
            (false, true) if both_ran => (Some(second), Some(Confirmation::Repeated)),
            _ if self.failed_again() => (None, Some(Confirmation::OneOfTwo)),
            _ if both_ran => (None, Some(Confirmation::Once)),
            _ => (None, Some(Confirmation::Incomplete)),
        }
    }

    fn close(&mut self, job_id: u64, job: Job, wall_ms: u64, core_of: &dyn Fn(Cpu) -> Option<u32>) -> Finding {
        self.closed = true;
        let mut equal = 0;
        let mut refuted = Vec::new();
        for (cpu, words) in &self.recomputed {
            match words {
                Ok(words) if *words == self.expected => equal += 1,
                Ok(_) => refuted.push(*cpu),
                Err(why) => self.lacking.push(format!("the reference could not be run on cpu {cpu}: {why}")),
            }
        }
        let control_runs: u64 = self.controls.iter().map(|l| l.runs).sum();
        let control_wrong: u64 = self.controls.iter().map(|l| l.mismatches).sum();
        let (convicted, told_apart) = self.told_apart();
        let confirmation = if !refuted.is_empty() {
            Confirmation::Refuted
        } else if let Some(confirmation) = told_apart {
            if equal == 0 { Confirmation::Incomplete } else { confirmation }
        } else if control_wrong > 0 {
            Confirmation::Shared
        } else if equal == 0 || control_runs == 0 || self.suspect.is_empty() {
            Confirmation::Incomplete
        } else if self.failed_again() {
            Confirmation::Repeated
        } else {
            Confirmation::Once
        };
        let m = &self.mismatch;
        let statement = self.statement(confirmation, equal, &refuted);
        // the finding speaks of the one that is named; its partner stays beside it
        let (cpu, partner) = match (m.partner, convicted) {
            (Some(second), Some(cpu)) if cpu == second => (second, Some(m.cpu)),
            (partner, _) => (m.cpu, partner),
        };
        let core = if cpu == m.cpu { m.core } else { core_of(cpu).unwrap_or(cpu.0) };
        Finding {
            job_id,
            job,
            cpu,
            core,
            partner,
            kernel: m.kernel.clone(),
            variant: m.variant.clone(),
            seed: m.seed,
            size: m.size,
            condition: m.condition.clone(),
            wall_ms,
            confirmed: confirmation == Confirmation::Repeated,
            confirmation,
            mismatches: self.mismatches,
            first: m.words.first().cloned(),
            recomputed_on: self.recomputed.iter().filter(|(_, w)| w.is_ok()).map(|(c, _)| *c).collect(),
            suspect: self.suspect.clone(),
            controls: self.controls.clone(),
            counters: self.counters.risen(),
            lacking: std::mem::take(&mut self.lacking),
            statement,
        }
    }

    /// Whose view of a pair's work was wrong, if that is known.
    fn view(&self) -> String {
        let (Some(word), Some(second)) = (self.mismatch.words.first(), self.mismatch.partner) else {
            return String::new();
        };
        let who = if (word.index as usize) < self.expected.len() / 2 { self.mismatch.cpu } else { second };
        format!(" (first seen by cpu {who})")
    }

    fn statement(&self, confirmation: Confirmation, equal: usize, refuted: &[Cpu]) -> String {
        let m = &self.mismatch;
        let total = |legs: &[Leg]| legs.iter().fold((0, 0), |(r, w), l| (r + l.runs, w + l.mismatches));
        let (suspect_runs, suspect_wrong) = total(&self.suspect);
        let (control_runs, control_wrong) = total(&self.controls);
        let seen = match m.noticed_by {
            NoticedBy::Comparison => "gave a wrong output",
            NoticedBy::Fold => "let a wrong output pass its own comparison",
        };
        let what = match m.partner {
            None => format!("cpu {} {seen} in {} {}", m.cpu, m.kernel, m.variant),
            Some(second) => {
                format!("cpus {} and {second} together {seen} in {} {}{}", m.cpu, m.kernel, m.variant, self.view())
            }
        };
        let again = format!("wrong again in {suspect_wrong} of {suspect_runs} runs");
        let control = format!("{control_wrong} of {control_runs} on control cores");
        match confirmation {
            Confirmation::Repeated if m.partner.is_some() => {
                let named = self.told_apart().0.unwrap_or(m.cpu);
                format!(
                    "{what}; {again}; wrong with a third cpu where cpu {named} took part, and not without it: cpu {named}"
                )
            }
            Confirmation::OneOfTwo => format!(
                "{what}; {again}, {control}; which of the two it is cannot be told{}",
                if control_runs == 0 { " without a third core" } else { "" }
            ),
            Confirmation::Repeated => {
                format!(
                    "{what}; {again}, {control}; expected words recomputed on {equal} other core{}",
                    if equal == 1 { "" } else { "s" }
                )
            }
            Confirmation::Once => format!("{what}; not wrong again in {suspect_runs} runs, {control}"),
            Confirmation::Shared => format!("{what}; {again}, and {control}: not this core's alone"),
            Confirmation::Refuted if self.case.seed.0 >= FRESH_FROM => format!(
                "{what}, but the reference on cpu {} gives other words than were expected of this live case: whichever cpu computed \
                 those is wrong, or that one",
                refuted.first().map_or(0, |c| c.0)
            ),
            Confirmation::Refuted => format!(
                "{what}, but the reference on cpu {} gives other words than the golden table: the tool, its table or that cpu is wrong",
                refuted.first().map_or(0, |c| c.0)
            ),
            Confirmation::Incomplete => format!("{what}; {again}, {control}; the confirmation is incomplete"),
        }
    }
}
