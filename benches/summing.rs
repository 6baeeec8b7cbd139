//! How long it takes to sum up a million cells with all their intervals: counts for a fleet's worth of cells, most of
//! them silent, some with a few mismatches, some with bursts.

use criterion::{Criterion, criterion_group, criterion_main};
use proofhouse::stats::{Clusters, Scatter, clopper_pearson, clopper_pearson_upper, garwood_upper};
use rayon::prelude::*;
use std::hint::black_box;

struct Cell {
    runs: u64,
    mismatches: u64,
    scatter: Scatter,
}

fn cell(number: u64) -> Cell {
    let hours = 0.01 + (number % 997) as f64 * 0.003;
    let slices = 20;
    let each = hours / slices as f64;
    // one cell in a hundred was wrong, one in a thousand in bursts
    let hit: Vec<(u64, f64)> = match number % 1000 {
        0 => vec![(17 + number % 13, each), (3, each)],
        n if n % 100 == 1 => vec![(1, each); 1 + (number % 7) as usize],
        _ => Vec::new(),
    };
    let clusters = |hit: &[(u64, f64)]| Clusters {
        number: slices,
        exposure: hours,
        squares: slices as f64 * each * each,
        hit: hit.to_vec(),
    };
    let mismatches = hit.iter().map(|(x, _)| x).sum();
    let scatter = Scatter {
        slices: clusters(&hit),
        minutes: clusters(&hit),
        spells: clusters(&hit),
        windows: clusters(&hit),
        episodes: clusters(&hit.iter().map(|&(_, t)| (1, t)).collect::<Vec<_>>()),
    };
    Cell { runs: (hours * 1e8) as u64, mismatches, scatter }
}

fn sum_up(cell: &Cell, confidence: f64) -> f64 {
    if cell.mismatches == 0 {
        let per_run = clopper_pearson_upper(0, cell.runs, confidence).unwrap_or(1.0);
        return per_run + garwood_upper(0, cell.scatter.slices.exposure, confidence).unwrap_or(f64::INFINITY);
    }
    let per_run = clopper_pearson(cell.mismatches, cell.runs, confidence).map_or(1.0, |i| i.upper);
    per_run + cell.scatter.choose(confidence).map_or(f64::INFINITY, |c| c.stated.interval.upper)
}

fn a_million_cells(c: &mut Criterion) {
    let cells: Vec<Cell> = (0..1_000_000).map(cell).collect();
    let mut group = c.benchmark_group("a million cells");
    group.sample_size(10);
    group.bench_function("one in a hundred wrong", |b| {
        b.iter(|| black_box(cells.par_iter().map(|cell| sum_up(cell, 0.95)).sum::<f64>()));
    });
    let wrong: Vec<Cell> = (0..1_000_000).map(|n| cell(100 * (n % 10_000) + u64::from(n % 10 != 0))).collect();
    group.bench_function("every one wrong", |b| {
        b.iter(|| black_box(wrong.par_iter().map(|cell| sum_up(cell, 0.95)).sum::<f64>()));
    });
}

criterion_group!(benches, a_million_cells);
criterion_main!(benches);
