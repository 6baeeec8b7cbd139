//! What several commands do first: read the host, choose cpus and kernels, find the ledger, open it.

use std::collections::BTreeSet;
use std::path::PathBuf;
use std::time::{Duration, SystemTime, UNIX_EPOCH};

use super::args::{Choice, LedgerPlace, parse_variants};
use crate::error::Error;
use crate::event::{Event, Job, Opened, Purpose};
use crate::host::cpulist::CpuChoice;
use crate::host::{Cpu, Host, Root};
use crate::ledger::{self, Journal, Opening};
use crate::plan::{self, History, Ran, Skipped, Unit};
use crate::run::checker::Seat;
use crate::run::driver::unix_ms;

/// Spent by a window before the first slice and after the last.
pub const OVERHEAD: Duration = Duration::from_millis(400);

/// Reads this host.
pub fn host() -> Result<Host, Error> {
    host_below(std::path::Path::new("/"))
}

/// Reads this host where its files lie below `root`.
pub fn host_below(root: &std::path::Path) -> Result<Host, Error> {
    if !root.is_dir() {
        return Err(Error::Usage(format!("--root {}: no such folder", root.display())));
    }
    Host::read(&Root::new(root)).map_err(|why| Error::CannotDo(why.to_string()))
}

/// The cpus that are to be tested, with their cores.
pub fn seats(host: &Host, choice: &Choice) -> Result<Vec<Seat>, Error> {
    let wanted = match &choice.cpus {
        None => CpuChoice::All,
        Some(text) => text.parse().map_err(|why| Error::Usage(format!("--cpus {text}: {why}")))?,
    };
    // what was named and cannot be had is the user's to mend; having no cpu at all is the host's state
    let chosen = host.allowed.choose(&wanted, &host.topology).map_err(|why| match wanted {
        CpuChoice::All => Error::CannotDo(why.to_string()),
        CpuChoice::Only(_) => Error::Usage(format!("--cpus: {why}")),
    })?;
    Ok(chosen.iter().map(|cpu| (cpu, core_of(host, cpu))).collect())
}

/// Every cpu that this process may use, with its core: those may recompute and give second opinions.
pub fn all_seats(host: &Host) -> Vec<Seat> {
    let online = host.topology.online();
    host.allowed.mask.intersection(&online).iter().map(|cpu| (cpu, core_of(host, cpu))).collect()
}

fn core_of(host: &Host, cpu: Cpu) -> u32 {
    host.topology.cpus.get(&cpu).map_or(cpu.0, |place| place.core.0)
}

/// The units that were asked for, and what cannot run here.
pub fn units(choice: &Choice) -> Result<(Vec<Unit>, Vec<Skipped>), Error> {
    let mut patterns = Vec::new();
    for text in &choice.kernels {
        let pattern =
            glob::Pattern::new(text).map_err(|why| Error::Usage(format!("--kernels {text}: {why}; try 'fma.*'")))?;
        if !kernels::catalogue::KERNELS.iter().any(|k| pattern.matches(k.id())) {
            let known: Vec<&str> = kernels::catalogue::KERNELS.iter().map(|k| k.id()).collect();
            return Err(Error::Usage(format!("--kernels {text}: no such kernel; known are {}", known.join(", "))));
        }
        patterns.push(pattern);
    }
    let variants = parse_variants(&choice.variants).map_err(Error::Usage)?;
    let (mut units, mut skipped) = plan::available(|id| patterns.is_empty() || patterns.iter().any(|p| p.matches(id)));
    if !variants.is_empty() {
        units.retain(|u| variants.contains(&u.variant));
        skipped.retain(|s| variants.contains(&s.variant));
    }
    if units.is_empty() {
        let why = skipped.first().map_or("not built for this machine".to_owned(), |s| s.why.clone());
        return Err(Error::CannotDo(format!("none of the kernels and variants asked for can run here: {why}")));
    }
    Ok((units, skipped))
}

/// Where one cpu is tested, kernels for two are set aside, and said so.
pub fn without_pairs(units: &mut Vec<Unit>, skipped: &mut Vec<Skipped>, cpus: usize) -> Result<(), Error> {
    if cpus > 1 {
        return Ok(());
    }
    let takes_two = |u: &Unit| kernels::catalogue::find(u.kernel).is_some_and(|k| k.cpus() == 2);
    let two = units.extract_if(.., |u| takes_two(u));
    let why = "takes two cpus, and one is tested";
    skipped.extend(two.map(|u| Skipped { kernel: u.kernel, variant: u.variant, why: why.to_owned() }));
    if units.is_empty() {
        return Err(Error::Usage(format!("--kernels: {why}; name two cpus, e.g. --cpus 0,1")));
    }
    Ok(())
}

/// The golden tables, pins checked.
pub fn open_golden() -> Result<(), Error> {
    golden::table::open().map_err(|why| Error::CannotDo(why.to_string()))
}

/// Golden seeds of a unit: so many, beginning at 0.
pub fn seeds_of(unit: &Unit) -> u64 {
    golden::table::cases(unit.kernel, unit.size).len() as u64
}

/// Takes a record into a plan's history.
pub fn remember(history: &mut History, event: &Event) {
    if let Event::Slice(slice) = event
        && slice.job == Job::Window
        && slice.void.is_none()
        && slice.purpose == Purpose::Plan
        && let Some((unit, condition)) = plan::unit_of(&slice.kernel, &slice.variant, &slice.condition)
    {
        history.add(&Ran {
            cpu: slice.cpu,
            partner: slice.partner.map(|p| p.cpu),
            unit,
            condition,
            end_ms: slice.wall_ms.saturating_add(slice.span_ns / 1_000_000),
            busy_ns: slice.busy_ns,
            mismatches: slice.mismatches,
            next_seed: slice.next_seed,
        });
    }
}

/// Whether a record's job is one of this host and part; openings come before all else of their job.
pub struct OwnJobs {
    identity: (String, String),
    jobs: BTreeSet<u64>,
}

impl OwnJobs {
    /// Of the host as it is now.
    pub fn of(host: &Host) -> OwnJobs {
        OwnJobs { identity: identity(host), jobs: BTreeSet::new() }
    }

    /// Takes the next record in and says whether it counts.
    pub fn counts(&mut self, event: &Event) -> bool {
        match event {
            Event::Opened(o) => {
                if (&o.host, &o.part) == (&self.identity.0, &self.identity.1) {
                    self.jobs.insert(o.job_id);
                }
                false
            }
            Event::Slice(s) => self.jobs.contains(&s.job_id),
            _ => false,
        }
    }
}

/// The history of this host and part in a ledger that is only read; empty where there is none.
pub fn read_history(host: &Host, path: &std::path::Path) -> Result<History, Error> {
    let mut history = History::default();
    if !path.exists() {
        return Ok(history);
    }
    let mut own = OwnJobs::of(host);
    for entry in ledger::Reader::open(path).map_err(cannot)? {
        if let ledger::Record::Event(event) = &entry.record
            && own.counts(event)
        {
            remember(&mut history, event);
        }
    }
    Ok(history)
}

/// The ledger's folder.
pub fn ledger_path(place: &LedgerPlace) -> PathBuf {
    if let Some(path) = &place.ledger {
        return path.clone();
    }
    let state = || {
        let named = std::env::var_os("XDG_STATE_HOME").map(PathBuf::from).filter(|p| p.is_absolute());
        named.or_else(|| std::env::var_os("HOME").map(|h| PathBuf::from(h).join(".local/state")))
    };
    let root = nix::unistd::geteuid().is_root();
    let base = if root { None } else { state() };
    base.unwrap_or_else(|| PathBuf::from("/var/lib")).join("proofhouse/ledger")
}

/// A failure of the ledger is always "could not do the job".
pub fn cannot(why: ledger::Error) -> Error {
    Error::CannotDo(format!("ledger: {why}"))
}

/// A seed, from the clock if none was given.
pub fn seed(given: Option<u64>) -> u64 {
    let clock = || SystemTime::now().duration_since(UNIX_EPOCH).map_or(0, |d| d.as_nanos() as u64);
    // 48 bits: exact in every JSON reader
    given.unwrap_or_else(|| clock() & 0xffff_ffff_ffff)
}

/// The key of the host and of its parts, as records carry them.
pub fn identity(host: &Host) -> (String, String) {
    let key = host.host_key().map_or("unknown".to_owned(), |k| format!("{}:{}", k.source.name(), k.key));
    let mut parts: Vec<&str> = host.cpu_keys.values().map(|k| k.part.as_str()).collect();
    parts.sort_unstable();
    parts.dedup();
    (key, if parts.is_empty() { "unknown".to_owned() } else { parts.join("+") })
}

/// The opening record of a job.
pub fn opened(host: &Host, job: Job, job_id: u64, budget_s: f64, seed: u64, seats: &[Seat]) -> Opened {
    let (host_key, part) = identity(host);
    Opened {
        job_id,
        job,
        wall_ms: unix_ms(),
        budget_s,
        seed,
        host: host_key,
        part,
        virtualised: host.virtualised.answer.unwrap_or(false),
        program: env!("CARGO_PKG_VERSION").to_owned(),
        golden: golden::table::set_digest(),
        cpus: seats.iter().map(|(cpu, _)| *cpu).collect(),
    }
}

/// Opens the journal, handing every earlier event to `each`, and makes sure that it can be written before work starts.
pub fn open_journal(place: &LedgerPlace, mut each: impl FnMut(&Event)) -> Result<(Journal, Opening, PathBuf), Error> {
    let path = ledger_path(place);
    let (journal, opening) = Journal::open_reading(&path, unix_ms(), |entry| {
        if let ledger::Record::Event(event) = &entry.record {
            each(event);
        }
    })
    .map_err(cannot)?;
    Ok((journal, opening, path))
}
