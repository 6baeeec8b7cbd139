//! Prints the builds of this source on this architecture, a line each: id, variant, marks. For `scripts/check-isa.sh`,
//! which then looks for each build's machine code in this very program.

use kernels::{Case, Seed, catalogue, isa};

fn main() {
    for &kernel in catalogue::KERNELS {
        for build in kernel.builds() {
            println!("{} {} {}", kernel.id(), build.variant, build.marks.join(" "));
        }
    }
    // makes the linker keep every kernel's code; asked for by nobody
    if std::env::args().len() > 1 {
        for &kernel in catalogue::KERNELS {
            for proof in isa::survey(kernel).into_iter().filter_map(|(_, proof)| proof.ok()) {
                let size = kernel.sizes()[0];
                let mut out = vec![0; kernel.output_words(size)];
                kernel.prepare(&Case { kernel: kernel.id(), seed: Seed(0), size }, proof).run_anywhere(&mut out);
                println!("{} {} {:016x}", kernel.id(), proof.variant(), out[0]);
            }
        }
    }
}
