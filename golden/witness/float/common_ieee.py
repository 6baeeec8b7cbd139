"""IEEE 754 formats by MPFR: encodings to mpfr values and back, contexts that round with the format's own exponent range.

A context with emin, emax and subnormalize makes every MPFR operation an operation of that format (MPFR manual,
"mpfr_subnormalize"). MPFR's significand lies in [1/2, 1), so its exponents are one above IEEE's.
"""

import gmpy2
from gmpy2 import mpfr


# wide enough that building an operand never rounds
EXACT = gmpy2.context(precision=64, emin=-(1 << 20), emax=1 << 20)


class Format:
    def __init__(self, exponent_bits: int, fraction_bits: int):
        self.exponent_bits = exponent_bits
        self.fraction_bits = fraction_bits
        self.precision = fraction_bits + 1
        self.bias = (1 << exponent_bits - 1) - 1
        self.emin = 1 - self.bias
        self.sign_bit = 1 << exponent_bits + fraction_bits
        self.infinity = ((1 << exponent_bits) - 1) << fraction_bits

    def context(self, rounding=gmpy2.RoundToNearest):
        return gmpy2.context(
            precision=self.precision,
            emin=self.emin - self.fraction_bits + 1,
            emax=self.bias + 1,
            subnormalize=True,
            round=rounding,
        )

    def encode(self, negative: bool, significand: int, exponent: int) -> int:
        """±significand · 2^exponent, which must be exact in the format."""
        if significand == 0:
            return self.sign_bit if negative else 0
        lead = significand.bit_length() - 1 + exponent
        unit = max(lead, self.emin) - self.fraction_bits
        shift = exponent - unit
        scaled = significand << shift if shift >= 0 else significand >> -shift
        assert shift >= 0 or scaled << -shift == significand, "not a number of the format"
        biased = max(lead, self.emin) + self.bias - (0 if lead >= self.emin else 1)
        magnitude = (biased << self.fraction_bits) + (scaled & (1 << self.fraction_bits) - 1)
        assert magnitude < self.infinity
        return magnitude | (self.sign_bit if negative else 0)

    def bits(self, x) -> int:
        """The encoding of an mpfr value that is a number of the format or an infinity."""
        negative = gmpy2.is_signed(x)
        if not gmpy2.is_finite(x):
            assert gmpy2.is_infinite(x), "NaN"
            return self.infinity | (self.sign_bit if negative else 0)
        if gmpy2.is_zero(x):
            return self.sign_bit if negative else 0
        mantissa, exponent = x.as_mantissa_exp()
        return self.encode(negative, abs(int(mantissa)), int(exponent))

    def value(self, bits: int):
        """The exact value of an encoding."""
        negative = bits & self.sign_bit != 0
        biased = bits >> self.fraction_bits & (1 << self.exponent_bits) - 1
        fraction = bits & (1 << self.fraction_bits) - 1
        if biased == (1 << self.exponent_bits) - 1:
            x = mpfr("inf") if fraction == 0 else mpfr("nan")
        else:
            significand = fraction | (1 << self.fraction_bits if biased else 0)
            unit = max(biased, 1) - self.bias - self.fraction_bits
            x = mpfr(significand, 64, EXACT)
            x = EXACT.mul_2exp(x, unit) if unit >= 0 else EXACT.div_2exp(x, -unit)
        return -x if negative else x


BINARY16 = Format(5, 10)
BFLOAT16 = Format(8, 7)
BINARY32 = Format(8, 23)
BINARY64 = Format(11, 52)
