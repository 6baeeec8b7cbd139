//! Steps of `checksum.crc32c`: by tables, and by the CRC instruction of x86-64 and aarch64.

/// The CRC's state after 1, 2, 4 or 8 more bytes, given as a little-endian number.
pub(super) trait Steps: Copy {
    fn byte(self, state: u32, data: u8) -> u32;
    fn half(self, state: u32, data: u16) -> u32;
    fn word(self, state: u32, data: u32) -> u32;
    fn long(self, state: u32, data: u64) -> u32;
}

/// The polynomial x³² + x²⁸ + x²⁷ + x²⁶ + x²⁵ + x²³ + x²² + x²⁰ + x¹⁹ + x¹⁸ + x¹⁴ + x¹³ + x¹¹ + x¹⁰ + x⁹ + x⁸ + x⁶ + 1,
/// without its leading term, lowest bit first.
const POLYNOMIAL: u32 = 0x82f6_3b78;

/// What byte b adds to the state when k more bytes follow it in the same step, at `[k][b]`.
static TABLES: [[u32; 256]; 8] = {
    let mut tables = [[0; 256]; 8];
    let mut b = 0;
    while b < 256 {
        let mut state = b as u32;
        let mut k = 0;
        while k < 8 {
            let mut bit = 0;
            while bit < 8 {
                state = state >> 1 ^ (POLYNOMIAL & (state & 1).wrapping_neg());
                bit += 1;
            }
            tables[k][b] = state;
            k += 1;
        }
        b += 1;
    }
    tables
};

/// Eight table look-ups for eight bytes ("slicing-by-8": M. Kounavis, F. Berry, IEEE Transactions on Computers 57 (2008)).
#[derive(Clone, Copy)]
pub(super) struct Slices;

impl Steps for Slices {
    #[inline(always)]
    fn byte(self, state: u32, data: u8) -> u32 {
        state >> 8 ^ TABLES[0][usize::from(state as u8 ^ data)]
    }

    #[inline(always)]
    fn half(self, state: u32, data: u16) -> u32 {
        let [a, b] = (state as u16 ^ data).to_le_bytes().map(usize::from);
        state >> 16 ^ TABLES[1][a] ^ TABLES[0][b]
    }

    #[inline(always)]
    fn word(self, state: u32, data: u32) -> u32 {
        let [a, b, c, d] = (state ^ data).to_le_bytes().map(usize::from);
        TABLES[3][a] ^ TABLES[2][b] ^ TABLES[1][c] ^ TABLES[0][d]
    }

    #[inline(always)]
    fn long(self, state: u32, data: u64) -> u32 {
        let x = (u64::from(state) ^ data).to_le_bytes().map(usize::from);
        let pair = |i: usize| TABLES[7 - i][x[i]] ^ TABLES[6 - i][x[i + 1]];
        (pair(0) ^ pair(2)) ^ (pair(4) ^ pair(6))
    }
}

/// The CRC instruction. Evidence that it is there: `new` is called only where that was proven.
#[derive(Clone, Copy)]
pub(super) struct Instruction(());

impl Instruction {
    /// # Safety
    /// The CPU must have the CRC instruction: `sse4.2` on x86-64, `crc` on aarch64.
    #[inline(always)]
    pub(super) unsafe fn new() -> Instruction {
        Instruction(())
    }
}

#[cfg(target_arch = "x86_64")]
impl Steps for Instruction {
    #[inline(always)]
    fn byte(self, state: u32, data: u8) -> u32 {
        // SAFETY: whoever called `Instruction::new` proved sse4.2
        unsafe { std::arch::x86_64::_mm_crc32_u8(state, data) }
    }

    #[inline(always)]
    fn half(self, state: u32, data: u16) -> u32 {
        // SAFETY: whoever called `Instruction::new` proved sse4.2
        unsafe { std::arch::x86_64::_mm_crc32_u16(state, data) }
    }

    #[inline(always)]
    fn word(self, state: u32, data: u32) -> u32 {
        // SAFETY: whoever called `Instruction::new` proved sse4.2
        unsafe { std::arch::x86_64::_mm_crc32_u32(state, data) }
    }

    #[inline(always)]
    fn long(self, state: u32, data: u64) -> u32 {
        // SAFETY: whoever called `Instruction::new` proved sse4.2
        unsafe { std::arch::x86_64::_mm_crc32_u64(u64::from(state), data) as u32 }
    }
}

#[cfg(target_arch = "aarch64")]
macro_rules! instruction {
    ($name:ident, $data:ty, $line:literal) => {
        #[inline(always)]
        fn $name(self, mut state: u32, data: $data) -> u32 {
            // SAFETY: whoever called `Instruction::new` proved crc; the instruction touches nothing but its registers.
            // Assembly, as a compiler keeps the intrinsic as a call in a body that does not name its feature
            unsafe {
                std::arch::asm!(".arch_extension crc", $line, state = inout(reg) state, data = in(reg) data,
                    options(pure, nomem, nostack, preserves_flags));
            }
            state
        }
    };
}

#[cfg(target_arch = "aarch64")]
impl Steps for Instruction {
    instruction!(byte, u8, "crc32cb {state:w}, {state:w}, {data:w}");
    instruction!(half, u16, "crc32ch {state:w}, {state:w}, {data:w}");
    instruction!(word, u32, "crc32cw {state:w}, {state:w}, {data:w}");
    instruction!(long, u64, "crc32cx {state:w}, {state:w}, {data:x}");
}
