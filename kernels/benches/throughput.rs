//! Throughput of every kernel × variant × size in its own unit, with comparison and fold, beside its yardstick.

mod checked;
mod yardsticks;

use std::hint::black_box;
use std::time::Duration;

use checked::Checked;
use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use kernels::{catalogue, isa};

fn throughput(unit: &str, amount: u64) -> Throughput {
    if unit == "byte" { Throughput::Bytes(amount) } else { Throughput::Elements(amount) }
}

fn kernels(criterion: &mut Criterion) {
    let mut bare = yardsticks::all();
    for &kernel in catalogue::KERNELS.iter().filter(|k| k.cpus() == 1) {
        let mut group = criterion.benchmark_group(kernel.id());
        for (variant, proof) in isa::survey(kernel) {
            let Ok(proof) = proof else { continue };
            for &size in kernel.sizes() {
                let work = kernel.work(size);
                group.throughput(throughput(work.unit, work.amount));
                let mut checked = Checked::new(kernel, size, proof);
                group.bench_function(BenchmarkId::new(variant.name(), format!("{} KiB", size.0)), |b| {
                    b.iter(|| black_box(checked.run()));
                });
            }
            let unit = kernel.work(kernel.sizes()[0]).unit;
            for yardstick in bare.iter_mut().filter(|y| y.kernel == kernel.id() && y.variant == variant) {
                group.throughput(throughput(unit, yardstick.units));
                group.bench_function(BenchmarkId::new(variant.name(), "yardstick"), |b| b.iter(|| (yardstick.run)()));
            }
        }
        group.finish();
    }
}

criterion_group! {
    name = benches;
    config = Criterion::default()
        .sample_size(20)
        .warm_up_time(Duration::from_millis(200))
        .measurement_time(Duration::from_secs(1));
    targets = kernels
}
criterion_main!(benches);
