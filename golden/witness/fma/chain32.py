"""fma.chain32 by MPFR in binary32, subnormals included."""

from fma.common_chain import Chains

LIBRARIES = ["cryptography", "gmpy2"]
words = Chains("fma.chain32", 32).words
