//! Masks made, combined and used: blends, masked loads and stores, comparisons of floats, tests.
//!
//! A mask is a vector of which only the elements' top bits count; comparisons give elements of all ones or none. Results
//! are integers throughout: what is compared as floats never comes out as one.

#[cfg(target_arch = "x86_64")]
pub mod avx2;
#[cfg(target_arch = "x86_64")]
pub mod avx512;
#[cfg(target_arch = "aarch64")]
pub mod neon;
#[cfg(target_arch = "x86_64")]
pub mod sse2;

/// One round of `vector.mask` on the blocks `$x[0]` … `$x[7]`; `$y` is `$x` again, but where only speed matters. `$k!(i)`
/// is the i-th line of operands, `$k!(f i, m)` the operation `f` on that line in memory under mask m,
/// `$k!(j f, u, m, v)` what place j of memory has, before the operation `f` stores there u, and v over it under mask m.
#[doc(hidden)]
#[macro_export]
macro_rules! mask_round {
    ($x:ident, $y:ident, $k:ident) => {{
        let b = $k!(0 put_i64, $y[4], $k!(1), $y[5]);
        let c = $k!(1 put_f32, $y[2], $k!(0), $y[4]);
        $x[0] = add8($x[0], select8($y[4], $y[5], $k!(0)));
        $x[1] = sub16($x[1], select8_by_and($y[4], $y[2], $y[5], $y[3], $k!(0)));
        let a = select32($y[4], $k!(1), $y[2]);
        $x[0] = xor($x[0], a);
        $x[1] = add32($x[1], eq_f32(a, $y[4]));
        $x[0] = sub64($x[0], lt_f32($k!(1), a));
        $x[1] = add16($x[1], le_f32($y[5], $y[2]));
        $x[0] = sub8($x[0], unord_f32($y[3], $k!(0)));
        $x[1] = add64($x[1], $k!(keep_i32 0, $y[4]));
        $x[0] = sub32($x[0], and_f32($y[4], $y[3]));
        let a = select64($y[5], $k!(0), $y[3]);
        $x[1] = add8($x[1], a);
        $x[0] = sub16($x[0], le_f64(a, $y[5]));
        $x[1] = xor($x[1], unord_f64($k!(0), a));
        $x[0] = add32($x[0], eq_f64($y[4], $y[3]));
        $x[1] = sub64($x[1], lt_f64($y[2], $k!(1)));
        $x[0] = add16($x[0], and_f64($y[5], $y[3]));
        $x[1] = sub8($x[1], andnot($y[5], $y[2]));
        let d = $k!(2 put_f64, $y[7], $k!(3), $y[5]);
        $x[2] = add64($x[2], select8($y[6], $y[7], $k!(2)));
        $x[3] = sub32($x[3], select16_by_or($y[7], $y[4], $y[6], $y[5], $k!(3)));
        let a = select32($y[6], $k!(3), $y[4]);
        $x[2] = add8($x[2], a);
        $x[3] = sub16($x[3], neq_f32(a, $y[6]));
        $x[2] = xor($x[2], nlt_f32($k!(3), a));
        $x[3] = add32($x[3], nle_f32($y[7], $y[4]));
        $x[2] = sub64($x[2], ord_f32($y[5], $k!(2)));
        $x[3] = add16($x[3], $k!(keep_i64 3, $y[7]));
        $x[2] = sub8($x[2], or_f32($y[7], $y[4]));
        let a = select64($y[7], $k!(2), $y[5]);
        $x[3] = add64($x[3], a);
        $x[2] = sub32($x[2], nle_f64(a, $y[7]));
        $x[3] = add8($x[3], ord_f64($k!(2), a));
        $x[2] = sub16($x[2], neq_f64($y[6], $y[5]));
        $x[3] = xor($x[3], nlt_f64($y[4], $k!(3)));
        $x[2] = add32($x[2], or_f64($y[6], $y[4]));
        $x[3] = sub64($x[3], b);
        $x[2] = add16($x[2], c);
        $x[3] = sub8($x[3], and($y[6], $y[7]));
        let e = $k!(3 put_i32, $y[7], $k!(4), $y[6]);
        $x[4] = add64($x[4], select8($y[0], $y[1], $k!(4)));
        $x[5] = sub32($x[5], select8_by_xnor($y[0], $y[6], $y[1], $y[7], $k!(4)));
        let a = select32($y[0], $k!(5), $y[6]);
        $x[4] = add8($x[4], a);
        $x[5] = sub16($x[5], eq_uq_f32(a, $y[0]));
        $x[4] = xor($x[4], nge_f32($k!(5), a));
        $x[5] = add32($x[5], ngt_f32($y[1], $y[6]));
        $x[4] = sub64($x[4], never_f32($y[7], $k!(4)));
        $x[5] = add16($x[5], $k!(keep_f32 4, $y[6]));
        $x[4] = sub8($x[4], xor_f32($y[6], $y[7]));
        let a = select64($y[1], $k!(4), $y[7]);
        $x[5] = add64($x[5], a);
        $x[4] = sub32($x[4], ngt_f64(a, $y[1]));
        $x[5] = add8($x[5], never_f64($k!(4), a));
        $x[4] = sub16($x[4], eq_uq_f64($y[0], $y[7]));
        $x[5] = xor($x[5], nge_f64($y[6], $k!(5)));
        $x[4] = add32($x[4], xor_f64($y[6], $y[0]));
        $x[5] = sub64($x[5], d);
        $x[4] = add16($x[4], andnot($y[1], $y[6]));
        $x[7] = sub8($x[7], select8($y[2], $y[3], $k!(6)));
        $x[6] = add64($x[6], select32_by_andnot($y[3], $y[1], $y[2], $y[0], $k!(7)));
        let a = select32($y[2], $k!(7), $y[0]);
        $x[7] = sub32($x[7], a);
        $x[6] = add8($x[6], neq_oq_f32(a, $y[2]));
        $x[7] = sub16($x[7], ge_f32($k!(7), a));
        $x[6] = xor($x[6], gt_f32($y[3], $y[0]));
        $x[7] = add32($x[7], always_f32($y[1], $k!(6)));
        $x[6] = sub64($x[6], $k!(keep_f64 7, $y[1]));
        $x[7] = add16($x[7], andnot_f32($y[1], $y[3]));
        let a = select64($y[3], $k!(6), $y[1]);
        $x[6] = sub8($x[6], a);
        $x[7] = add64($x[7], gt_f64(a, $y[3]));
        $x[6] = sub32($x[6], always_f64($k!(6), a));
        $x[7] = add8($x[7], neq_oq_f64($y[2], $y[1]));
        $x[6] = sub16($x[6], ge_f64($y[0], $k!(7)));
        $x[7] = xor($x[7], andnot_f64($y[2], $y[3]));
        $x[6] = add32($x[6], e);
        $x[7] = sub64($x[7], and($y[2], $y[3]));
    }};
}
