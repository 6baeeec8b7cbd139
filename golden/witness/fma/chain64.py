"""fma.chain64 by MPFR in binary64, subnormals included."""

from fma.common_chain import Chains

LIBRARIES = ["cryptography", "gmpy2"]
words = Chains("fma.chain64", 64).words
