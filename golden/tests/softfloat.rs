//! Softfloat against outside truths: `rustc_apfloat` (a port of LLVM's APFloat) for every operation that it has, in all
//! four roundings and all formats; MPFR, whose answers lie in `data/softfloat.txt`; the `half` crate's software
//! conversions exhaustively; this host's own square root; published values.

#[path = "softfloat/apfloat.rs"]
mod apfloat;
#[path = "softfloat/elementary.rs"]
mod elementary;
#[path = "softfloat/extended.rs"]
mod extended;
#[path = "softfloat/host.rs"]
mod host;
#[path = "softfloat/inputs.rs"]
mod inputs;
#[path = "softfloat/mpfr.rs"]
mod mpfr;
#[path = "softfloat/narrow.rs"]
mod narrow;
#[path = "softfloat/published.rs"]
mod published;
