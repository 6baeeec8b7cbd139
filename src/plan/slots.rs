//! Who gets which unit when: the board on which a plan is laid out.

use std::cmp::Ordering;
use std::collections::BinaryHeap;

use kernels::catalogue;
use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::Rng;

use super::settings::{self, Offer};
use super::{
    Aim, Brief, Done, LONGEST_PHASE, LONGEST_SLICE, Phase, Planned, SHORTEST, Seat, Unit, below, groups, heated, pairs,
    stream, value,
};
use crate::condition::Setting;
use crate::host::Cpu;

/// Of every so many slices of the value part, one keeps to a single case.
const DWELL_EVERY: usize = 4;
/// Slots of a setting that go to what a core was wrong in: one of so many.
const SUSPECTS_OF: usize = 4;

pub(super) struct Board<'a> {
    brief: &'a Brief<'a>,
    pub rng: ChaCha12Rng,
    pub plain: Setting,
    /// Units for one cpu.
    pub singles: Vec<Unit>,
    /// Those of each kernel's first size: what other settings are tried with.
    defaults: Vec<usize>,
    /// Units for two cpus.
    pub together: Vec<Unit>,
    pub others: Vec<Offer>,
    table: Vec<u64>,
    /// Table seeds used, by seat and single unit.
    used: Vec<Vec<u64>>,
    /// Record and plan so far in the plain setting, by seat and single unit: last time, seconds.
    plainly: Vec<Vec<(u64, f64)>>,
    rounds_taken: Vec<usize>,
    /// When the pairs of each round were last all together.
    round_ages: Vec<u64>,
}

impl<'a> Board<'a> {
    pub fn new(brief: &'a Brief<'a>) -> Board<'a> {
        let plain = settings::plain(brief.site);
        let takes = |unit: &Unit| catalogue::find(unit.kernel).map_or(1, |k| k.cpus());
        let singles: Vec<Unit> = brief.units.iter().copied().filter(|u| takes(u) == 1).collect();
        let mut together: Vec<Unit> = brief.units.iter().copied().filter(|u| takes(u) == 2).collect();
        if brief.site.seats.len() < 2 {
            together.clear();
        }
        let first_size = |u: &Unit| catalogue::find(u.kernel).and_then(|k| k.sizes().first()) == Some(&u.size);
        let defaults = (0..singles.len()).filter(|&i| first_size(&singles[i])).collect();
        let per_seat = |cpu: Cpu| -> (Vec<u64>, Vec<(u64, f64)>) {
            singles
                .iter()
                .map(|&unit| {
                    let Done { last_ms, busy_ns } = brief.history.done(cpu, unit, plain);
                    (brief.history.seeds_used(cpu, unit), (last_ms, busy_ns as f64 / 1e9))
                })
                .unzip()
        };
        let (used, plainly) = brief.site.seats.iter().map(|s| per_seat(s.cpu)).unzip();
        Board {
            rng: stream(brief.seed, u64::MAX),
            plain,
            table: singles.iter().map(|u| (brief.seeds)(u).max(1)).collect(),
            others: settings::others(brief.site, brief.budget),
            defaults,
            singles,
            together,
            used,
            plainly,
            rounds_taken: Vec::new(),
            round_ages: Vec::new(),
            brief,
        }
    }

    fn cpu(&self, seat: usize) -> Cpu {
        self.brief.site.seats[seat].cpu
    }

    fn ordered_pairs(&self) -> u64 {
        let n = self.brief.site.seats.len() as u64;
        n * n.saturating_sub(1)
    }

    /// All cells of this host.
    pub fn cells(&self) -> u64 {
        let n = self.brief.site.seats.len() as u64;
        n * (self.singles.len() + self.others.len() * self.defaults.len()) as u64
            + self.ordered_pairs() * self.together.len() as u64
    }

    /// Those that were never covered.
    pub fn uncovered(&self) -> u64 {
        let history = self.brief.history;
        let plainly = self.plainly.iter().flatten().filter(|(last, _)| *last == 0).count();
        let mut count = plainly as u64;
        let seats = &self.brief.site.seats;
        for offer in &self.others {
            for &unit in &self.defaults {
                let done = history.of(self.singles[unit], offer.setting);
                count += seats.iter().filter(|s| done(s.cpu).last_ms == 0).count() as u64;
            }
        }
        for &unit in &self.together {
            let done = history.together(unit);
            for seat in seats {
                let never = |o: &&Seat| o.cpu != seat.cpu && done(seat.cpu, o.cpu).last_ms == 0;
                count += seats.iter().filter(never).count() as u64;
            }
        }
        count
    }

    /// A slice of a single unit; its seeds are the next of the unit's row on this cpu, which begins elsewhere on each.
    fn single(&mut self, seat: usize, unit: usize, cases: usize, fresh: bool, share: u32) -> Planned {
        let table = self.table[unit];
        let used = self.used[seat][unit];
        let cases = (cases as u64).clamp(1, table);
        let offset = u64::from(self.cpu(seat).0).wrapping_mul(37);
        let seeds = (0..cases).map(|k| (used + k + offset) % table).collect();
        self.used[seat][unit] = used + cases;
        Planned { unit: self.singles[unit], partner: None, seeds, next_seed: used + cases, fresh, share }
    }

    /// How many cases fit `seconds`: each is run for 20 ms and more, so that preparing its operands stays a small part.
    fn cases_in(seconds: f64, unit: &Unit) -> usize {
        let dwell = 0.02 + 0.0002 * f64::from(unit.size.0);
        (seconds / dwell) as usize
    }

    /// Large footprints take longer to prepare and get longer slices.
    fn share(unit: &Unit) -> u32 {
        4 + unit.size.0 / 2048
    }

    /// A phase in which every cpu has `count` units once, those that it has not had for longest, in an order of its own.
    pub fn sweep(&mut self, count: usize, seconds: f64, phases: &mut Vec<Phase>) {
        if count == 0 || self.singles.is_empty() {
            return;
        }
        let mut tracks = Vec::new();
        for seat in 0..self.brief.site.seats.len() {
            // one stream a cpu: adding a cpu leaves the others' plans as they were
            let mut rng = stream(self.brief.seed, u64::from(self.cpu(seat).0));
            let mut order: Vec<usize> = (0..self.singles.len()).collect();
            shuffle(&mut order, &mut rng);
            if count < order.len() {
                // stable: units equally long ago stay in random order
                order.sort_by_key(|&unit| self.plainly[seat][unit].0);
                order.truncate(count);
                shuffle(&mut order, &mut rng);
            }
            let all: u32 = order.iter().map(|&u| Board::share(&self.singles[u])).sum();
            let mut slices = Vec::with_capacity(order.len());
            for unit in order {
                let share = Board::share(&self.singles[unit]);
                let slice = seconds * f64::from(share) / f64::from(all.max(1));
                let cases = Board::cases_in(slice, &self.singles[unit]);
                self.plainly[seat][unit].1 += slice;
                slices.push(self.single(seat, unit, cases, slice > 0.2, share));
            }
            tracks.push((self.cpu(seat), slices));
        }
        phases.push(Phase { aim: Aim::Sweep, setting: self.plain, seconds, open: true, tracks });
    }

    /// Two phases in which every cpu works with one partner, first in one order and then in the other: of all rounds
    /// the one whose pairs were together longest ago. `units` of the kernels for two take part.
    pub fn next_round(&mut self, units: usize, seconds: f64, aim: Aim, phases: &mut Vec<Phase>) {
        let n = self.brief.site.seats.len();
        if units == 0 || self.together.is_empty() || n < 2 {
            return;
        }
        let history = self.brief.history;
        if self.round_ages.is_empty() {
            let done = history.together(self.together[0]);
            let age = |r: usize| {
                let both = pairs::round(n, r).into_iter().flat_map(|(a, b)| [(a, b), (b, a)]);
                both.map(|(a, b)| done(self.cpu(a), self.cpu(b)).last_ms).min().unwrap_or(0)
            };
            self.round_ages = (0..pairs::rounds(n)).map(age).collect();
        }
        let free: Vec<usize> = (0..pairs::rounds(n)).filter(|r| !self.rounds_taken.contains(r)).collect();
        let start = below(&mut self.rng.clone(), free.len());
        let oldest = (0..free.len()).map(|i| free[(start + i) % free.len()]).min_by_key(|&r| self.round_ages[r]);
        let Some(round) = oldest else { return };
        self.rounds_taken.push(round);
        self.rng.next_u64();
        let mut order: Vec<usize> = (0..self.together.len()).collect();
        shuffle(&mut order, &mut self.rng);
        let (first_seat, second_seat) = pairs::round(n, round)[0];
        let (one, other) = (self.cpu(first_seat), self.cpu(second_seat));
        order.sort_by_key(|&u| history.done_together(one, other, self.together[u]).last_ms);
        order.truncate(units);
        for swapped in [false, true] {
            let mut tracks = Vec::new();
            for &(a, b) in &pairs::round(n, round) {
                let (a, b) = if swapped { (b, a) } else { (a, b) };
                let partner = Some(self.cpu(b));
                let slices = order
                    .iter()
                    .map(|&u| {
                        let unit = self.together[u];
                        let table = (self.brief.seeds)(&unit).max(1);
                        let used = history.seeds_used(self.cpu(a), unit);
                        let cases = (Board::cases_in(seconds / 2.0 / order.len() as f64, &unit) as u64).clamp(1, table);
                        let seeds = (0..cases).map(|k| (used + k) % table).collect();
                        Planned { unit, partner, seeds, next_seed: used + cases, fresh: false, share: 4 }
                    })
                    .collect();
                tracks.push((self.cpu(a), slices));
            }
            phases.push(Phase { aim, setting: self.plain, seconds: seconds / 2.0, open: false, tracks });
        }
    }

    /// Which other settings get how many slots in this window, and in how many windows like it their cells are all
    /// covered. A slot is one slice on one cpu, or on each cpu where all work at once.
    pub fn grant(&self, idle_s: f64, heated_s: f64) -> (Vec<(Offer, usize)>, u64) {
        if self.defaults.is_empty() {
            return (Vec::new(), 1);
        }
        // slots that cover every cell of a setting once
        let all = |offer: &Offer| {
            let groups = groups(self.brief.site, offer.setting.arrangement).len();
            groups.max(1) * self.defaults.len()
        };
        let (hot, mut cold): (Vec<Offer>, Vec<Offer>) =
            self.others.iter().copied().partition(|o| heated(o.setting).is_some());
        // costs no idle time, but must not crowd the rest out
        let mut granted: Vec<(Offer, usize)> = hot
            .into_iter()
            .filter(|o| heated(o.setting).is_some_and(|seconds| f64::from(seconds) <= 2.0 * heated_s))
            .map(|o| (o, (heated_s / o.slice) as usize))
            .collect();
        let cost = |offers: &[Offer], windows: usize| -> f64 {
            offers.iter().map(|o| all(o).div_ceil(windows) as f64 * o.slice * o.idle).sum()
        };
        let longest = cold.iter().map(all).max().unwrap_or(1);
        let mut turns = 1;
        if cost(&cold, longest) <= idle_s {
            // the fewest windows in which the idle time of each is enough for all settings
            let (mut too_few, mut enough) = (0, longest);
            while enough - too_few > 1 {
                let middle = (too_few + enough) / 2;
                if cost(&cold, middle) <= idle_s { enough = middle } else { too_few = middle }
            }
            granted.extend(cold.iter().map(|o| (*o, all(o).div_ceil(enough))));
        } else {
            // not even one slot of each: by turns, those first that had theirs longest ago
            let history = self.brief.history;
            let last = |offer: &Offer| {
                let one = |seat: usize| {
                    let units = self.defaults.iter();
                    units.map(move |&u| history.done(self.cpu(seat), self.singles[u], offer.setting).last_ms)
                };
                // the newest record of it on a few cpus tells when it last had its turn
                (0..self.brief.site.seats.len().min(4)).flat_map(one).max().unwrap_or(0)
            };
            // stable: settings that never had a turn stay in the order of their list
            cold.sort_by_key(last);
            let (mut left, mut taken) = (idle_s, 0usize);
            for offer in &cold {
                let two = 2.0 * offer.slice * offer.idle;
                if two <= left {
                    left -= two;
                    taken += 1;
                    granted.push((*offer, 2));
                }
            }
            turns = cold.len().div_ceil(taken.max(1));
        }
        // a quarter of the slots may go to what was wrong before
        let sure = |slots: usize| slots - if self.brief.history.any_wrong() { slots / SUSPECTS_OF } else { 0 };
        let windows = granted.iter().map(|(o, slots)| all(o).div_ceil(sure(*slots).max(1))).max().unwrap_or(1);
        for (offer, slots) in &mut granted {
            *slots = (*slots).min(all(offer));
        }
        (granted, (windows * turns) as u64)
    }

    /// The phases of one other setting: of all its cells those that waited longest.
    pub fn special(&mut self, offer: Offer, slots: usize, total: f64) -> Vec<Vec<Phase>> {
        let groups = groups(self.brief.site, offer.setting.arrangement);
        let history = self.brief.history;
        // a group's place by unit: when the first of its cpus that has waited longest had it
        let mut rng = self.rng.clone();
        self.rng.next_u64();
        let mut places: Vec<(bool, u64, u64, usize, usize)> = Vec::new();
        for &unit in &self.defaults {
            let cell = self.singles[unit];
            let done = history.of(cell, offer.setting);
            let last = |&seat: &usize| done(self.cpu(seat)).last_ms;
            for (g, group) in groups.iter().enumerate() {
                let wrong =
                    history.any_wrong() && group.iter().any(|&seat| history.was_wrong(self.cpu(seat), cell.kernel));
                places.push((wrong, group.iter().map(last).min().unwrap_or(0), rng.next_u64(), g, unit));
            }
        }
        // those with a record against them first, in a part of the slots; the rest by age
        let mut suspects: Vec<_> = places.iter().copied().filter(|p| p.0).collect();
        suspects.sort_unstable_by_key(|p| (p.1, p.2));
        suspects.truncate(slots / SUSPECTS_OF);
        places.sort_unstable_by_key(|p| (p.1, p.2));
        let mut chosen = suspects;
        for place in places {
            if chosen.len() >= slots {
                break;
            }
            if !chosen.contains(&place) {
                chosen.push(place);
            }
        }
        let mut phases = Vec::new();
        for (g, group) in groups.iter().enumerate() {
            let mut units: Vec<usize> = chosen.iter().filter(|p| p.3 == g).map(|p| p.4).collect();
            if units.is_empty() {
                continue;
            }
            let seconds = units.len() as f64 * offer.slice;
            let mut tracks = Vec::new();
            for &seat in group {
                shuffle(&mut units, &mut rng);
                let slices = units.iter().map(|&unit| self.single(seat, unit, 1, false, 4)).collect();
                tracks.push((self.cpu(seat), slices));
            }
            let mut together = Vec::new();
            if let Some(heating) = heated(offer.setting) {
                together.push(self.heating(f64::from(heating).min(total / 4.0)));
            }
            // a confirmation between its slices would make a lie of the setting
            together.push(Phase { aim: Aim::Setting, setting: offer.setting, seconds, open: false, tracks });
            phases.push(together);
        }
        phases
    }

    /// Every cpu at its hottest: the widest FMA kernel, or the widest multiplications where there is none.
    fn heating(&mut self, seconds: f64) -> Phase {
        let hot = |u: &Unit| {
            let family = ["integer", "float", "vector", "fma"].iter().position(|f| u.kernel.starts_with(f));
            (family, u.variant)
        };
        let hottest = (0..self.singles.len()).max_by_key(|&i| hot(&self.singles[i])).unwrap_or(0);
        let slices = (seconds / LONGEST_SLICE.as_secs_f64()).ceil().max(1.0) as usize;
        let each = seconds / slices as f64;
        let cases = Board::cases_in(each, &self.singles[hottest]);
        let tracks = (0..self.brief.site.seats.len())
            .map(|seat| {
                self.plainly[seat][hottest].1 += seconds;
                let track = (0..slices).map(|_| self.single(seat, hottest, cases, false, 4)).collect();
                (self.cpu(seat), track)
            })
            .collect();
        Phase { aim: Aim::Heating, setting: self.plain, seconds, open: false, tracks }
    }

    /// What is left of the window at full pace, each cpu with what is worth most to it.
    pub fn value(&mut self, seconds: f64) -> Vec<Phase> {
        if self.singles.is_empty() || seconds < SHORTEST {
            return Vec::new();
        }
        let slice = (seconds / 100.0).clamp(0.1, LONGEST_SLICE.as_secs_f64() * 0.95).min(seconds);
        let count = ((seconds / slice).round() as usize).max(1);
        let chunks = (seconds / LONGEST_PHASE).ceil().max(1.0) as usize;
        let mut phases: Vec<Phase> = (0..chunks)
            .map(|_| Phase {
                aim: Aim::Value,
                setting: self.plain,
                seconds: seconds / chunks as f64,
                open: true,
                tracks: Vec::new(),
            })
            .collect();
        for seat in 0..self.brief.site.seats.len() {
            let mut order = self.worth_most(seat, count, slice);
            let mut rng = stream(self.brief.seed, u64::from(self.cpu(seat).0) | 1 << 40);
            shuffle(&mut order, &mut rng);
            let mut slices: Vec<Planned> = Vec::with_capacity(count);
            for (number, unit) in order.into_iter().enumerate() {
                let cases = Board::cases_in(slice, &self.singles[unit]);
                // one case for long finds what many for short do not, and the other way round
                let cases = if number % DWELL_EVERY == 0 { 1 } else { cases };
                slices.push(self.single(seat, unit, cases, number % DWELL_EVERY != 0, 4));
            }
            let cpu = self.cpu(seat);
            let mut rest = slices.into_iter();
            for (k, phase) in phases.iter_mut().enumerate() {
                let part = count * (k + 1) / chunks - count * k / chunks;
                phase.tracks.push((cpu, rest.by_ref().take(part).collect()));
            }
        }
        phases
    }

    /// `count` slots of `slice` seconds on one cpu, each given to the unit whose next second is worth most.
    fn worth_most(&mut self, seat: usize, count: usize, slice: f64) -> Vec<usize> {
        let (cpu, history) = (self.cpu(seat), self.brief.history);
        let suspicious = history.any_wrong();
        let families: Vec<&str> = self.singles.iter().map(|u| u.kernel.split('.').next().unwrap_or("")).collect();
        let wrong: Vec<bool> = self.singles.iter().map(|u| suspicious && history.was_wrong(cpu, u.kernel)).collect();
        let related = |unit: usize| wrong.iter().zip(&families).any(|(w, f)| *w && *f == families[unit]);
        let weights: Vec<f64> = (0..self.singles.len())
            .map(|u| {
                let weight = value::weight(families[u]);
                match (wrong[u], suspicious && related(u)) {
                    (true, _) => weight * value::SUSPECTED,
                    (false, true) => weight * value::RELATED,
                    (false, false) => weight,
                }
            })
            .collect();
        let suspects: Vec<usize> = (0..self.singles.len()).filter(|&u| wrong[u]).collect();
        let mut order = Vec::with_capacity(count);
        if !suspects.is_empty() {
            let reserved = (count as f64 * value::SUSPECTS_PART).ceil() as usize;
            let start = below(&mut self.rng, suspects.len());
            for k in 0..reserved {
                let unit = suspects[(start + k) % suspects.len()];
                self.plainly[seat][unit].1 += slice;
                order.push(unit);
            }
        }
        let worth = |unit: usize, (last, spent): (u64, f64)| {
            let days = self.brief.now_ms.saturating_sub(last) as f64 / 86_400_000.0;
            value::next_second(weights[unit], spent, if last == 0 { 60.0 } else { days })
        };
        let mut heap: BinaryHeap<Worth> =
            (0..self.singles.len()).map(|u| Worth(worth(u, self.plainly[seat][u]), u)).collect();
        while order.len() < count
            && let Some(Worth(_, unit)) = heap.pop()
        {
            order.push(unit);
            self.plainly[seat][unit].1 += slice;
            heap.push(Worth(worth(unit, self.plainly[seat][unit]), unit));
        }
        order
    }
}

/// A value with its unit; the greatest value first, then the lowest number.
struct Worth(f64, usize);

impl PartialEq for Worth {
    fn eq(&self, other: &Worth) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Worth {}

impl PartialOrd for Worth {
    fn partial_cmp(&self, other: &Worth) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Worth {
    fn cmp(&self, other: &Worth) -> Ordering {
        self.0.total_cmp(&other.0).then(other.1.cmp(&self.1))
    }
}

/// Fisher–Yates (Durstenfeld 1964).
pub(super) fn shuffle<T>(items: &mut [T], rng: &mut impl Rng) {
    for i in (1..items.len()).rev() {
        items.swap(i, below(rng, i + 1));
    }
}
