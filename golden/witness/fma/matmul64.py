"""fma.matmul64 by MPFR's fused operation in binary64."""

from fma.common_matmul import Matmul

LIBRARIES = ["cryptography", "gmpy2", "numpy"]
words = Matmul("fma.matmul64", 64, 900).words
