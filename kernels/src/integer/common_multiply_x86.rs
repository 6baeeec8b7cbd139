//! The inner blocks of `integer.multiply` on x86-64: sixteen steps, written out in assembly.
//!
//! A compiler makes eight chains, two results each and the addresses more than fit into registers and keeps a chain in memory,
//! whose latency then rules; it also spends ALU instructions on addresses. Here everything has its register and every address is
//! a constant away from two pointers. Sums are spread between the products, so that no run of vector instructions keeps the next
//! products from being issued.

/// Chain `$j` in step `$i` by `mul`: the low half back into the chain, the high half into its row.
macro_rules! mul_one {
    ($i:literal, $j:literal) => {
        concat!(
            "mov rax, {x",
            $j,
            "}\nmul qword ptr [{m} + 8 * ",
            $i,
            "]\n",
            "mov {x",
            $j,
            "}, rax\nmov [{high} + 64 * ",
            $i,
            " + 8 * ",
            $j,
            "], rdx\n"
        )
    };
}

/// The same by `mulx`, the multiplier in rdx.
macro_rules! mulx_one {
    ($i:literal, $j:literal) => {
        concat!("mulx rax, {x", $j, "}, {x", $j, "}\nmov [{high} + 64 * ", $i, " + 8 * ", $j, "], rax\n")
    };
}

/// Sums up the sixteen bytes `$k` of the row that step `$i` is about to overwrite.
macro_rules! sum_xmm {
    ($i:literal, $k:literal) => {
        concat!("paddq {a", $k, "}, [{high} + 64 * ", $i, " + 16 * ", $k, "]\npaddq {s", $k, "}, {a", $k, "}\n")
    };
}

/// Sums up the thirty-two bytes `$k` of that row.
macro_rules! sum_ymm {
    ($i:literal, $k:literal) => {
        concat!(
            "vpaddq {a",
            $k,
            "}, {a",
            $k,
            "}, [{high} + 64 * ",
            $i,
            " + 32 * ",
            $k,
            "]\n",
            "vpaddq {s",
            $k,
            "}, {s",
            $k,
            "}, {a",
            $k,
            "}\n"
        )
    };
}

/// One step; `exchange` where the halves of the sums a change places first.
macro_rules! mul_step {
    ($i:literal) => {
        mul_step!($i, "", "", "", "")
    };
    ($i:literal, exchange) => {
        mul_step!(
            $i,
            "pshufd {a0}, {a0}, 0xb1\n",
            "pshufd {a1}, {a1}, 0xb1\n",
            "pshufd {a2}, {a2}, 0xb1\n",
            "pshufd {a3}, {a3}, 0xb1\n"
        )
    };
    ($i:literal, $e0:literal, $e1:literal, $e2:literal, $e3:literal) => {
        concat!(
            $e0,
            sum_xmm!($i, 0),
            mul_one!($i, 0),
            mul_one!($i, 1),
            $e1,
            sum_xmm!($i, 1),
            mul_one!($i, 2),
            mul_one!($i, 3),
            $e2,
            sum_xmm!($i, 2),
            mul_one!($i, 4),
            mul_one!($i, 5),
            $e3,
            sum_xmm!($i, 3),
            mul_one!($i, 6),
            mul_one!($i, 7)
        )
    };
}

/// The same by `mulx`.
macro_rules! mulx_step {
    ($i:literal) => {
        mulx_step!($i, "", "")
    };
    ($i:literal, exchange) => {
        mulx_step!($i, "vpshufd {a0}, {a0}, 0xb1\n", "vpshufd {a1}, {a1}, 0xb1\n")
    };
    ($i:literal, $e0:literal, $e1:literal) => {
        concat!(
            "mov rdx, [{m} + 8 * ",
            $i,
            "]\n",
            $e0,
            sum_ymm!($i, 0),
            mulx_one!($i, 0),
            mulx_one!($i, 1),
            mulx_one!($i, 2),
            mulx_one!($i, 3),
            $e1,
            sum_ymm!($i, 1),
            mulx_one!($i, 4),
            mulx_one!($i, 5),
            mulx_one!($i, 6),
            mulx_one!($i, 7)
        )
    };
}

/// Sixteen steps `$step` on 16 multipliers, 16 rows of 8 high halves (aligned to 64 bytes) and 8 chains; `$sums` binds the sums.
macro_rules! block {
    ($step:ident, $m:expr, $high:expr, $x:expr, $($sums:tt)*) => {{
        let m: &[u64; 16] = $m;
        let high: &mut [[u64; 8]; 16] = &mut $high;
        // SAFETY: reads the 16 multipliers at `m`, reads and writes the 16 rows at `high`, which are aligned as the instructions
        // ask; every register that changes is named; the features are those of the function that this is written into
        unsafe {
            std::arch::asm!(
                $step!(0, exchange), $step!(1), $step!(2), $step!(3),
                $step!(4, exchange), $step!(5), $step!(6), $step!(7),
                $step!(8, exchange), $step!(9), $step!(10), $step!(11),
                $step!(12, exchange), $step!(13), $step!(14), $step!(15),
                m = in(reg) m,
                high = in(reg) high,
                x0 = inout(reg) $x[0], x1 = inout(reg) $x[1], x2 = inout(reg) $x[2], x3 = inout(reg) $x[3],
                x4 = inout(reg) $x[4], x5 = inout(reg) $x[5], x6 = inout(reg) $x[6], x7 = inout(reg) $x[7],
                out("rax") _,
                out("rdx") _,
                $($sums)*
                options(nostack),
            );
        }
    }};
}

/// A block by the one-operand `mul` and 128-bit sums.
macro_rules! mul_block {
    ($m:expr, $high:expr, $x:expr, $a:expr, $s:expr) => {
        block!(mul_step, $m, $high, $x,
            a0 = inout(xmm_reg) $a[0], a1 = inout(xmm_reg) $a[1], a2 = inout(xmm_reg) $a[2], a3 = inout(xmm_reg) $a[3],
            s0 = inout(xmm_reg) $s[0], s1 = inout(xmm_reg) $s[1], s2 = inout(xmm_reg) $s[2], s3 = inout(xmm_reg) $s[3],)
    };
}

/// A block by `mulx` and 256-bit sums.
macro_rules! mulx_block {
    ($m:expr, $high:expr, $x:expr, $a:expr, $s:expr) => {
        block!(mulx_step, $m, $high, $x,
            a0 = inout(ymm_reg) $a[0], a1 = inout(ymm_reg) $a[1], s0 = inout(ymm_reg) $s[0], s1 = inout(ymm_reg) $s[1],)
    };
}
