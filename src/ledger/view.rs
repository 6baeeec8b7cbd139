//! One pass over a ledger for everything that is to be shown of it.

use std::collections::BTreeSet;
use std::path::Path;

use crate::event::{Event, Mismatch, Purpose, Slice};
use crate::host::Cpu;
use crate::ledger::cells::{Scope, Tally};
use crate::ledger::error::Error;
use crate::ledger::filter::Filter;
use crate::ledger::groups::{Dimension, Groups};
use crate::ledger::history::History;
use crate::ledger::record::Record;
use crate::ledger::recover::{Reader, Summary};
use crate::ledger::words::{LayoutOf, Words};
use crate::ledger::wrongs::Wrongs;

/// What is wanted beyond the sums of a tally.
#[derive(Clone, Debug, Default)]
pub struct Wanted {
    /// Which records.
    pub filter: Filter,
    /// Sums by these.
    pub by: Vec<Dimension>,
    /// Episodes.
    pub episodes: bool,
    /// Histories.
    pub timeline: bool,
    /// Wrong words; needs to know how outputs are laid out.
    pub words: Option<LayoutOf>,
}

/// What a ledger came to.
#[derive(Debug)]
pub struct View {
    /// Counts and times.
    pub tally: Tally,
    /// How reading ended.
    pub summary: Summary,
    /// Sums by what was asked for.
    pub groups: Groups,
    /// Wrong slices, for episodes and words.
    pub wrongs: Option<Wrongs>,
    /// Histories.
    pub history: Option<History>,
    /// Wrong words.
    pub words: Option<Words>,
    /// Cpus on record, whatever the filter.
    pub known_cpus: BTreeSet<Cpu>,
    /// Kernels on record, whatever the filter.
    pub known_kernels: BTreeSet<String>,
}

/// A view under construction.
struct Pass<'a> {
    filter: &'a Filter,
    tally: Tally,
    groups: Groups,
    wrongs: Option<Wrongs>,
    history: Option<History>,
    words: Option<Words>,
    known_cpus: BTreeSet<Cpu>,
    known_kernels: BTreeSet<String>,
}

impl View {
    /// Reads the ledger at `path` as far as it can be relied on.
    ///
    /// # Errors
    /// There is no ledger, or it cannot be read at all. Damage is told by the summary.
    pub fn read(path: &Path, wanted: &Wanted) -> Result<View, Error> {
        let mut reader = Reader::open(path)?;
        let only = wanted.filter.cpu;
        let mut pass = Pass {
            filter: &wanted.filter,
            tally: Tally::new(Scope::default()),
            groups: Groups::new(&wanted.by, only),
            wrongs: (wanted.episodes || wanted.words.is_some()).then(Wrongs::default),
            history: wanted.timeline.then(|| History::new(only)),
            words: wanted.words.map(Words::new),
            known_cpus: BTreeSet::new(),
            known_kernels: BTreeSet::new(),
        };
        for entry in reader.by_ref() {
            match &entry.record {
                Record::Event(event) => pass.add(event),
                Record::Unknown { .. } => pass.tally.add_record(&entry.record),
            }
        }
        let Pass { tally, groups, wrongs, history, words, known_cpus, known_kernels, .. } = pass;
        let summary = reader.finish();
        Ok(View { tally, summary, groups, wrongs, history, words, known_cpus, known_kernels })
    }

    /// Mismatches whose slice never came on record: evidence without exposure.
    pub fn orphans(&self) -> impl Iterator<Item = &Mismatch> {
        self.tally.without_slice()
    }
}

impl Pass<'_> {
    fn add(&mut self, event: &Event) {
        let wanted = self.filter.wants(event);
        if let Event::Slice(slice) = event {
            return self.slice(slice, event, wanted);
        }
        if !wanted {
            return;
        }
        self.tally.add(event);
        let tally = &self.tally;
        let counts = |job_id, job| tally.in_scope(job_id, job);
        match event {
            Event::Opened(opened) => {
                let counts = counts(opened.job_id, opened.job);
                if counts {
                    self.known_cpus.extend(&opened.cpus);
                }
                if let Some(history) = &mut self.history {
                    history.open(opened, counts);
                }
            }
            Event::Mismatch(m) if counts(m.job_id, m.job) => {
                if let Some(words) = &mut self.words {
                    words.add(m);
                }
            }
            Event::Lost(lost) if counts(lost.job_id, lost.job) => {
                self.known_kernels.insert(lost.kernel.clone());
                if let Some(history) = &mut self.history {
                    history.lost(lost);
                }
            }
            Event::Finding(finding) if counts(finding.job_id, finding.job) => {
                if let Some(history) = &mut self.history {
                    history.finding(finding);
                }
            }
            Event::Remark(remark) => {
                if let Some(history) = &mut self.history {
                    history.remark(remark);
                }
            }
            Event::Closed(closed) => {
                if let Some(history) = &mut self.history {
                    history.close(closed);
                }
            }
            _ => {}
        }
    }

    fn slice(&mut self, slice: &Slice, event: &Event, wanted: bool) {
        let counts = self.tally.in_scope(slice.job_id, slice.job);
        if counts {
            self.known_cpus.insert(slice.cpu);
            self.known_cpus.extend(slice.partner.map(|p| p.cpu));
            if !self.known_kernels.contains(&slice.kernel) {
                self.known_kernels.insert(slice.kernel.clone());
            }
        }
        if !wanted {
            return self.tally.pass_over(slice);
        }
        self.tally.add(event);
        if !counts || slice.purpose != Purpose::Plan {
            return;
        }
        if let Some(history) = &mut self.history {
            history.slice(slice, slice.void.is_none());
        }
        if slice.void.is_none() {
            self.groups.add(slice);
            if let Some(wrongs) = &mut self.wrongs {
                wrongs.add(slice);
            }
        }
    }
}
