//! Every kernel × variant against every source of truth, one named test each, and the proof that no twin is missing.
//!
//! `table`: all golden cases, each run twice from one preparation. `fresh`: seeds outside the tables against the
//! reference. `reference`: the reference against the table. Variants that cannot run here are counted as ignored.

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

use golden::{reference, table};
use kernels::isa::{self, Proof};
use kernels::kernel::MAX_OUTPUT_WORDS;
use kernels::{Case, Kernel, Seed, Variant, catalogue};
use libtest_mimic::{Arguments, Failed, Trial};

fn main() {
    let args = Arguments::from_args();
    let mut trials = vec![
        Trial::test("twins::files", || twins().map_err(Failed::from)),
        Trial::test("twins::lists", || lists().map_err(Failed::from)),
        Trial::test("twins::pins", || table::open().map_err(|e| Failed::from(e.to_string()))),
        Trial::test("floor::variants", || floor().map_err(Failed::from)),
    ];
    for &kernel in catalogue::KERNELS {
        let id = kernel.id();
        trials.push(Trial::test(format!("{id}::statement"), move || statement(kernel).map_err(Failed::from)));
        trials.push(Trial::test(format!("{id}::reference"), move || reference_holds(kernel).map_err(Failed::from)));
        for (variant, proof) in isa::survey(kernel) {
            match proof {
                Ok(proof) => {
                    let name = format!("{id}::{variant}");
                    trials.push(Trial::test(format!("{name}::table"), move || {
                        table_holds(kernel, proof).map_err(Failed::from)
                    }));
                    trials.push(Trial::test(format!("{name}::fresh"), move || {
                        fresh_holds(kernel, proof).map_err(Failed::from)
                    }));
                }
                Err(isa::Missing::NotBuilt) => {}
                Err(why) => trials.push(
                    Trial::test(format!("{id}::{variant}::table"), || Ok(()))
                        .with_ignored_flag(true)
                        .with_kind(why.to_string()),
                ),
            }
        }
    }
    libtest_mimic::run(&args, trials).exit();
}

fn describe(case: &Case, index: usize, actual: u64, expected: u64) -> String {
    format!(
        "{case} word {index}\n  expected {expected} {expected:#018x} {expected:064b}\n  actual   {actual} {actual:#018x} {actual:064b}\n  \
         xor {:#018x} difference {}",
        actual ^ expected,
        i128::from(actual) - i128::from(expected)
    )
}

fn agree(case: &Case, actual: &[u64], expected: &[u64]) -> Result<(), String> {
    if actual.len() != expected.len() {
        return Err(format!("{case}: {} words for {}", actual.len(), expected.len()));
    }
    match (0..actual.len()).find(|&i| actual[i] != expected[i]) {
        Some(i) => Err(describe(case, i, actual[i], expected[i])),
        None => Ok(()),
    }
}

fn run_twice(kernel: &dyn Kernel, proof: Proof, case: &Case, expected: &[u64]) -> Result<(), String> {
    let mut ready = kernel.prepare(case, proof);
    for fill in [0, u64::MAX] {
        let mut out = vec![fill; kernel.output_words(case.size)];
        ready.run_anywhere(&mut out);
        agree(case, &out, expected)?;
    }
    Ok(())
}

fn table_holds(kernel: &'static dyn Kernel, proof: Proof) -> Result<(), String> {
    for &size in kernel.sizes() {
        for case in table::cases(kernel.id(), size) {
            let expected = table::expected(&case).ok_or_else(|| format!("{case}: not in the table"))?;
            run_twice(kernel, proof, &case, expected)?;
        }
    }
    Ok(())
}

fn fresh_holds(kernel: &'static dyn Kernel, proof: Proof) -> Result<(), String> {
    // the default size only: the large footprints' references take seconds
    for seed in [1 << 20, (1 << 20) + 1, u64::MAX - 1, u64::MAX] {
        let case = Case { kernel: kernel.id(), seed: Seed(seed), size: kernel.sizes()[0] };
        let expected = reference::words(&case).ok_or("no reference")?;
        run_twice(kernel, proof, &case, &expected)?;
    }
    Ok(())
}

fn reference_holds(kernel: &'static dyn Kernel) -> Result<(), String> {
    for &size in kernel.sizes() {
        for case in table::cases(kernel.id(), size).into_iter().step_by(21) {
            let words = reference::words(&case).ok_or("no reference")?;
            agree(&case, &words, table::expected(&case).ok_or("not in the table")?)?;
        }
    }
    Ok(())
}

fn statement(kernel: &'static dyn Kernel) -> Result<(), String> {
    let id = kernel.id();
    if id.len() > 20 || id.matches('.').count() != 1 {
        return Err(format!("{id}: not family.stem of at most 20 bytes"));
    }
    for &size in kernel.sizes() {
        let words = kernel.output_words(size);
        if words == 0 || words > MAX_OUTPUT_WORDS || kernel.work(size).amount == 0 {
            return Err(format!("{id} size {}: {words} output words, {:?}", size.0, kernel.work(size)));
        }
    }
    if kernel.builds().iter().any(|b| b.marks.is_empty()) {
        return Err(format!("{id}: a build without a mark instruction"));
    }
    Ok(())
}

/// Every `.ext` file of `dir/<family>/` as `family.stem`; `mod.rs`, `__init__.py` and shared `common_*` files aside.
fn stems(dir: &str, ext: &str) -> BTreeSet<String> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("..").join(dir);
    let list = |path: &Path| -> Vec<PathBuf> {
        std::fs::read_dir(path).into_iter().flatten().flatten().map(|e| e.path()).collect()
    };
    let families = catalogue::KERNELS.iter().map(|k| k.family()).collect::<BTreeSet<_>>();
    let mut found = BTreeSet::new();
    for folder in list(&root).into_iter().filter(|p| p.is_dir()) {
        let family = folder.file_name().unwrap_or_default().to_string_lossy().into_owned();
        if !families.contains(family.as_str()) {
            continue;
        }
        for file in list(&folder) {
            let stem = file.file_stem().unwrap_or_default().to_string_lossy().into_owned();
            let is_kernel = stem != "mod" && stem != "__init__" && !stem.starts_with("common_");
            if file.extension().is_some_and(|e| e == ext) && is_kernel {
                found.insert(format!("{family}.{stem}"));
            }
        }
    }
    found
}

fn twins() -> Result<(), String> {
    let catalogue: BTreeSet<String> = catalogue::KERNELS.iter().map(|k| k.id().to_owned()).collect();
    for (what, found) in [
        ("kernel", stems("kernels/src", "rs")),
        ("reference", stems("golden/src/reference", "rs")),
        ("witness", stems("golden/witness", "py")),
    ] {
        if found != catalogue {
            let odd: Vec<_> = found.symmetric_difference(&catalogue).collect();
            return Err(format!("{what} files and the catalogue differ in {odd:?}"));
        }
    }
    Ok(())
}

fn lists() -> Result<(), String> {
    let ids: Vec<&str> = catalogue::KERNELS.iter().map(|k| k.id()).collect();
    let planned: Vec<&str> = table::PLAN.iter().map(|(id, _)| *id).collect();
    let tabled: Vec<&str> = table::TABLES.iter().map(|(id, _)| *id).collect();
    let referenced: Vec<&str> = reference::REFERENCES.iter().map(|(id, _)| *id).collect();
    if ids != planned || ids != tabled || ids != referenced {
        return Err(format!("catalogue {ids:?}\nplan {planned:?}\ntables {tabled:?}\nreferences {referenced:?}"));
    }
    for (&kernel, (id, sizes)) in catalogue::KERNELS.iter().zip(table::PLAN) {
        let planned: Vec<u32> = sizes.iter().map(|(kib, _)| *kib).collect();
        let stated: Vec<u32> = kernel.sizes().iter().map(|s| s.0).collect();
        if planned != stated || sizes.iter().any(|(_, seeds)| *seeds < 64) {
            return Err(format!("{id}: sizes {stated:?}, plan {sizes:?} (at least 64 seeds each)"));
        }
    }
    Ok(())
}

/// Skipped variants must not grow unnoticed: on an AVX2 host every AVX2 build has to have run.
fn floor() -> Result<(), String> {
    #[cfg(target_arch = "x86_64")]
    let (must, host) = (Variant::Avx2, std::arch::is_x86_feature_detected!("avx2"));
    #[cfg(target_arch = "aarch64")]
    let (must, host) = (Variant::Neon, true);
    if !host {
        return Ok(());
    }
    let lacking: Vec<&str> = catalogue::KERNELS
        .iter()
        .filter(|k| k.builds().iter().any(|b| b.variant == must) && isa::prove(**k, must).is_err())
        .map(|k| k.id())
        .collect();
    if lacking.is_empty() { Ok(()) } else { Err(format!("{must} skipped for {lacking:?}")) }
}
