"""fma.matmul32 by MPFR's fused operation in binary32."""

from fma.common_matmul import Matmul

LIBRARIES = ["cryptography", "gmpy2", "numpy"]
words = Matmul("fma.matmul32", 32, 100).words
