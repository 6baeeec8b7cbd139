//! Checksums: the CRC instruction, and CRC by carry-less multiplication.
