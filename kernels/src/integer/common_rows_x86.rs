//! Rows of `integer.bignum` with two carry chains at once: low halves of products along the carry flag, high halves along the
//! overflow flag (E. Ozturk and others, "New Instructions Supporting Large Integer Arithmetic", 2012).

use super::common_rows::{Eight, Rows};

/// Needs BMI2 and ADX.
pub(super) struct TwoFlags;

/// Place `$j` of a row: the low half to `$w`, the high half to `$next`.
macro_rules! place {
    ($j:literal, $w:literal, $next:literal) => {
        concat!("mulx {high}, {low}, [{a} + 8 * ", $j, "]\nadcx {", $w, "}, {low}\nadox {", $next, "}, {high}\n")
    };
}

/// What becomes of the lowest limb of row `$i`, when it is done.
macro_rules! put {
    (add, $i:literal, $w:literal) => {
        concat!("mov [{sum} + 8 * ", $i, "], {", $w, "}\n")
    };
    (find, $i:literal, $w:literal) => {
        ""
    };
}

/// Row `$i` with its factor in rdx: the window is `$w0` … `$w7`, for the next row `$w1` … `$w7`, `$w0`.
macro_rules! row {
    ($put:ident, $i:literal, $w0:literal, $w1:literal, $w2:literal, $w3:literal, $w4:literal, $w5:literal, $w6:literal, $w7:literal) => {
        concat!(
            // clears both flags
            "xor {low:e}, {low:e}\n",
            "adox {",
            $w0,
            "}, [{sum} + 8 * ",
            $i,
            "]\n",
            place!(0, $w0, $w1),
            put!($put, $i, $w0),
            place!(1, $w1, $w2),
            place!(2, $w2, $w3),
            place!(3, $w3, $w4),
            place!(4, $w4, $w5),
            place!(5, $w5, $w6),
            place!(6, $w6, $w7),
            "mulx {",
            $w0,
            "}, {low}, [{a} + 56]\nadcx {",
            $w7,
            "}, {low}\n",
            // does not touch the flags
            "mov {low:e}, 0\nadcx {",
            $w0,
            "}, {low}\nadox {",
            $w0,
            "}, {low}\n"
        )
    };
}

/// A row of `add_rows`.
macro_rules! add {
    ($i:literal, $w0:literal, $($w:literal),*) => {
        concat!(
            "mov rdx, [{b} + 8 * ", $i, "]\n",
            row!(add, $i, $w0, $($w),*)
        )
    };
}

/// A row of `find_rows`: the multiple from the lowest limb, which becomes zero.
macro_rules! find {
    ($i:literal, $w0:literal, $($w:literal),*) => {
        concat!(
            "mov rdx, {", $w0, "}\nadd rdx, [{sum} + 8 * ", $i, "]\nimul rdx, [{m} + 64]\nmov [{m} + 8 * ", $i, "], rdx\n",
            row!(find, $i, $w0, $($w),*)
        )
    };
}

macro_rules! eight {
    ($line:ident) => {
        concat!(
            $line!(0, "w0", "w1", "w2", "w3", "w4", "w5", "w6", "w7"),
            $line!(1, "w1", "w2", "w3", "w4", "w5", "w6", "w7", "w0"),
            $line!(2, "w2", "w3", "w4", "w5", "w6", "w7", "w0", "w1"),
            $line!(3, "w3", "w4", "w5", "w6", "w7", "w0", "w1", "w2"),
            $line!(4, "w4", "w5", "w6", "w7", "w0", "w1", "w2", "w3"),
            $line!(5, "w5", "w6", "w7", "w0", "w1", "w2", "w3", "w4"),
            $line!(6, "w6", "w7", "w0", "w1", "w2", "w3", "w4", "w5"),
            $line!(7, "w7", "w0", "w1", "w2", "w3", "w4", "w5", "w6")
        )
    };
}

/// The assembly with the window in registers.
macro_rules! rows {
    ($lines:expr, $window:ident, $($operands:tt)*) => {
        // SAFETY: implementor of a private trait used by `avx2` alone (and by a test that asks), for which bmi2 and adx were
        // proven; reads and writes the arrays that the pointers were made of; every register that changes is named
        unsafe {
            std::arch::asm!(
                $lines,
                $($operands)*
                w0 = inout(reg) $window[0], w1 = inout(reg) $window[1], w2 = inout(reg) $window[2], w3 = inout(reg) $window[3],
                w4 = inout(reg) $window[4], w5 = inout(reg) $window[5], w6 = inout(reg) $window[6], w7 = inout(reg) $window[7],
                low = out(reg) _, high = out(reg) _, out("rdx") _,
                options(nostack),
            );
        }
    };
}

impl Rows for TwoFlags {
    #[inline(always)]
    fn add_rows(sum: &mut Eight, a: &Eight, b: &Eight, window: &mut Eight) {
        rows!(eight!(add), window, sum = in(reg) sum, a = in(reg) a, b = in(reg) b,);
    }

    #[inline(always)]
    fn find_rows(sum: &Eight, n: &Eight, inverse: u64, window: &mut Eight) -> Eight {
        let mut m = [0; 9];
        m[8] = inverse;
        rows!(eight!(find), window, sum = in(reg) sum, a = in(reg) n, m = in(reg) &raw mut m,);
        let [multiples @ .., _] = m;
        multiples
    }
}
