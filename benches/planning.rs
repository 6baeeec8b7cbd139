//! How long a plan takes: 128 cpus, every kernel, ten minutes, with a history of every cell. Target: below 100 ms.

use std::hint::black_box;
use std::time::Duration;

use criterion::{Criterion, criterion_group, criterion_main};
use proofhouse::condition::Condition;
use proofhouse::host::Cpu;
use proofhouse::plan::{self, Brief, History, Ran, Seat, Site};

fn planning(criterion: &mut Criterion) {
    let seats = (0..128).map(|n| Seat { cpu: Cpu(n), core: n / 2, caches: [None; 3] });
    let site = Site { seats: seats.collect() };
    let units = plan::available(|_| true).0;
    let budget = Duration::from_secs(600);
    let mut history = History::default();
    for (n, cell) in plan::cells(&site, &units, budget).into_iter().enumerate() {
        let condition = Condition { setting: cell.setting, paired: false, level: None, kib: cell.unit.size.0 };
        history.add(&Ran {
            cpu: cell.cpu,
            partner: cell.partner,
            unit: cell.unit,
            condition,
            end_ms: 1 + n as u64 * 7919 % 1_000_000,
            busy_ns: 25_000_000,
            mismatches: 0,
            next_seed: Some(1),
        });
    }
    let brief =
        Brief { site: &site, units: &units, history: &history, budget, now_ms: 2_000_000, seed: 7, seeds: &|_| 64 };
    criterion.bench_function(&format!("plan, 128 cpus, {} units, 10 min", units.len()), |b| {
        b.iter(|| plan::plan(black_box(&brief)));
    });
}

criterion_group!(benches, planning);
criterion_main!(benches);
