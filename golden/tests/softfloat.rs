//! Softfloat against outside truths: `rustc_apfloat` (a port of LLVM's APFloat) for every operation that it has, in all
//! four roundings and all formats; the `half` crate's software conversions exhaustively; this host's own square root;
//! MPFR by `golden/witness/check_softfloat.py`, whose accepted answers lie in `golden/tests/data/`.

#[path = "softfloat/apfloat.rs"]
mod apfloat;
#[path = "softfloat/inputs.rs"]
mod inputs;
