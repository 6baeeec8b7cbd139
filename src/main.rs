//! The command `proofhouse`.

fn main() {}
