use std::collections::BTreeSet;

use kernels::Size;

use super::*;
use crate::condition::{Arrangement, Pace};

const DAY: u64 = 86_400_000;

fn units() -> Vec<Unit> {
    available(|_| true).0
}

fn site(cpus: u32, threads: u32) -> Site {
    let seats = (0..cpus).map(|n| Seat { cpu: Cpu(n), core: n / threads, caches: [None; 3] });
    Site { seats: seats.collect() }
}

fn make(site: &Site, units: &[Unit], history: &History, budget: f64, now_ms: u64, seed: u64) -> Plan {
    plan(&Brief { site, units, history, budget: Duration::from_secs_f64(budget), now_ms, seed, seeds: &|_| 64 })
}

/// What a window that goes by plan leaves on record.
fn carry_out(plan: &Plan, now_ms: u64, history: &mut History, wrong: impl Fn(Cpu, &Unit) -> bool) {
    let mut at = now_ms as f64;
    for phase in &plan.phases {
        at += phase.seconds * 1000.0;
        for (cpu, slices) in &phase.tracks {
            let shares: u32 = slices.iter().map(|s| s.share).sum();
            for slice in slices {
                let seconds = phase.seconds * f64::from(slice.share) / f64::from(shares.max(1));
                let condition = Condition {
                    setting: phase.setting,
                    paired: slice.partner.is_some(),
                    level: None,
                    kib: slice.unit.size.0,
                };
                history.add(&Ran {
                    cpu: *cpu,
                    partner: slice.partner,
                    unit: slice.unit,
                    condition,
                    end_ms: at as u64,
                    busy_ns: (seconds * 1e9 * phase.setting.pace.duty()) as u64,
                    mismatches: u64::from(wrong(*cpu, &slice.unit)),
                    next_seed: Some(slice.next_seed),
                });
            }
        }
    }
}

fn busy(plan: &Plan, cpu: Cpu, kernel: &str) -> f64 {
    let mut sum = 0.0;
    for phase in &plan.phases {
        for (_, slices) in phase.tracks.iter().filter(|(c, _)| *c == cpu) {
            let shares: u32 = slices.iter().map(|s| s.share).sum();
            let mine: u32 = slices.iter().filter(|s| s.unit.kernel == kernel).map(|s| s.share).sum();
            sum += phase.seconds * phase.setting.pace.duty() * f64::from(mine) / f64::from(shares.max(1));
        }
    }
    sum
}

#[test]
fn a_sweep_comes_first_and_has_every_unit_on_every_cpu() {
    let units = units();
    let takes = |u: &Unit| kernels::catalogue::find(u.kernel).unwrap().cpus();
    for (cpus, budget) in [(1, 60.0), (2, 60.0), (5, 60.0), (8, 600.0)] {
        let plan = make(&site(cpus, 1), &units, &History::default(), budget, DAY, 7);
        assert!(plan.sweep && plan.left_out == 0);
        let sweep: Vec<&Phase> = plan.phases.iter().take_while(|p| p.aim == Aim::Sweep).collect();
        let mut had: BTreeSet<(Cpu, Unit, bool)> = BTreeSet::new();
        for (cpu, slices) in sweep.iter().flat_map(|p| &p.tracks) {
            for s in slices {
                had.insert((*cpu, s.unit, false));
                had.extend(s.partner.map(|p| (p, s.unit, true)));
            }
        }
        for cpu in 0..cpus {
            for unit in &units {
                let first = had.contains(&(Cpu(cpu), *unit, false));
                // in a round of an odd number one cpu has no partner
                if takes(unit) == 1 {
                    assert!(first, "cpu {cpu} without {unit:?}");
                } else if cpus % 2 == 0 {
                    assert!(first && had.contains(&(Cpu(cpu), *unit, true)), "cpu {cpu} without a role of {unit:?}");
                }
            }
        }
    }
}

#[test]
fn the_same_input_gives_the_same_plan_and_cpus_differ() {
    let (site, units, none) = (site(4, 1), units(), History::default());
    let one = make(&site, &units, &none, 60.0, DAY, 7);
    assert_eq!(one, make(&site, &units, &none, 60.0, DAY, 7));
    assert_ne!(one, make(&site, &units, &none, 60.0, DAY, 8));
    assert_ne!(one.phases[0].tracks[0].1, one.phases[0].tracks[1].1);
}

#[test]
fn phases_fill_the_budget_and_idle_time_stays_within_its_part() {
    let units = units();
    for (cpus, threads, budget) in [(2, 1, 600.0), (2, 2, 300.0), (64, 2, 300.0), (3, 1, 90.0)] {
        let site = site(cpus, threads);
        let plan = make(&site, &units, &History::default(), budget, DAY, 3);
        let all: f64 = plan.phases.iter().map(|p| p.seconds + CHANGE).sum();
        assert!((all - budget).abs() < 0.02 * budget, "{cpus} cpus: {all} of {budget}");
        let idle: f64 = plan
            .phases
            .iter()
            .filter(|p| p.aim == Aim::Setting)
            .map(|p| {
                let cpus_busy: usize =
                    p.tracks.iter().map(|(_, s)| if s.iter().any(|s| s.partner.is_some()) { 2 } else { 1 }).sum();
                let rests = matches!(p.setting.before, Before::Rested(_));
                let duty = if rests { 0.15 } else { p.setting.pace.duty() };
                p.seconds * (1.0 - duty * cpus_busy as f64 / f64::from(cpus))
            })
            .sum();
        assert!(idle <= (IDLE_PART + 0.006) * budget, "{cpus} cpus: {idle} s idle of {budget}");
    }
}

#[test]
fn two_cpus_and_ten_minutes_have_every_condition() {
    let plan = make(&site(2, 1), &units(), &History::default(), 600.0, DAY, 3);
    let all = settings::others(&site(2, 1), Duration::from_secs(600));
    for offer in &all {
        assert!(plan.settings.contains(&offer.setting), "{} is missing", offer.setting);
    }
    assert!(all.len() >= 15);
}

#[test]
fn arrangements_say_the_truth_about_who_is_busy() {
    let site = site(8, 2);
    let plan = make(&site, &units(), &History::default(), 600.0, DAY, 3);
    let mut seen = BTreeSet::new();
    for phase in &plan.phases {
        let busy: BTreeSet<u32> = phase.tracks.iter().map(|(cpu, _)| cpu.0).collect();
        let cores: BTreeSet<u32> = busy.iter().map(|cpu| cpu / 2).collect();
        match phase.setting.arrangement {
            Arrangement::Solo => assert_eq!(busy.len(), 1),
            Arrangement::Siblings => assert_eq!((busy.len(), cores.len()), (2, 1)),
            Arrangement::Neighbours => assert_eq!((busy.len(), cores.len()), (4, 4)),
            Arrangement::All => {}
        }
        seen.insert(phase.setting.arrangement);
        assert_eq!(
            phase.open,
            phase.setting == Setting::PLAIN
                && matches!(phase.aim, Aim::Sweep | Aim::Value)
                && phase.tracks.iter().all(|(_, s)| s.iter().all(|s| s.partner.is_none()))
        );
    }
    assert_eq!(seen.len(), 4);
}

#[test]
fn short_windows_take_what_waited_longest_and_go_on_next_time() {
    let (site, units) = (site(2, 1), units());
    let mut history = History::default();
    let first = make(&site, &units, &history, 1.0, DAY, 1);
    assert!(!first.sweep && first.left_out > 0);
    let windows = units.len() as u64 * 3;
    let mut now = DAY;
    for seed in 0..windows {
        let plan = make(&site, &units, &history, 1.0, now, seed);
        carry_out(&plan, now, &mut history, |_, _| false);
        now += DAY;
        if plan.grid.uncovered == 0 {
            break;
        }
    }
    for seat in &site.seats {
        for unit in &units {
            let two = kernels::catalogue::find(unit.kernel).unwrap().cpus() == 2;
            let other = Cpu(1 - seat.cpu.0);
            let last = if two {
                history.done_together(seat.cpu, other, *unit).last_ms
            } else {
                history.done(seat.cpu, *unit, Setting::PLAIN).last_ms
            };
            assert!(last > 0, "{unit:?} was never reached on cpu {}", seat.cpu);
        }
    }
}

#[test]
fn table_seeds_come_round_only_when_all_were_used() {
    let (site, units) = (site(2, 1), units());
    let mut history = History::default();
    let unit = units[0];
    let mut used = [0u32; 64];
    for (n, now) in (0..40).map(|n| (n, (n + 1) * DAY)) {
        let plan = make(&site, &units, &history, 60.0, now, n);
        for phase in &plan.phases {
            for (_, slices) in phase.tracks.iter().filter(|(cpu, _)| cpu.0 == 1) {
                let seeds = slices.iter().filter(|s| s.unit == unit).flat_map(|s| &s.seeds);
                seeds.for_each(|seed| used[*seed as usize] += 1);
            }
        }
        let (least, most) = (used.iter().min().unwrap(), used.iter().max().unwrap());
        assert!(most - least <= 1, "window {n}: a seed was used {most} times, another {least}");
        carry_out(&plan, now, &mut history, |_, _| false);
    }
    assert!(used.iter().all(|n| *n >= 2), "{used:?}");
}

/// Sixty windows of five minutes on 64 cpus; also what `scripts/simulate-windows` shows.
#[test]
fn a_fleet_of_windows_covers_the_grid_and_goes_after_what_was_wrong() {
    let (site, units) = (site(64, 2), units());
    let mut history = History::default();
    let (suspect, clean) = (Cpu(17), Cpu(40));
    let failing = "fma.chain64";
    let failing = if units.iter().any(|u| u.kernel == failing) { failing } else { units[0].kernel };
    let mut predicted = 0;
    let mut done_in = None;
    let mut ratio = 0.0;
    for window in 0..60u64 {
        let now = (window + 1) * DAY;
        let plan = make(&site, &units, &history, 300.0, now, window);
        if window == 0 {
            predicted = plan.grid.windows;
        }
        if plan.grid.uncovered == 0 && done_in.is_none() {
            done_in = Some(window);
        }
        if window == 59 {
            ratio = busy(&plan, suspect, failing) / busy(&plan, clean, failing);
        }
        // one wrong output, in the last window but one
        carry_out(&plan, now, &mut history, |cpu, unit| window == 58 && cpu == suspect && unit.kernel == failing);
    }
    println!(
        "64 cpus, 300 s: {predicted} windows predicted, all covered after {done_in:?}; exposure of the suspect {ratio:.1} times"
    );
    assert!(predicted > 0 && predicted <= 60, "{predicted} windows predicted");
    assert!(done_in.is_some_and(|n| n <= predicted), "covered after {done_in:?} windows, {predicted} predicted");
    assert!(ratio >= 5.0, "{ratio}");
}

#[test]
fn pairs_meet_over_the_windows_and_nobody_has_two_partners_at_once() {
    let (site, units) = (site(7, 1), units());
    if units.iter().all(|u| kernels::catalogue::find(u.kernel).unwrap().cpus() == 1) {
        return;
    }
    let mut history = History::default();
    let mut met = BTreeSet::new();
    for n in 0..8 {
        let plan = make(&site, &units, &history, 60.0, (n + 1) * DAY, n);
        for phase in &plan.phases {
            let mut busy = BTreeSet::new();
            for (cpu, slices) in &phase.tracks {
                assert!(busy.insert(*cpu));
                let partners: BTreeSet<Cpu> = slices.iter().filter_map(|s| s.partner).collect();
                assert!(partners.len() <= 1);
                for partner in partners {
                    assert!(busy.insert(partner), "cpu {partner} is needed twice at once");
                    met.insert((*cpu, partner));
                }
            }
        }
        carry_out(&plan, (n + 1) * DAY, &mut history, |_, _| false);
    }
    assert_eq!(met.len(), 42, "ordered pairs of 7 cpus");
}

#[test]
fn a_window_on_many_cores_is_planned_quickly_enough_to_measure() {
    // how long it takes is measured by benches/planning.rs; here only that it is complete
    let plan = make(&site(128, 2), &units(), &History::default(), 600.0, DAY, 1);
    assert!(plan.sweep && plan.slices() > 128 * 100);
    assert!(plan.phases.iter().any(|p| p.setting.pace == Pace::Step { period_us: 2000, dithered: false }));
}

#[test]
fn records_of_other_programs_are_no_units() {
    assert!(unit_of("integer.multiply", "portable", "all steady 100% 9KiB").is_some());
    assert!(unit_of("integer.unheard", "portable", "all steady 100% 9KiB").is_none());
    assert!(unit_of("integer.multiply", "portable", "at start").is_none());
    let (unit, condition) = unit_of("memory.copy", "portable", "solo burst 10us/10us dram 384KiB").unwrap();
    assert_eq!((unit.size, condition.setting.arrangement), (Size(384), Arrangement::Solo));
}
